// Package spectrum turns the time derivative of a transient into its energy
// spectrum dE/domega, in units of mu^2.
//
// With f^(omega) = integral f(u) e^{i omega u} du and a mode whose energy is
// c integral |f|^2 du, Parseval's theorem gives, at positive frequencies,
//
//	dE/domega = (c/2 pi) (|f^(omega)|^2 + |f^(-omega)|^2).
package spectrum

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/extract/signal"

	"gonum.org/v1/gonum/dsp/fourier"
)

// Part is one mode: Rate is the time derivative f, Scale the c of the package
// comment.
type Part struct {
	Rate  signal.Series
	Scale float64
}

// Master is the part of a master function with time derivative rate, m and -m
// together: c = (1/64 pi) (l+2)!/(l-2)!, twice that for m != 0.
func Master(l, m int, rate signal.Series) Part {
	return Part{rate, both(m) * flux.Norm(l) / (64 * math.Pi)}
}

// Strain is the part of a strain with time derivative rate, m and -m together:
// c = 1/(16 pi), twice that for m != 0.
func Strain(m int, rate signal.Series) Part { return Part{rate, both(m) / (16 * math.Pi)} }

func both(m int) float64 {
	if m == 0 {
		return 1
	}
	return 2
}

// Options of Of and Peak.
type Options struct {
	// From and To bound the burst, From after the start-up; both zero: all.
	From, To float64
	// Taper is the fraction of the interval over which each end is faded in and
	// out; 0 means 0.1.
	Taper float64
	// Padding multiplies the interval by at least this with zeros, so that
	// frequencies lie closer; 0 means 4.
	Padding float64
	// Coarse are the same parts from a coarser run, in the same order, or nil;
	// Factor times the difference enters the bars.
	Coarse []Part
	Factor float64
}

// Spectrum is dE/domega >= 0 at the frequencies Omega, k times a constant from
// 0 to the samples' highest, and its bars. Energy is its integral over all
// frequencies, to round-off that of the tapered parts over time.
type Spectrum struct {
	Omega, Density, Err []float64
	Energy              float64
}

// Of sums the spectra of the parts, all sampled at the same times. The bar adds
// the samples' bars (their integral bounds the transform's error), what the
// tapers change, what the transform still holds at the highest frequency, and
// the coarser run's difference.
func Of(parts []Part, o Options) (*Spectrum, error) {
	if err := o.check(parts); err != nil {
		return nil, err
	}
	var out *Spectrum
	for i := range parts {
		s, err := one(parts[i], o)
		if err != nil {
			return nil, err
		}
		if out == nil {
			out = s
			continue
		}
		for k := range out.Density {
			out.Density[k] += s.Density[k]
			out.Err[k] += s.Err[k]
		}
		out.Energy += s.Energy
	}
	if o.Coarse != nil {
		c := o
		c.Coarse = nil
		resampled, err := onto(parts, o.Coarse)
		if err != nil {
			return nil, err
		}
		other, err := Of(resampled, c)
		if err != nil {
			return nil, fmt.Errorf("spectrum: the coarser run: %w", err)
		}
		for k := range out.Err {
			out.Err[k] += o.Factor * math.Abs(out.Density[k]-other.Density[k])
		}
	}
	return out, nil
}

func (o Options) check(parts []Part) error {
	if len(parts) == 0 {
		return &signal.Fault{What: "no modes to take the spectrum of"}
	}
	for _, p := range parts {
		if err := p.Rate.Check(); err != nil {
			return err
		}
		if !signal.Same(parts[0].Rate, p.Rate) {
			return &signal.Fault{What: "the modes of a spectrum are sampled at different times"}
		}
	}
	if o.Coarse != nil && len(o.Coarse) != len(parts) {
		return &signal.Fault{What: fmt.Sprintf("%d modes of the coarser run for %d", len(o.Coarse), len(parts))}
	}
	return nil
}

