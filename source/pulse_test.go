package source

import (
	"errors"
	"math"
	"testing"

	"gonum.org/v1/gonum/diff/fd"
)

// TestPulse holds height, curvature, reach and the time derivative of every
// kind of pulse; the slope comes from gonum's differences.
func TestPulse(t *testing.T) {
	for _, compact := range []bool{false, true} {
		for _, motion := range []Direction{Outgoing, Ingoing, Static} {
			p := Pulse{Centre: -3, Width: 1.7, Moving: motion, Compact: compact}
			psi := func(x float64) float64 { v, _ := p.At(x); return v }
			if v := psi(-3); v != 1 {
				t.Errorf("%v compact %v: height %v", motion, compact, v)
			}
			curvature := fd.Derivative(psi, -3, &fd.Settings{Formula: fd.Central2nd, Step: 1e-3})
			if math.Abs(curvature*1.7*1.7+1) > 1e-4 {
				t.Errorf("%v compact %v: curvature %v, want -1/width^2", motion, compact, curvature)
			}
			for _, x := range []float64{-8, -5, -3.3, 0, 1.5} {
				slope := fd.Derivative(psi, x, &fd.Settings{Formula: fd.Central, Step: 1e-5})
				want := map[Direction]float64{Outgoing: -slope, Ingoing: slope, Static: 0}[motion]
				if _, pi := p.At(x); math.Abs(pi-want) > 1e-8 {
					t.Errorf("%v compact %v: d psi/dt = %v at %v, want %v", motion, compact, pi, x, want)
				}
			}
			for _, side := range []float64{-1, 1} {
				a, b := p.At(-3 + side*1.0001*p.Reach())
				c, d := p.At(-3 + side*0.93*p.Reach())
				if a != 0 || b != 0 {
					t.Errorf("%v compact %v: %v, %v just beyond its reach", motion, compact, a, b)
				}
				if c == 0 || math.Abs(d) > 1e-12 {
					t.Errorf("%v compact %v: %v, %v just inside its reach", motion, compact, c, d)
				}
			}
		}
	}
}

func TestPulseFill(t *testing.T) {
	rho := []float64{-1, 0, 1, 2}
	state := make([]float64, 2*4*3)
	for i := range state {
		state[i] = 7
	}
	p := Pulse{Centre: 0.5, Width: 1, Moving: Ingoing}
	p.Fill(state, rho, 3, 1)
	for i, x := range rho {
		psi, pi := p.At(x)
		if state[i*3+1] != psi || state[12+i*3+1] != pi || state[i*3] != 7 || state[i*3+2] != 7 || state[12+i*3] != 7 {
			t.Errorf("point %d: %v", i, state)
		}
	}
}

func TestPulseCheck(t *testing.T) {
	var outside *Outside
	var coarse *Unresolved
	p := Pulse{Centre: 10, Width: 1}
	if err := p.Check(1, 19, 0.3); err != nil {
		t.Error(err)
	}
	if err := p.Check(1.1, 30, 0.1); !errors.As(err, &outside) {
		t.Errorf("touching the left end: %v", err)
	}
	if err := p.Check(-5, 18.9, 0.1); !errors.As(err, &outside) {
		t.Errorf("touching the right end: %v", err)
	}
	if err := p.Check(-50, 50, 0.34); !errors.As(err, &coarse) {
		t.Errorf("too coarse: %v", err)
	}
	p.Compact = true
	if err := p.Check(6, 14, 0.3); err != nil {
		t.Error(err)
	}
}
