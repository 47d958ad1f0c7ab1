package coupled

import (
	"context"
	"math"
	"math/cmplx"
	"testing"

	"nullmark/equations"
	"nullmark/equations/evolve"
	"nullmark/equations/semi"
	"nullmark/grid"
	"nullmark/grid/march"
	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
	"nullmark/source"
	"nullmark/source/worldline"
)

// lagrange interpolates v, sampled at whole numbers, at x by twelve nodes.
func lagrange(v []complex128, x float64) complex128 {
	const n = 12
	k := min(max(int(x)-n/2+1, 0), len(v)-n)
	var s complex128
	for i := range n {
		w := 1.0
		for j := range n {
			if j != i {
				w *= (x - float64(k+j)) / float64(i-j)
			}
		}
		s += complex(w, 0) * v[k+i]
	}
	return s
}

// plunge evolves m of a fall with the constants of the ISCO from 0.992 of its
// radius through the horizon and returns psi4_lm against u for the lowest l's.
func plunge(t *testing.T, a float64, m, angular int, dx, widest, until float64, us []float64) [][]complex128 {
	t.Helper()
	h := hole(t, a)
	k, _, err := worldline.CircularKerr(h, h.ISCO())
	if err != nil {
		t.Fatal(err)
	}
	d := Fall(h, 0.992*h.ISCO(), widest)
	r := d.Plunge(dx, angular)
	track, err := FallTrack(r, k.E, k.L, 0.992*h.ISCO(), 0, true, until)
	if err != nil {
		t.Fatal(err)
	}
	run, err := Moving(Equation{S: -2, M: m}, r, track)
	if err != nil {
		t.Fatal(err)
	}
	if err := run.Until(context.Background(), until); err != nil {
		t.Fatal(err)
	}
	var out [][]complex128
	for l := range min(3, angular) {
		var w []complex128
		for _, u := range us {
			w = append(w, lagrange(run.Fields.Phi[Infinity][l], (u+run.Fields.So)/run.Fields.Dt))
		}
		out = append(out, w)
	}
	return out
}

// worst returns the largest |a-b| over the peak of |a|.
func worst(a, b []complex128) float64 {
	peak, d := 0.0, 0.0
	for i := range a {
		peak = math.Max(peak, cmplx.Abs(a[i]))
		d = math.Max(d, cmplx.Abs(a[i]-b[i]))
	}
	return d / peak
}

func times(from, to, step float64) []float64 {
	var u []float64
	for x := from; x <= to; x += step {
		u = append(u, x)
	}
	return u
}

// Two equations, two sources, two normalisations, two slicings, one plunge: at
// a = 0, psi4_lm = (1/4) sqrt((l+2)!/(l-2)!) d2 Psi/du2 with the Zerilli–Moncrief
// function, phase and time label included.
func TestPlungeEqualsMaster(t *testing.T) {
	// before u = 310 the two start-ups, which differ, still ring
	us := times(310, 545, 0.5)
	got := plunge(t, 0, 2, 2, 0.26, 0.4, 620, us)[0]
	want := masterPlunge(t, 2, 2, 0.14, us)
	d := worst(want, got)
	t.Logf("(2,2): %.1e of the peak", d)
	if !(d < 1e-8) {
		t.Errorf("(2,2): the two equations differ by %.1e of the peak", d)
	}
}

func masterPlunge(t *testing.T, l, m int, dx float64, us []float64) []complex128 {
	t.Helper()
	path, err := worldline.NewInfall(0.992*6, math.Sqrt(8.0/9), math.Sqrt(12), 0)
	if err != nil {
		t.Fatal(err)
	}
	const deep = -70.0
	hi := hyperboloidal.TortoiseAt(0.992 * 6)
	s := hyperboloidal.Layers{Si: deep - 30, Ri: deep - 8, Ro: hi + 8, So: hi + 38, Profile: hyperboloidal.Flat(2)}
	g := grid.New(s.Si, s.So, int((s.So-s.Si)/dx)+1)
	geo, err := semi.NewGeometry(s, g, 12)
	if err != nil {
		t.Fatal(err)
	}
	dt := 1.1 * g.Dx
	_, end := path.Span()
	f := source.NewMoving(path, source.NewKernel(2*g.Dx, 16), source.Ramp{Centre: 90, Width: 17}, []source.MasterSource{source.NewMasterSource(l, m)},
		source.Range{From: 0, To: end, Inner: deep, Outer: hi + 1, GridStart: g.Start, Dx: g.Dx, GridPoints: g.N}, dt)
	p := equations.Master(equations.Even, l)
	sys := semi.NewMaster(geo, []equations.Potential{p, p}, f)
	filter := stencil.NewFilter(12, 0.5)
	half := sys.Length() / 2
	scratch := make([]float64, half)
	rec := &lastPoint{half: half}
	run := evolve.Run{
		Stepper: march.NewTaylor(sys, 8, sys.Length()), State: make([]float64, sys.Length()), Dt: dt,
		Observers: []evolve.Observer{rec},
		AfterStep: func(_ float64, u []float64) {
			filter.Apply(u[:half], scratch, grid.Lanes)
			filter.Apply(u[half:], scratch, grid.Lanes)
		},
	}
	if err := run.Advance(context.Background(), int(620/dt)); err != nil {
		t.Fatal(err)
	}
	// d Pi/dtau by centred differences of order 12
	w := stencil.New(1, 12).Scaled(dt).Centre
	acc := make([]complex128, len(rec.pi))
	for k := 6; k < len(acc)-6; k++ {
		for j, c := range w {
			acc[k] += complex(c, 0) * rec.pi[k-6+j]
		}
	}
	norm := 1.0
	for j := l - 1; j <= l+2; j++ {
		norm *= float64(j)
	}
	var out []complex128
	for _, u := range us {
		out = append(out, complex(math.Sqrt(norm)/4, 0)*lagrange(acc, (u+s.So)/dt))
	}
	return out
}

type lastPoint struct {
	half int
	pi   []complex128
}

func (r *lastPoint) Observe(_ int, _ float64, u []float64) {
	at := 2*r.half - grid.Lanes
	r.pi = append(r.pi, complex(u[at], u[at+1]))
}

// A plunge at a = 0.9 through the horizon converges: two rungs, l = 2..4.
func TestPlungeConverges(t *testing.T) {
	if !*long {
		return
	}
	us := times(150, 300, 0.5)
	fine := plunge(t, 0.9, 2, 9, 0.2, 0.32, 380, us)
	coarse := plunge(t, 0.9, 2, 9, 0.25, 0.32, 380, us)
	for l := range fine {
		d := worst(fine[l], coarse[l])
		t.Logf("l=%d: rungs differ by %.1e of the peak", l+2, d)
		// the difference is that of the coarser rung, 13 times the finer one's error
		if !(d < 1e-7) {
			t.Errorf("l=%d: rungs differ by %.1e of the peak", l+2, d)
		}
	}
}