// onto gives the coarser parts the finer ones' sample times. The two have to
// cover the same interval.
func onto(fine, coarse []Part) ([]Part, error) {
	out := make([]Part, len(coarse))
	for i := range coarse {
		a, b, err := signal.Onto(fine[i].Rate, coarse[i].Rate)
		if err != nil {
			return nil, err
		}
		// Times that the coarser run lacks at an end are taken from the finer.
		whole := fine[i].Rate
		whole.Values = append([]complex128(nil), whole.Values...)
		whole.Err = nil
		copy(whole.Values[int(math.Round((a.Start-whole.Start)/whole.Dt)):], b.Values)
		out[i] = Part{whole, coarse[i].Scale}
	}
	return out, nil
}

// fade is a smooth step: all derivatives vanish at 0 and 1.
func fade(x float64) float64 {
	switch {
	case x <= 0:
		return 0
	case x >= 1:
		return 1
	}
	a, b := math.Exp(-1/x), math.Exp(-1/(1-x))
	return a / (a + b)
}

// cut returns the samples of a part in the interval, plain and tapered, and the
// integral of their bars.
func (o Options) cut(s signal.Series) (start float64, plain, tapered []complex128, bar float64, err error) {
	first, last, err := s.Span(o.From, o.To)
	if err != nil {
		return 0, nil, nil, 0, err
	}
	taper := o.Taper
	if taper == 0 {
		taper = 0.1
	}
	n := last - first + 1
	plain = append(plain, s.Values[first:last+1]...)
	tapered = make([]complex128, n)
	for k, v := range plain {
		x := float64(min(k, n-1-k)) / float64(n-1) / taper
		tapered[k] = v * complex(fade(x), 0)
		bar += s.Bar(first+k) * s.Dt
	}
	plain[0] /= 2
	plain[n-1] /= 2
	return s.Time(first), plain, tapered, bar, nil
}

func one(p Part, o Options) (*Spectrum, error) {
	_, plain, tapered, bar, err := o.cut(p.Rate)
	if err != nil {
		return nil, err
	}
	padding := o.Padding
	if padding == 0 {
		padding = 4
	}
	n := 1
	for float64(n) < math.Max(1, padding)*float64(len(plain)) {
		n *= 2
	}
	transform := func(v []complex128) []complex128 {
		x := make([]complex128, n)
		copy(x, v)
		return fourier.NewCmplxFFT(n).Coefficients(nil, x)
	}
	f, g := transform(tapered), transform(plain)
	half := n / 2
	dt := p.Rate.Dt
	out := &Spectrum{Omega: make([]float64, half+1), Density: make([]float64, half+1), Err: make([]float64, half+1)}
	c := p.Scale / (2 * math.Pi) * dt * dt
	domega := 2 * math.Pi / (float64(n) * dt)
	// What is left at the highest frequency is folded back.
	var folded float64
	for k := half - half/16; k <= half+half/16; k++ {
		folded = math.Max(folded, cmplx.Abs(f[k])*dt)
	}
	for k := range out.Omega {
		out.Omega[k] = float64(k) * domega
		// A transform by e^{-i}: index n-k holds e^{+i omega_k u}.
		i, j := (n-k)%n, k
		a, b := cmplx.Abs(f[i]), cmplx.Abs(f[j])
		out.Density[k] = c * (a*a + b*b)
		ea := bar + folded + cmplx.Abs(f[i]-g[i])*dt
		eb := bar + folded + cmplx.Abs(f[j]-g[j])*dt
		out.Err[k] = p.Scale / (2 * math.Pi) * (2*a*dt*ea + ea*ea + 2*b*dt*eb + eb*eb)
		// Indices 0 and n/2 stand for one frequency each, counted twice.
		w := domega
		if k == 0 || k == half {
			w /= 2
		}
		out.Energy += w * out.Density[k]
	}
	return out, nil
}

