package source

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/grid/stencil"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// At2 returns delta(x) and its first two derivatives in x.
func (k Kernel) At2(x float64) (d, d1, d2 float64) {
	scale := 1 / (math.Sqrt2 * k.Sigma)
	z := x * scale
	g := math.Exp(-z*z) / (math.Sqrt(2*math.Pi) * k.Sigma)
	h0, h1 := 1.0, 2*z
	for j, c := range k.c {
		n := float64(2*j + 1)
		h2 := 2*z*h1 - 2*n*h0
		h3 := 2*z*h2 - 2*(n+1)*h1
		d += c * h0
		d1 -= c * h1
		d2 += c * h2
		h0, h1 = h2, h3
	}
	return g * d, g * d1 * scale, g * d2 * scale * scale
}

// TeukolskyReach is how many widths the kernel and its first two derivatives are
// carried to: cut at 9.5 they leave 1e-11 in the flux, at 12.5 nothing.
const TeukolskyReach = 12.5

// radialDeltas returns delta(x - x_p) and its first two derivatives in x, at a
// grid point of the slicing at the distance drho = rho - rho_p from the
// particle: with w = 1/x' < 0,
//
//	delta(x-x_p) = -w delta(rho-rho_p),  d/dx = w d/drho.
func radialDeltas(k Kernel, p *hyperboloidal.KerrPoint, drho float64) [3]float64 {
	d, d1, d2 := k.At2(drho)
	w := 1 / p.X1
	w1 := -p.X2 * w * w
	w2 := (-p.X3 + 2*p.X2*p.X2*w) * w * w
	return [3]float64{
		-w * d,
		-w * (w1*d + w*d1),
		-w * ((w1*w1+w*w2)*d + 3*w*w1*d1 + w*w*d2),
	}
}

// KerrCarrier is what a Teukolsky forcing needs to know of the grid that carries
// it: the sampled slicing, the number n of l from LMin on, and Finish, which
// turns the 2n numbers (n real parts, n imaginary parts) of the source at point
// i into those of the right-hand side, in place.
type KerrCarrier struct {
	Slicing hyperboloidal.KerrLayers
	Points  []hyperboloidal.KerrPoint
	S, M    int
	LMin, N int
	Finish  func(i int, v []float64)
}

// project returns the projection of either spin weight.
func (c *KerrCarrier) project(k worldline.KerrState, at hyperboloidal.KerrPoint) Projection {
	a := c.Slicing.Hole.Spin()
	if c.S == 2 {
		return ProjectPlus2(a, c.M, k, at)
	}
	return ProjectMinus2(a, k, at)
}

// coefficients fills dst (n entries) with the c_jk of every l.
func (c *KerrCarrier) coefficients(dst [][6]complex128, h [3][]float64, k worldline.KerrState, at hyperboloidal.KerrPoint) {
	p := c.project(k, at)
	HarmonicLadder(h, c.S, c.M, c.LMin, math.Atan2(k.Sin, k.Cos))
	phase := cmplx.Exp(complex(0, -float64(c.M)*k.Phi))
	for i := range dst {
		dst[i] = p.Mode(h[0][i], h[1][i], h[2][i], phase)
	}
}

func newLadder(n int) [3][]float64 {
	return [3][]float64{make([]float64, n), make([]float64, n), make([]float64, n)}
}

func (c *KerrCarrier) support(x, reach float64) (lo, hi int) {
	lo, hi = 0, len(c.Points)
	for lo < hi && c.Points[lo].Rho < x-reach {
		lo++
	}
	for hi > lo && c.Points[hi-1].Rho > x+reach {
		hi--
	}
	return lo, hi
}

// spread writes the source SUM_k C_k delta^(k)(x - x_p) on points lo..hi-1.
func (c *KerrCarrier) spread(dst []float64, lo, hi int, k Kernel, rho float64, amp [][3]complex128) {
	st := 2 * c.N
	for i := lo; i < hi; i++ {
		d := radialDeltas(k, &c.Points[i], c.Points[i].Rho-rho)
		v := dst[(i-lo)*st : (i-lo+1)*st]
		for l := range amp {
			a := &amp[l]
			v[l] = real(a[0])*d[0] + real(a[1])*d[1] + real(a[2])*d[2]
			v[c.N+l] = imag(a[0])*d[0] + imag(a[1])*d[1] + imag(a[2])*d[2]
		}
		c.Finish(i, v)
	}
}

// TeukolskyCircular is the forcing of a particle on a circular equatorial orbit:
// ramp(t) e^{-i m Omega t} times a fixed profile. Time derivatives are exact. It
// is not safe for concurrent use.
type TeukolskyCircular struct {
	ramp    Ramp
	omega   float64
	lo, hi  int
	st      int
	profile []float64
	factor  [MaxDerivative + 1]complex128
	jet     [MaxDerivative + 1]float64
}

