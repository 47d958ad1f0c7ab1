package frequency

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"nullmark/extract/kerr"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// load reads a reference file: values computed in the frequency domain by an
// independent program (horizon Frobenius and large-r series, Taylor steps of the
// radial equation, 110 to 260 bits); see its "origin".
func load(t *testing.T, name string, into any) {
	t.Helper()
	data, err := os.ReadFile("testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
}

func off(got, want float64) float64 { return math.Abs(got/want - 1) }

// Strain of every spherical mode in amplitude and phase, and absorption of every
// spheroidal one, on circular equatorial orbits.
func TestCircular(t *testing.T) {
	var ref struct {
		Orbits []struct {
			A          float64
			R0         float64
			Spheroidal []struct {
				L, M int
				E    float64 `json:"energy_horizon"`
			}
			Spherical []struct {
				L, M   int
				Strain [2]float64
			}
		}
	}
	load(t, "circular_kerr.json", &ref)
	const n = 10
	for _, o := range ref.Orbits {
		h, err := hyperboloidal.NewKerr(o.A)
		if err != nil {
			t.Fatal(err)
		}
		orb, err := worldline.NewKerrBound(h, o.R0, 0, 1, 0, 0, 0)
		if err != nil {
			t.Fatal(err)
		}
		for m := 1; m <= 6; m++ {
			om, src := CircularSources(h, orb, -2, m, n, 0)
			p, err := New(h, -2, m, n, om[0])
			if err != nil {
				t.Fatal(err)
			}
			z, err := p.Solve(src[0], 32)
			if err != nil {
				t.Fatal(err)
			}
			sp, err := kerr.NewSpheroidal(h, m, n, om[0])
			if err != nil {
				t.Fatal(err)
			}
			hor := sp.Horizon(z.Horizon)
			strongest := cmplx.Abs(kerr.Strain(om[0], z.Infinity[0]))
			for _, q := range o.Spherical {
				if q.M != m {
					continue
				}
				// a few 1e-13 of the strongest mode is round-off: the weak ones
				// are what the spheroidal modes of low l leave in them
				s := complex(q.Strain[0], q.Strain[1])
				d := cmplx.Abs(kerr.Strain(om[0], z.Infinity[q.L-p.LMin]) - s)
				if allowed := 1e-10*cmplx.Abs(s) + 5e-13*strongest; !(d < allowed) {
					t.Errorf("a=%g r=%g (%d,%d): strain off by %.1e of %.1e", o.A, o.R0, q.L, m, d, cmplx.Abs(s))
				}
			}
			for _, q := range o.Spheroidal {
				if q.M == m {
					if d := off(2*hor[q.L-p.LMin].Energy, q.E); !(d < 1e-10) {
						t.Errorf("a=%g r=%g (%d,%d): absorption off by %.1e", o.A, o.R0, q.L, m, d)
					}
				}
			}
		}
	}
}

// Inclined circular orbit: energy and angular momentum per m at infinity and the
// energy into the hole.
func TestInclined(t *testing.T) {
	var ref struct {
		Orbits []struct {
			A, R0 float64
			Inc   float64 `json:"inclination_degrees"`
			PerM  []struct {
				M int
				E float64 `json:"energy_infinity"`
				L float64 `json:"angular_momentum_infinity"`
				H float64 `json:"energy_horizon"`
			} `json:"per_m"`
		}
	}
	load(t, "inclined_kerr.json", &ref)
	const n, kmax = 9, 9
	for _, o := range ref.Orbits {
		h, err := hyperboloidal.NewKerr(o.A)
		if err != nil {
			t.Fatal(err)
		}
		orb, err := worldline.NewKerrBound(h, o.R0, 0, math.Cos(o.Inc*math.Pi/180), 0, 0, 0)
		if err != nil {
			t.Fatal(err)
		}
		for _, q := range o.PerM {
			if q.M > 3 {
				continue // the sum over l and k beyond these sizes counts there
			}
			var e, l, hor float64
			om, src := CircularSources(h, orb, -2, q.M, n, kmax)
			for k, w := range om {
				if math.Abs(w) < 1e-9 {
					continue
				}
				p, err := New(h, -2, q.M, n, w)
				if err != nil {
					t.Fatal(err)
				}
				z, err := p.Solve(src[k], 28)
				if err != nil {
					t.Fatal(err)
				}
				sp, err := kerr.NewSpheroidal(h, q.M, n, w)
				if err != nil {
					t.Fatal(err)
				}
				for i := range n {
					r := kerr.Infinity(q.M, w, z.Infinity[i])
					e += r.Energy
					l += r.AngularMomentum
					hor += sp.Horizon(z.Horizon)[i].Energy
				}
			}
			both := 2.0
			if q.M == 0 {
				both = 1
			}
			if !(off(both*e, q.E) < 2e-10) || !(off(both*hor, q.H) < 2e-10) {
				t.Errorf("m=%d: energy off by %.1e at infinity, %.1e at the horizon", q.M, off(both*e, q.E), off(both*hor, q.H))
			}
			if q.M > 0 && !(off(both*l, q.L) < 2e-10) {
				t.Errorf("m=%d: angular momentum off by %.1e", q.M, off(both*l, q.L))
			}
		}
	}
}

// The answer does not depend on the collocation: more nodes, same digits, for
// orbits from near the hole of a fast spin to far away.
func TestNodesConverge(t *testing.T) {
	for _, c := range []struct {
		a, r float64
		m    int
		tol  float64
	}{{0.99, 1.6, 2, 1e-9}, {0.999, 1.3, 2, 3e-9}, {-0.7, 9, 1, 1e-10}, {0.9, 100, 2, 1e-9}} {
		h, err := hyperboloidal.NewKerr(c.a)
		if err != nil {
			t.Fatal(err)
		}
		orb, err := worldline.NewKerrBound(h, c.r, 0, 1, 0, 0, 0)
		if err != nil {
			t.Fatal(err)
		}
		const n = 6
		om, src := CircularSources(h, orb, -2, c.m, n, 0)
		p, err := New(h, -2, c.m, n, om[0])
		if err != nil {
			t.Fatal(err)
		}
		a, err := p.Solve(src[0], 34)
		if err != nil {
			t.Fatal(err)
		}
		b, err := p.Solve(src[0], 44)
		if err != nil {
			t.Fatal(err)
		}
		d := cmplx.Abs(a.Infinity[0]-b.Infinity[0]) / cmplx.Abs(b.Infinity[0])
		e := cmplx.Abs(a.Horizon[0]-b.Horizon[0]) / cmplx.Abs(b.Horizon[0])
		if !(d < c.tol) || !(e < c.tol) {
			t.Errorf("a=%g r=%g m=%d: nodes change the amplitudes by %.1e, %.1e", c.a, c.r, c.m, d, e)
		}
	}
}

// At zero spin the strain is that of the Regge–Wheeler–Zerilli formalism, phase
// and odd-parity sign included (computed for this project in the frequency
// domain, 9 digits).
func TestZeroSpinStrain(t *testing.T) {
	h, err := hyperboloidal.NewKerr(0)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		r    float64
		l, m int
		want complex128
	}{
		{10, 2, 2, -0.560320396 + 0.152880419i}, {10, 2, 1, 0.013594004 + 0.068336424i},
		{10, 3, 3, -0.059153776 - 0.120190845i}, {10, 3, 2, -0.016204208 + 0.006225749i},
		{10, 4, 4, 0.031365476 - 0.022686644i}, {6, 2, 2, -0.946440351 + 0.318494176i},
		{6, 2, 1, 0.050385431 + 0.157572581i}, {6, 4, 4, 0.071835264 - 0.083685687i},
	} {
		o, err := worldline.NewKerrBound(h, c.r, 0, 1, 0, 0, 0)
		if err != nil {
			t.Fatal(err)
		}
		all, err := Circular(h, o, -2, c.m, c.l-max(2, c.m)+1, 0)
		if err != nil {
			t.Fatal(err)
		}
		got := kerr.Strain(all[0].Omega, all[0].Infinity[c.l-all[0].LMin])
		if cmplx.Abs(got-c.want) > 1.5e-9 {
			t.Errorf("r=%g (%d,%d): %.10f, want %.10f", c.r, c.l, c.m, got, c.want)
		}
	}
}

