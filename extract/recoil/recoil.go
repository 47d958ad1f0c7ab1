// Package recoil measures the linear momentum that gravitational waves carry
// away in the equatorial plane, and the kick that is left. Units: (mu/M)^2 per M
// for the flux, mu^2/M^2 for the momentum per total mass M.
package recoil

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"

	"nullmark/extract/result"
	"nullmark/extract/signal"
)

// Mode is the rate of the strain, d(r h_lm/mu)/du at null infinity, of one
// (l,m). All modes of a set share their sample times.
type Mode struct {
	L, M int
	Rate signal.Series
}

// Raise is the integral over the sphere of
//
//	sin(theta) e^{i phi} -2Y_lm conj(-2Y_k,m+1),  k = l-1, l, l+1,
//
// and zero for any other k or where one of the harmonics does not exist:
//
//	k = l:   2 sqrt((l-m)(l+m+1)) / (l(l+1))
//	k = l-1: +g_l     sqrt((l-m)(l-m-1)),   g_l = sqrt((l^2-4)/(4l^2-1))/l
//	k = l+1: -g_{l+1} sqrt((l+m+1)(l+m+2))
//
// It follows from the vector character of the normal: the part diagonal in l is
// -s/(l(l+1)) times the raising operator of angular momentum for spin weight
// s = -2, the others are those of scalar harmonics times sqrt(l^2-s^2)/l.
func Raise(l, m, k int) float64 {
	if l < 2 || k < 2 || m < -l || m > l || m+1 > k || m+1 < -k {
		return 0
	}
	x, y := float64(l), float64(m)
	switch k {
	case l:
		return 2 * math.Sqrt((x-y)*(x+y+1)) / (x * (x + 1))
	case l - 1:
		return step(x) * math.Sqrt((x-y)*(x-y-1))
	case l + 1:
		return -step(x+1) * math.Sqrt((x+y+1)*(x+y+2))
	}
	return 0
}

func step(l float64) float64 { return math.Sqrt((l*l-4)/(4*l*l-1)) / l }

// Flux is dP_x/du + i dP_y/du carried by the waves: (1/16 pi) times the
// integral over the sphere of sin(theta) e^{i phi} |sum hdot_lm -2Y_lm|^2. Err
// bounds its error from the bars of the modes; Start and Dt are theirs.
type Flux struct {
	Start, Dt float64
	Values    []complex128
	Err       []float64
	// LMax is the largest l of the modes that went in.
	LMax int
}

// Of sums over all neighbouring pairs among the modes with l <= lMax (0: all).
// Modes with m < 0 that are not given follow from the symmetry of equatorial
// motion, h_{l,-m} = (-1)^l conj(h_lm). Pairs of which a partner is missing are
// left out; a set without any pair, modes given twice, or modes sampled at
// different times are errors.
func Of(modes []Mode, lMax int) (*Flux, error) {
	if len(modes) == 0 {
		return nil, &signal.Fault{What: "no modes to take the momentum flux of"}
	}
	first := modes[0].Rate
	have := map[[2]int]Mode{}
	top := 0
	for _, m := range modes {
		if err := m.Rate.Check(); err != nil {
			return nil, fmt.Errorf("recoil: mode (%d,%d): %w", m.L, m.M, err)
		}
		if !signal.Same(first, m.Rate) {
			return nil, &signal.Fault{What: fmt.Sprintf("modes (%d,%d) and (%d,%d) are sampled at different times", modes[0].L, modes[0].M, m.L, m.M)}
		}
		key := [2]int{m.L, m.M}
		if _, twice := have[key]; twice || m.L < 2 || m.M > m.L || m.M < -m.L {
			return nil, &signal.Fault{What: fmt.Sprintf("mode (%d,%d) is given twice or does not exist", m.L, m.M)}
		}
		if lMax == 0 || m.L <= lMax {
			have[key] = m
			top = max(top, m.L)
		}
	}
	f := &Flux{Start: first.Start, Dt: first.Dt, LMax: top,
		Values: make([]complex128, len(first.Values)), Err: make([]float64, len(first.Values))}
	pairs := 0
	for l := 2; l <= top; l++ {
		for m := -l; m <= l; m++ {
			a, flipA, ok := find(have, l, m)
			if !ok {
				continue
			}
			for k := l - 1; k <= l+1; k++ {
				c := Raise(l, m, k)
				b, flipB, ok := find(have, k, m+1)
				if c == 0 || !ok {
					continue
				}
				pairs++
				f.add(c/(16*math.Pi), a, flipA, b, flipB)
			}
		}
	}
	if pairs == 0 {
		return nil, &signal.Fault{What: "no two modes are neighbours (l differing by at most 1, m by 1), so that no momentum flux can be formed"}
	}
	return f, nil
}

// find returns the mode (l,m), or (l,-m) with the sign of its reflection (0:
// none was needed).
func find(have map[[2]int]Mode, l, m int) (mode Mode, flip float64, ok bool) {
	if mode, ok = have[[2]int{l, m}]; ok {
		return mode, 0, true
	}
	mode, ok = have[[2]int{l, -m}]
	flip = 1
	if l%2 == 1 {
		flip = -1
	}
	return mode, flip, ok
}