// NewTeukolskyCircular places the particle of state k (at t = 0, its Phi the
// ingoing azimuth then) moving with angular velocity omega.
func NewTeukolskyCircular(c KerrCarrier, k worldline.KerrState, omega float64, kern Kernel, ramp Ramp) *TeukolskyCircular {
	f := &TeukolskyCircular{ramp: ramp, omega: float64(c.M) * omega, st: 2 * c.N}
	coeff := make([][6]complex128, c.N)
	c.coefficients(coeff, newLadder(c.N), k, c.Slicing.At(k.Rho))
	dt := complex(0, -f.omega)
	amp := make([][3]complex128, c.N)
	for l, q := range coeff {
		amp[l] = [3]complex128{q[0] + dt*q[3] + dt*dt*q[5], q[1] + dt*q[4], q[2]}
	}
	f.lo, f.hi = c.support(k.Rho, TeukolskyReach*kern.Sigma)
	f.profile = make([]float64, (f.hi-f.lo)*f.st)
	c.spread(f.profile, f.lo, f.hi, kern, k.Rho, amp)
	return f
}

// Prepare evaluates the time factors and their derivatives at t.
func (f *TeukolskyCircular) Prepare(t, _ float64) {
	f.ramp.Jet(f.jet[:], t)
	e := cmplx.Exp(complex(0, -f.omega*t))
	for j := range f.factor {
		var a complex128
		b := 1.0
		for i := 0; i <= j; i++ {
			a += complex(b*f.jet[i]*math.Pow(f.omega, float64(j-i)), 0) * minusI(j-i)
			b *= float64(j-i) / float64(i+1)
		}
		f.factor[j] = a * e
	}
}

// AddDerivative adds scale times the j-th derivative, j <= MaxDerivative.
func (f *TeukolskyCircular) AddDerivative(dst []float64, j int, scale float64) {
	re, im := real(f.factor[j])*scale, imag(f.factor[j])*scale
	n := f.st / 2
	at := f.lo * f.st
	for i := 0; i < len(f.profile); i += f.st {
		for l := range n {
			x, y := f.profile[i+l], f.profile[i+n+l]
			dst[at+i+l] += re*x - im*y
			dst[at+i+n+l] += re*y + im*x
		}
	}
}

// Add adds the forcing at time t.
func (f *TeukolskyCircular) Add(dst []float64, t float64) {
	f.Prepare(t, 0)
	f.AddDerivative(dst, 0, 1)
}

// KerrTrack is a worldline sampled at uniform slicing times: sample i at
// Start + i Step. Beyond the last sample there is no particle.
type KerrTrack struct {
	Start, Step float64
	States      []worldline.KerrState
}

const (
	trackHalf   = 8 // samples on either side that the time derivatives need
	forceNodes  = 9 // nodes of the forcing's interpolant, two of them before the step
	forceBefore = 2
)

// Lead and Trail say how many samples a forcing needs before the start of the
// first step and after the end of the last one.
const (
	TrackLead  = trackHalf + forceBefore
	TrackTrail = trackHalf + forceBefore
)

// TeukolskyMoving is the forcing of any sampled worldline. The track's step is a
// quarter of the time step; the time derivatives in the source are differences
// of order 8 over every second sample, those of the forcing come from the
// interpolant of degree 8 through nine samples of it, four of them new at each
// step. It is not safe for concurrent use.
type TeukolskyMoving struct {
	c     KerrCarrier
	track KerrTrack
	kern  Kernel
	ramp  Ramp

	first, second []float64   // difference weights, offsets -4..4, per Step
	taylor        [][]float64 // derivative j at node forceBefore, unit spacing
	coeff         ring[[][6]complex128]
	place         ring[float64] // 1/r of the particle
	sample        ring[forceSample]
	ladder        [3][]float64
	amp           [][3]complex128
	now           [forceNodes]*forceSample
	scale         [forceNodes]float64 // Step^-j
}

type forceSample struct {
	lo, hi int
	v      []float64
}

// ring keeps the last entries of a sequence by index.
type ring[T any] struct {
	index []int
	value []T
}

func newRing[T any](n int, fill func() T) ring[T] {
	r := ring[T]{index: make([]int, n), value: make([]T, n)}
	for i := range n {
		r.index[i] = math.MinInt
		if fill != nil {
			r.value[i] = fill()
		}
	}
	return r
}

// slot returns the place of index i and whether it holds it already.
func (r *ring[T]) slot(i int) (*T, bool) {
	k := i % len(r.index)
	if k < 0 {
		k += len(r.index)
	}
	have := r.index[k] == i
	r.index[k] = i
	return &r.value[k], have
}

