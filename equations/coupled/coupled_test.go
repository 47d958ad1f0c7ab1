package coupled

import (
	"context"
	"encoding/json"
	"flag"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"nullmark/equations/frequency"
	"nullmark/extract/certify"
	"nullmark/extract/kerr"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// -long runs the accuracy tables: every m, both reference orbits, fast spins,
// large radii, eccentric and inclined orbits.
var long = flag.Bool("long", false, "run the accuracy tables (minutes)")

func hole(t *testing.T, a float64) hyperboloidal.Kerr {
	t.Helper()
	h, err := hyperboloidal.NewKerr(a)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

// rungOf evolves one m of a circular orbit and hands it to the certification.
func rungOf(t *testing.T, h hyperboloidal.Kerr, r0 float64, m, angular int, d Domain, dx, until float64) kerr.Rung {
	t.Helper()
	k, om, err := CircularState(h, r0, 0)
	if err != nil {
		t.Fatal(err)
	}
	r := d.Rung(dx, angular)
	run, err := Circular(Equation{S: -2, M: m}, r, k, om)
	if err != nil {
		t.Fatal(err)
	}
	if err := run.Until(context.Background(), until); err != nil {
		t.Fatal(err)
	}
	out := kerr.Rung{Points: r.Points}
	for l := range run.Fields.Phi[0] {
		var s certify.Samples
		s.Dt = run.Fields.Dt
		for e := range s.Psi {
			s.Psi[e], s.Pi[e] = run.Fields.Phi[e][l], run.Fields.Pi[e][l]
		}
		out.Samples = append(out.Samples, s)
	}
	return out
}

// certifiedCircular runs two rungs and certifies them.
func certifiedCircular(t *testing.T, a, r0 float64, m, angular int, dx, wait float64) (*kerr.Certified, hyperboloidal.Kerr) {
	t.Helper()
	h := hole(t, a)
	_, om, err := CircularState(h, r0, 0)
	if err != nil {
		t.Fatal(err)
	}
	d := Bound(h, r0, r0, dx/certify.Ratio)
	tone := certify.Tone{L: 2, M: m, Omega: float64(m) * om, On: d.On()}
	until := certify.Earliest(tone, 4) + wait
	rungs := []kerr.Rung{
		rungOf(t, h, r0, m, angular, d, dx, until),
		rungOf(t, h, r0, m, angular-1, d, dx/certify.Ratio, until),
	}
	c, err := kerr.Certify(h, tone, kerr.Labels{Si: d.Layers.Si, So: d.Layers.So}, rungs, until, 4)
	if err != nil {
		t.Fatal(err)
	}
	return c, h
}

type reference struct {
	A, R0      float64
	Spheroidal []struct {
		L, M int
		E    float64 `json:"energy_horizon"`
	}
	Spherical []struct {
		L, M   int
		E      float64 `json:"energy_infinity"`
		Strain [2]float64
	}
	PerM []struct {
		M     int
		Value float64
	} `json:"per_m_energy_infinity"`
}

// references are independent frequency-domain values; see the file's "origin".
func references(t *testing.T) []reference {
	t.Helper()
	data, err := os.ReadFile("../frequency/testdata/circular_kerr.json")
	if err != nil {
		t.Fatal(err)
	}
	var f struct{ Orbits []reference }
	if err := json.Unmarshal(data, &f); err != nil {
		t.Fatal(err)
	}
	return f.Orbits
}

// Flux per m at both ends to 1e-10, strain per spherical mode in amplitude and
// phase inside its bar (and the bar not a wish).
func TestCircularAgainstReference(t *testing.T) {
	for i, o := range references(t) {
		if i == 0 && !*long {
			continue
		}
		for m := 1; m <= 6; m++ {
			if m != 2 && !*long {
				continue
			}
			c, _ := certifiedCircular(t, o.A, o.R0, m, 9, 0.32, 250)
			var e, hor float64
			for k := range c.Infinity {
				r, _ := c.Rate(k)
				e += r.Energy
				q, _ := c.Absorbed(k)
				hor += q.Energy
			}
			for _, q := range o.PerM {
				if q.M == m {
					if d := math.Abs(e/q.Value - 1); !(d < 1e-10) {
						t.Errorf("a=%g r=%g m=%d: energy at infinity off by %.1e", o.A, o.R0, m, d)
					}
				}
			}
			want := 0.0
			for _, q := range o.Spheroidal {
				if q.M == m {
					want += q.E
				}
			}
			// the table ends at l = 6, too early for the sums of m > 3
			if d := math.Abs(hor/want - 1); m <= 3 && !(d < 1e-10) {
				t.Errorf("a=%g r=%g m=%d: absorption off by %.1e", o.A, o.R0, m, d)
			}
			for _, q := range o.Spheroidal {
				if q.M != m || q.L > m+1 && q.L > 3 {
					continue
				}
				r, bar := c.Absorbed(q.L - c.Horizon[0].L)
				if d := math.Abs(r.Energy/q.E - 1); !(d < 1e-10) {
					t.Errorf("a=%g r=%g (%d,%d): absorption off by %.1e, bar %.1e", o.A, o.R0, q.L, m, d, bar)
				}
			}
			for _, q := range o.Spherical {
				if q.M != m || q.L > 5 {
					continue
				}
				a := c.Infinity[q.L-c.Infinity[0].L]
				s := complex(q.Strain[0], q.Strain[1])
				d := cmplx.Abs(kerr.Strain(c.Omega, a.Z)-s) / cmplx.Abs(s)
				t.Logf("a=%g r=%g (%d,%d): strain off by %.1e, bar %.1e", o.A, o.R0, q.L, m, d, a.Bar.Bar())
				if !(d < 1e-9) {
					t.Errorf("a=%g r=%g (%d,%d): strain off by %.1e", o.A, o.R0, q.L, m, d)
				}
				if d > 3*a.Bar.Bar() {
					t.Errorf("a=%g r=%g (%d,%d): strain off by %.1e outside its bar %.1e", o.A, o.R0, q.L, m, d, a.Bar.Bar())
				}
			}
		}
	}
}

// The second opinion is the reference where no table exists: retrograde, close
// to the light ring of fast holes, far away.
func TestCircularAgainstFrequencyDomain(t *testing.T) {
	type row struct {
		a, r       float64
		m, angular int
		dx, wait   float64
		inf, hor   float64 // allowed relative error of the flux per m
	}
	rows := []row{{-0.9, 10, 3, 6, 0.4, 200, 1e-9, 1e-9}}
	if *long {
		rows = append(rows,
			row{0.99, 1.6, 2, 12, 0.25, 600, 1e-9, 5e-9},
			row{0.99, 1.6, 3, 12, 0.25, 600, 1e-9, 5e-9},
			row{0.999, 1.3, 2, 14, 0.25, 800, 1e-8, 1e-8},
			row{0.9, 20, 2, 6, 0.4, 600, 1e-9, 1e-9},
			row{0.9, 20, 1, 6, 0.4, 600, 1e-9, 1e-9},
			row{0.9, 50, 2, 6, 0.55, 600, 1e-9, 1e-9},
			row{0.9, 50, 1, 6, 0.55, 600, 2e-9, 1e-9},
		)
	}
	for _, c := range rows {
		z, h := certifiedCircular(t, c.a, c.r, c.m, c.angular, c.dx, c.wait)
		orb, err := worldline.NewKerrBound(h, c.r, 0, 1, 0, 0, 0)
		if err != nil {
			t.Fatal(err)
		}
		all, err := frequency.Circular(h, orb, -2, c.m, c.angular, 0)
		if err != nil {
			t.Fatal(err)
		}
		w := all[0]
		if w.Change[0] > c.inf || w.Change[1] > c.hor {
			t.Errorf("a=%g r=%g m=%d: the second opinion itself moves by %.1e, %.1e", c.a, c.r, c.m, w.Change[0], w.Change[1])
		}
		hor := z.Spheroidal.Horizon(w.Horizon)
		var e, e2, a, a2, bar, barA float64
		for k := range z.Infinity {
			r, b := z.Rate(k)
			e += r.Energy
			bar += b * r.Energy
			e2 += 2 * kerr.Infinity(c.m, w.Omega, w.Infinity[k]).Energy
			q, b := z.Absorbed(k)
			a += q.Energy
			barA += math.Abs(b * q.Energy)
			a2 += 2 * hor[k].Energy
		}
		di, dh := math.Abs(e/e2-1), math.Abs(a/a2-1)
		t.Logf("a=%g r=%g m=%d: infinity %.1e (bar %.1e), horizon %.1e (bar %.1e)", c.a, c.r, c.m, di, bar/e, dh, math.Abs(barA/a))
		if !(di < c.inf) || !(dh < c.hor) {
			t.Errorf("a=%g r=%g m=%d: flux off by %.1e at infinity, %.1e at the horizon", c.a, c.r, c.m, di, dh)
		}
	}
}
