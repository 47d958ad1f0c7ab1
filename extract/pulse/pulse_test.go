package pulse

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"nullmark/extract/ringing"
)

// The fundamental and first overtone of l = 2 without spin: E. W. Leaver, Proc.
// R. Soc. A 402, 285 (1985), table 1, with further digits from his continued
// fraction.
const (
	w0 = complex(0.373671684418042, -0.0889623156889357)
	w1 = complex(0.346710996879163, -0.273914875291235)
)

// rung is a ringing signal with a tail u^-4 from u = 0 on, whose frequency the
// grid has shifted by the relative amount shift, times a constant phase.
func rung(shift, last float64, phase complex128) Signal {
	s := Signal{Start: -20, Step: 0.5}
	for k := 0; s.Start+float64(k)*s.Step <= last; k++ {
		u := s.Start + float64(k)*s.Step
		var psi, pi complex128
		if u < 0 {
			psi = complex(3*math.Exp(-u*u/8), 0)
			pi = psi
		} else {
			for _, q := range []struct{ c, w complex128 }{{1, w0}, {0.3 - 0.4i, w1}} {
				w := q.w * complex(1+shift, 0)
				v := q.c * cmplx.Exp(-1i*w*complex(u, 0))
				psi += complex(real(v), 0)
				pi += complex(real(-1i*w*v), 0)
			}
			t := 1e2 * math.Pow(u+60, -4)
			psi += complex(t, 0)
			pi += complex(-4*t/(u+60), 0)
		}
		s.Psi = append(s.Psi, psi*phase)
		s.Pi = append(s.Pi, pi*phase)
	}
	return s
}

// TestRungsEnterTheBar: an error of order 8 that shifts the frequency is inside
// the bar by its rungs' difference, which no single rung shows.
func TestRungsEnterTheBar(t *testing.T) {
	const e = 1e-8 // of the finer rung
	coarse := e / math.Pow(0.8, 8)
	for _, where := range []string{"infinity", "horizon"} {
		p := Place{L: 2, M: 0, Where: where, Ratio: 0.8, Fine: rung(e, 300, 1), Coarse: rung(coarse, 300, 1)}
		o := Measure(p, Wanted{Ringing: true})
		if len(o.Ringing) != 2 || len(o.Warnings) != 0 {
			t.Fatalf("%s: %v, %v", where, o.Ringing, o.Warnings)
		}
		r := o.Ringing[0]
		off := cmplx.Abs(complex(r.Re.Value, r.Im.Value) - w0)
		if off < 0.9*e*cmplx.Abs(w0) {
			t.Fatalf("%s: the rung is not shifted (%.1e)", where, off)
		}
		if off > 1.01*r.Re.Error || r.Re.Error > 2*off {
			t.Errorf("%s: off by %.2e, bar %.2e", where, off, r.Re.Error)
		}
		if math.Abs(o.Rungs-off) > 0.1*off {
			t.Errorf("%s: share of the rungs %.2e, want %.2e", where, o.Rungs, off)
		}
		// The samples' bars cover the distance to the exact signal.
		exact := rung(0, 300, 1)
		for k, v := range p.Fine.Psi {
			if d := cmplx.Abs(v - exact.Psi[k]); d > o.Error[k] {
				t.Fatalf("%s: sample %d off by %.1e, bar %.1e", where, k, d, o.Error[k])
			}
		}
	}
}

// TestWhereTheTailIsRead: exponents come from the field, for a complex one along
// its own phase.
func TestWhereTheTailIsRead(t *testing.T) {
	for _, phase := range []complex128{1, -1, cmplx.Exp(2i)} {
		p := Place{L: 2, M: 0, Where: "infinity", Ratio: 0.8, Fine: rung(1e-9, 1500, phase), Coarse: rung(6e-9, 1500, phase)}
		o := Measure(p, Wanted{Tail: true})
		if o.Tail == nil {
			t.Fatalf("phase %v: %v", phase, o.Warnings)
		}
		if d := math.Abs(o.Tail.Exponent.Value - 4); d > 0.01 || d > o.Tail.Exponent.Error || o.Tail.L != 2 || o.Tail.Where != "infinity" {
			t.Errorf("phase %v: %+v, want 4", phase, o.Tail)
		}
		if o.Fit != nil || o.Ringing != nil {
			t.Error("ringing that was not asked for")
		}
	}
}

// TestWhatIsMissingIsSaid: a series too short for either says so and names the
// mode.
func TestWhatIsMissingIsSaid(t *testing.T) {
	p := Place{L: 2, M: 0, Where: "horizon", Ratio: 0.8, Fine: rung(0, 20, 1), Coarse: rung(0, 20, 1)}
	o := Measure(p, Wanted{Ringing: true, Tail: true})
	if o.Tail != nil || len(o.Ringing) != 0 || len(o.Warnings) != 2 {
		t.Fatalf("%+v", o)
	}
	for _, w := range o.Warnings {
		if !strings.Contains(w, "(2,0) at horizon") {
			t.Errorf("%q does not name the mode", w)
		}
	}
	// An overtone that only the finer rung holds is left out and said so.
	one := rung(0, 300, 1)
	for k := range one.Psi {
		if u := one.Start + float64(k)*one.Step; u >= 0 {
			one.Psi[k] = complex(real(cmplx.Exp(-1i*w0*complex(u, 0))), 0)
		}
	}
	o = Measure(Place{L: 2, Where: "horizon", Ratio: 0.8, Fine: rung(0, 300, 1), Coarse: one}, Wanted{Ringing: true})
	if len(o.Ringing) != 1 || len(o.Warnings) != 1 || o.Ringing[0].N != 0 {
		t.Errorf("%v, %v", o.Ringing, o.Warnings)
	}
}

func TestNamesFromTheCaller(t *testing.T) {
	p := Place{L: 5, M: 1, Where: "horizon", Ratio: 0.8, Fine: rung(0, 300, 1), Coarse: rung(0, 300, 1)}
	o := Measure(p, Wanted{Ringing: true, Expected: []ringing.Expected{{L: 5, M: 1, N: 0, Omega: w0 * 1.01}, {L: 6, M: 1, N: 0, Omega: w1 * 0.99}}})
	if len(o.Ringing) != 2 || o.Ringing[1].L != 6 || o.Fit.Modes[1].Own {
		t.Errorf("%v", o.Ringing)
	}
}

func TestUnequalRungsPanic(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("no panic")
		}
	}()
	Measure(Place{Fine: rung(0, 100, 1), Coarse: rung(0, 90, 1)}, Wanted{})
}