// moments returns D = sum (c/2 pi)(|f^(omega)|^2+|f^(-omega)|^2) of the parts
// and its first two derivatives in omega, from direct sums over the samples
// (tapered or plain), and how far D' may be off by the samples' bars.
func moments(parts []Part, o Options, omega float64, taper bool) (d [3]float64, slopeBar float64, err error) {
	for _, p := range parts {
		start, v, tapered, bar, err := o.cut(p.Rate)
		if err != nil {
			return d, 0, err
		}
		if taper {
			v = tapered
		}
		// Times from the middle of the energy keep the derivatives small.
		middle, weight := 0.0, 0.0
		for k, x := range v {
			w := real(x)*real(x) + imag(x)*imag(x)
			middle += w * float64(k)
			weight += w
		}
		if weight > 0 {
			middle /= weight
		}
		var spread float64
		for k := range v {
			spread += math.Abs(float64(k)-middle) * p.Rate.Dt * barOf(p.Rate, start, k) * p.Rate.Dt
		}
		for _, w := range [2]float64{omega, -omega} {
			var f [3]complex128
			for k, x := range v {
				t := (float64(k) - middle) * p.Rate.Dt
				z := x * cmplx.Rect(p.Rate.Dt, w*t)
				f[0] += z
				f[1] += z * complex(0, t)
				f[2] -= z * complex(t*t, 0)
			}
			c := p.Scale / (2 * math.Pi)
			sign := math.Copysign(1, w)
			d[0] += c * real(f[0]*cmplx.Conj(f[0]))
			d[1] += c * sign * 2 * real(f[1]*cmplx.Conj(f[0]))
			d[2] += c * 2 * (real(f[2]*cmplx.Conj(f[0])) + real(f[1]*cmplx.Conj(f[1])))
			slopeBar += c * 2 * (cmplx.Abs(f[1])*bar + cmplx.Abs(f[0])*spread + bar*spread)
		}
	}
	return d, slopeBar, nil
}

func barOf(s signal.Series, start float64, k int) float64 {
	return s.Bar(int(math.Round((start-s.Start)/s.Dt)) + k)
}

// Peak is the frequency of the largest dE/domega of the parts together. The bar
// adds what the samples' bars allow (the error of the slope over the curvature),
// the shift without tapers, and Factor times that of the coarser run. It fails
// when the largest density lies at either end of the frequencies.
func Peak(parts []Part, o Options) (result.Q, error) {
	plain := o
	plain.Coarse = nil
	s, err := Of(parts, plain)
	if err != nil {
		return result.Q{}, err
	}
	top := 0
	for k := range s.Density {
		if s.Density[k] > s.Density[top] {
			top = k
		}
	}
	if top == 0 || top == len(s.Density)-1 {
		return result.Q{}, &signal.Fault{What: fmt.Sprintf("the largest dE/domega lies at the end omega = %.4g of the spectrum", s.Omega[top])}
	}
	omega, bar, err := maximum(parts, plain, s.Omega[top], s.Omega[1], true)
	if err != nil {
		return result.Q{}, err
	}
	q := result.Q{Value: omega, Error: bar}
	bare, _, err := maximum(parts, plain, omega, s.Omega[1], false)
	if err != nil {
		return result.Q{}, err
	}
	q.Error += math.Abs(bare - omega)
	if o.Coarse != nil {
		if err := o.check(parts); err != nil {
			return result.Q{}, err
		}
		resampled, err := onto(parts, o.Coarse)
		if err != nil {
			return result.Q{}, err
		}
		other, _, err := maximum(resampled, plain, omega, s.Omega[1], true)
		if err != nil {
			return result.Q{}, err
		}
		q.Error += o.Factor * math.Abs(other-omega)
	}
	return q, nil
}

// maximum climbs by Newton's steps from omega, at most half a cell each.
func maximum(parts []Part, o Options, omega, cell float64, taper bool) (at, bar float64, err error) {
	for range 40 {
		d, slope, err := moments(parts, o, omega, taper)
		if err != nil {
			return 0, 0, err
		}
		if !(d[2] < 0) || slope/-d[2] > math.Abs(omega) {
			return 0, 0, &signal.Fault{What: fmt.Sprintf("dE/domega has no resolved maximum near omega = %.4g", omega)}
		}
		step := math.Max(-cell/2, math.Min(-d[1]/d[2], cell/2))
		omega += step
		bar = slope / -d[2]
		if math.Abs(step) < 1e-13 {
			break
		}
	}
	return omega, bar, nil
}