// Tilting an orbit of a hole without spin changes nothing but the share of each
// m: the sum over m at every l is that of the equatorial orbit, at both ends.
func TestTiltedAtZeroSpin(t *testing.T) {
	h, err := hyperboloidal.NewKerr(0)
	if err != nil {
		t.Fatal(err)
	}
	sum := func(c float64) (inf, hor [2]float64) {
		o, err := worldline.NewKerrBound(h, 8, 0, c, 0, 0.3, 0)
		if err != nil {
			t.Fatal(err)
		}
		for m := range 4 {
			n := 4 - max(2, m)
			all, err := Circular(h, o, -2, m, n, 6) // |m + k| <= l
			if err != nil {
				t.Fatal(err)
			}
			both := 2.0
			if m == 0 {
				both = 1
			}
			for _, z := range all {
				sp, err := kerr.NewSpheroidal(h, m, n, z.Omega)
				if err != nil {
					t.Fatal(err)
				}
				for i := range n {
					l := z.LMin + i
					inf[l-2] += both * kerr.Infinity(m, z.Omega, z.Infinity[i]).Energy
					hor[l-2] += both * sp.Horizon(z.Horizon)[i].Energy
				}
			}
		}
		return
	}
	i0, h0 := sum(1)
	i1, h1 := sum(math.Cos(0.9))
	for l := range i0 {
		if a, b := off(i1[l], i0[l]), off(h1[l], h0[l]); !(a < 1e-10) || !(b < 1e-10) {
			t.Errorf("l=%d: the tilt changes the flux by %.1e at infinity, %.1e at the horizon", l+2, a, b)
		}
	}
}
