package sample

import (
	"testing"

	"nullmark/equations/evolve"
	"nullmark/extract/certify"
)

var _ evolve.Observer = (*Ends)(nil)

// TestEnds: mode q comes from lanes 2q and 2q+1 of the first and last point, Psi
// from the first half of the state and Pi from the second; the state is only
// read.
func TestEnds(t *testing.T) {
	const lanes, points = 8, 5
	u := make([]float64, 2*points*lanes)
	for i := range u {
		u[i] = float64(i)
	}
	e := NewEnds(3, lanes, 0.25, 2)
	e.Observe(0, 0, u)
	for i := range u {
		if u[i] != float64(i) {
			t.Fatalf("the state changes at %d", i)
		}
		u[i] += 1000
	}
	e.Observe(1, 0.25, u)
	for q, m := range e.Modes {
		if m.Dt != 0.25 || m.Until() != 0.25 {
			t.Errorf("mode %d: dt %g until %g", q, m.Dt, m.Until())
		}
		at := func(index int) complex128 { return complex(float64(index+2*q), float64(index+2*q+1)) }
		for k, plus := range []complex128{0, 1000 + 1000i} {
			for _, c := range []struct {
				name string
				got  []complex128
				want complex128
			}{
				{"Psi at the horizon", m.Psi[certify.Horizon], at(0)},
				{"Psi at infinity", m.Psi[certify.Infinity], at((points - 1) * lanes)},
				{"Pi at the horizon", m.Pi[certify.Horizon], at(points * lanes)},
				{"Pi at infinity", m.Pi[certify.Infinity], at((2*points - 1) * lanes)},
			} {
				if len(c.got) != 2 || c.got[k] != c.want+plus {
					t.Errorf("mode %d, sample %d, %s: %v, want %v", q, k, c.name, c.got, c.want+plus)
				}
			}
		}
	}
}

// TestNoAllocation once room has been made; what was recorded stays.
func TestNoAllocation(t *testing.T) {
	u := make([]float64, 2*3*8)
	e := NewEnds(4, 8, 1, 0)
	u[0] = 7
	e.Observe(0, 0, u)
	u[0] = 8
	e.Grow(200)
	if n := testing.AllocsPerRun(100, func() { e.Observe(1, 1, u) }); n != 0 {
		t.Errorf("%g allocations a step", n)
	}
	if s := e.Modes[0].Psi[certify.Horizon]; s[0] != 7 || s[1] != 8 || len(s) != 102 {
		t.Errorf("%d samples, the first %v", len(s), s[0])
	}
}