// NewTeukolskyMoving returns the forcing of a track sampled at a quarter of the
// time step dt that it will be asked for. It panics when the step differs.
func NewTeukolskyMoving(c KerrCarrier, track KerrTrack, kern Kernel, ramp Ramp) *TeukolskyMoving {
	f := &TeukolskyMoving{
		c: c, track: track, kern: kern, ramp: ramp,
		ladder: newLadder(c.N), amp: make([][3]complex128, c.N),
		coeff: newRing(32, func() [][6]complex128 { return make([][6]complex128, c.N) }),
		place: newRing[float64](32, nil),
		sample: newRing(forceNodes, func() forceSample {
			return forceSample{v: make([]float64, 0, 2*c.N*len(c.Points))}
		}),
	}
	h := 2 * track.Step
	f.first = stencil.New(1, 8).Scaled(h).Centre
	f.second = stencil.New(2, 8).Scaled(h).Centre
	nodes := make([]int64, forceNodes)
	for i := range nodes {
		nodes[i] = int64(i)
	}
	s := 1.0
	for j := range forceNodes {
		w := make([]float64, forceNodes)
		for k, r := range stencil.Weights(forceBefore, nodes, j) {
			w[k], _ = r.Float64()
		}
		f.taylor = append(f.taylor, w)
		f.scale[j] = s
		s /= track.Step
	}
	return f
}

// at returns c_jk and 1/r of sample i.
func (f *TeukolskyMoving) at(i int) ([][6]complex128, float64) {
	c, have := f.coeff.slot(i)
	x, _ := f.place.slot(i)
	if !have {
		k := f.track.States[i]
		p := f.c.Slicing.Along(k.Rho)
		*x = p.X
		f.c.coefficients(*c, f.ladder, k, p)
	}
	return *c, *x
}

// force returns the forcing at sample i.
func (f *TeukolskyMoving) force(i int) *forceSample {
	s, have := f.sample.slot(i)
	if have {
		return s
	}
	s.lo, s.hi, s.v = 0, 0, s.v[:0]
	t := f.track.Start + float64(i)*f.track.Step
	var jet [1]float64
	f.ramp.Jet(jet[:], t)
	if jet[0] < 1e-40 || i < trackHalf || i+trackHalf >= len(f.track.States) {
		return s
	}
	rho := f.track.States[i].Rho
	s.lo, s.hi = f.c.support(rho, TeukolskyReach*f.kern.Sigma)
	if s.lo >= s.hi {
		return s
	}
	var x1, x2 float64
	for l := range f.amp {
		f.amp[l] = [3]complex128{}
	}
	for k := -trackHalf / 2; k <= trackHalf/2; k++ {
		c, x := f.at(i + 2*k)
		w1, w2 := f.first[k+trackHalf/2], f.second[k+trackHalf/2]
		x1 += w1 * x
		x2 += w2 * x
		cw1, cw2 := complex(w1, 0), complex(w2, 0)
		for l := range f.amp {
			f.amp[l][0] += cw1*c[l][3] + cw2*c[l][5]
			f.amp[l][1] += cw1 * c[l][4]
		}
	}
	// the terms with derivatives of x_p: C_{k+1} -= c x', -2c'x' + c x'' and c x'^2
	v1, v2 := complex(x1, 0), complex(x2, 0)
	here, _ := f.at(i)
	for k := -trackHalf / 2; k <= trackHalf/2; k++ {
		c, _ := f.at(i + 2*k)
		w := complex(f.first[k+trackHalf/2], 0)
		for l := range f.amp {
			f.amp[l][1] -= 2 * w * c[l][5] * v1
		}
	}
	g := complex(jet[0], 0)
	for l := range f.amp {
		a, c := &f.amp[l], &here[l]
		a[0] += c[0]
		a[1] += c[1] - c[3]*v1 - c[5]*v2
		a[2] += c[2] - c[4]*v1 + c[5]*v1*v1
		a[0] *= g
		a[1] *= g
		a[2] *= g
	}
	s.v = s.v[:(s.hi-s.lo)*2*f.c.N]
	f.c.spread(s.v, s.lo, s.hi, f.kern, rho, f.amp)
	return s
}

// Prepare gathers the nine samples around the step from t to t+dt.
func (f *TeukolskyMoving) Prepare(t, dt float64) {
	if math.Abs(dt-4*f.track.Step) > 1e-9*dt {
		panic(fmt.Sprintf("source: step %g on a track sampled every %g: want a quarter", dt, f.track.Step))
	}
	i := int(math.Round((t - f.track.Start) / f.track.Step))
	for k := range forceNodes {
		f.now[k] = f.force(i + k - forceBefore)
	}
}

// AddDerivative adds scale times the j-th derivative (zero above 8).
func (f *TeukolskyMoving) AddDerivative(dst []float64, j int, scale float64) {
	if j >= forceNodes {
		return
	}
	for k, s := range f.now {
		w := f.taylor[j][k] * f.scale[j] * scale
		if w == 0 || len(s.v) == 0 {
			continue
		}
		d := dst[s.lo*2*f.c.N:][:len(s.v)]
		for i, v := range s.v {
			d[i] += w * v
		}
	}
}

// Add adds the forcing at a time that is a multiple of the track's step.
func (f *TeukolskyMoving) Add(dst []float64, t float64) {
	x := (t - f.track.Start) / f.track.Step
	i := int(math.Round(x))
	if math.Abs(x-float64(i)) > 1e-6 {
		panic("source: forcing of a track asked between its samples")
	}
	s := f.force(i)
	d := dst[s.lo*2*f.c.N:][:len(s.v)]
	for k, v := range s.v {
		d[k] += v
	}
}