func reflect(v complex128, flip float64) complex128 {
	if flip == 0 {
		return v
	}
	return complex(flip, 0) * cmplx.Conj(v)
}

func (f *Flux) add(c float64, a Mode, flipA float64, b Mode, flipB float64) {
	for i := range f.Values {
		x, y := reflect(a.Rate.Values[i], flipA), reflect(b.Rate.Values[i], flipB)
		f.Values[i] += complex(c, 0) * x * cmplx.Conj(y)
		ex, ey := a.Rate.Bar(i), b.Rate.Bar(i)
		f.Err[i] += math.Abs(c) * (ex*cmplx.Abs(y) + ey*cmplx.Abs(x) + ex*ey)
	}
}

// Options of Kick.
type Options struct {
	// From and To bound the integral; From after the start-up. Both zero: all.
	From, To float64
	// Turning says that the orbit turns smoothly and slowly at From (an
	// inspiral): the momentum lost before is then what the flux there is the
	// derivative of, F/q + F q'/q^3 with q = F'/F, and its second term enters
	// the bar. Otherwise the flux is taken to have been zero before From, and
	// what its fall towards From leaves open enters the bar.
	Turning bool
	// Coarse is the flux from a coarser run, or nil; Factor times its kick's
	// difference enters the bar.
	Coarse *Flux
	Factor float64
}

// Kick is the hole's recoil: minus the momentum of the waves, integrated over
// [From, To], with the bars of the modes, of quadrature and of what lies outside
// the interval. An *Open error says that the flux does not fall at an end.
func Kick(f *Flux, o Options) (*result.Recoil, error) {
	p, bar, err := f.momentum(o)
	if err != nil {
		return nil, err
	}
	if o.Coarse != nil {
		c := o
		c.Coarse = nil
		q, _, err := o.Coarse.momentum(c)
		if err != nil {
			return nil, fmt.Errorf("recoil: the coarser run: %w", err)
		}
		bar += o.Factor * cmplx.Abs(p-q)
	}
	return &result.Recoil{
		X:     result.Q{Value: -real(p), Error: bar},
		Y:     result.Q{Value: -imag(p), Error: bar},
		Speed: result.Q{Value: cmplx.Abs(p), Error: bar},
	}, nil
}

// Open says that the flux does not fall off at an end of the interval, so that
// the integral beyond it is not bounded.
type Open struct{ U float64 }

func (e *Open) Error() string {
	return fmt.Sprintf("recoil: the momentum flux does not fall off towards u = %.6g; the interval must reach further", e.U)
}

func (f *Flux) momentum(o Options) (complex128, float64, error) {
	s := signal.Series{Start: f.Start, Dt: f.Dt, Values: f.Values, Err: f.Err}
	first, last, err := s.Span(o.From, o.To)
	if err != nil {
		return 0, 0, err
	}
	n := last - first + 1
	re, im, size, bars := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	top := 0
	for i := range n {
		v := f.Values[first+i]
		re[i], im[i], size[i], bars[i] = real(v), imag(v), cmplx.Abs(v), f.Err[first+i]
		if size[i] > size[top] {
			top = i
		}
	}
	x, ex := signal.Integral(re, f.Dt)
	y, ey := signal.Integral(im, f.Dt)
	e, _ := signal.Integral(bars, f.Dt)
	p, bar := complex(x, y), ex+ey+math.Abs(e)
	rest, ok := signal.Rest(size, bars, f.Dt, (n-top)/6, -float64(top))
	if !ok {
		return 0, 0, &Open{s.Time(last)}
	}
	bar += rest
	if !o.Turning {
		rest, ok = signal.Rest(signal.Reverse(size), signal.Reverse(bars), f.Dt, top/6, float64(top-n))
		if !ok {
			return 0, 0, &Open{s.Time(first)}
		}
		return p, bar + rest, nil
	}
	j, err := s.At(s.Time(first))
	if err != nil {
		return 0, 0, err
	}
	if j.D[0] == 0 || j.D[1] == 0 {
		return p, bar, nil
	}
	q := j.D[1] / j.D[0]
	slope := j.D[2]/j.D[0] - q*q
	correction := j.D[0] * slope / (q * q * q)
	p += j.D[0]/q + correction
	d := [4]complex128{2 / q, -1 / (q * q)}
	return p, bar + j.Linear(d) + cmplx.Abs(correction), nil
}

// Climb is the kick as a function of the largest l that is kept, for every l
// from that of the first pair on, ascending: l and its recoil.
func Climb(modes []Mode, o Options) ([]Step, error) {
	var ls []int
	for _, m := range modes {
		ls = append(ls, m.L)
	}
	sort.Ints(ls)
	var out []Step
	for i, l := range ls {
		if i > 0 && l == ls[i-1] {
			continue
		}
		f, err := Of(modes, l)
		if err != nil {
			if l < ls[len(ls)-1] {
				continue // the lowest l alone may have no neighbours
			}
			return nil, err
		}
		o.Coarse = nil
		r, err := Kick(f, o)
		if err != nil {
			return nil, err
		}
		out = append(out, Step{l, *r})
	}
	return out, nil
}

// Step is the recoil from the modes up to L.
type Step struct {
	L      int
	Recoil result.Recoil
}
