package compare

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/result"
)

// Convention says in which form a model's waveform stands in its file. Empty
// strings mean the first choice, which is the reference's own convention.
type Convention struct {
	Quantity string // "strain", "master" (h = sqrt((l+2)!/(l-2)!) Psi) or "curvature" (psi4 = h''/2)
	Phase    string // "minus": A e^{-i phi}; "plus": A e^{+i phi}
	PhaseOf  string // "particle"; "heavy-body": odd m have the opposite sign
	TimeIs   string // "retarded"; "particle": u = t - r_*(t) is applied
	Per      string // "mu"; "nu": amplitudes are per symmetric mass ratio
	// MassRatio is mu/M, used with Per "nu" only: nu = q/(1+q)^2. Zero is the
	// test-mass limit, where both are the same.
	MassRatio float64
}

// resolved fills in defaults and refuses unknown words.
func (c Convention) resolved() (Convention, error) {
	for _, f := range []struct {
		key     string
		p       *string
		allowed []string
	}{
		{"quantity", &c.Quantity, []string{"strain", "master", "curvature"}},
		{"phase", &c.Phase, []string{"minus", "plus"}},
		{"phase_of", &c.PhaseOf, []string{"particle", "heavy-body"}},
		{"time_is", &c.TimeIs, []string{"retarded", "particle"}},
		{"per", &c.Per, []string{"mu", "nu"}},
	} {
		if *f.p == "" {
			*f.p = f.allowed[0]
		}
		ok := false
		for _, a := range f.allowed {
			ok = ok || a == *f.p
		}
		if !ok {
			return c, &InputError{What: fmt.Sprintf("model.%s is %q", f.key, *f.p), Remedy: fmt.Sprintf("write one of %v", f.allowed)}
		}
	}
	if c.MassRatio < 0 || c.MassRatio > 1 || math.IsNaN(c.MassRatio) {
		return c, &InputError{What: fmt.Sprintf("the mass ratio of the model is %v", c.MassRatio), Remedy: "write a number between 0 and 1"}
	}
	return c, nil
}

// words says what is done to the numbers of the file.
func (c Convention) words() []string {
	var out []string
	add := func(cond bool, s string) {
		if cond {
			out = append(out, s)
		}
	}
	add(c.Phase == "plus", "complex-conjugated (phase: plus)")
	add(c.Quantity == "strain", "read as strain r h_lm/mu")
	add(c.Quantity == "master", "multiplied by sqrt((l+2)!/(l-2)!) (quantity: master)")
	add(c.Quantity == "curvature", "integrated twice, h'' = 2 psi4 (quantity: curvature); the two constants of integration of each mode, which psi4 does not hold, are taken from the reference")
	add(c.PhaseOf == "heavy-body", "odd m multiplied by -1 (phase_of: heavy-body)")
	add(c.Per == "nu" && c.MassRatio == 0, "amplitudes per nu read as per mu (test-mass limit)")
	add(c.Per == "nu" && c.MassRatio > 0, fmt.Sprintf("multiplied by nu/mu = %.9g (per: nu)", c.perNu()))
	add(c.TimeIs == "retarded", "time read as retarded time u")
	add(c.TimeIs == "particle", "times replaced by u = t - r_*(t) along the reference's orbit (time_is: particle)")
	return out
}

func (c Convention) perNu() float64 {
	if c.Per != "nu" {
		return 1
	}
	return 1 / ((1 + c.MassRatio) * (1 + c.MassRatio))
}

// spinFactor is sqrt((l+2)!/(l-2)!).
func spinFactor(l int) float64 { return math.Sqrt(float64((l + 2) * (l + 1) * l * (l - 1))) }

// factor is what the strain of (l,m) is, divided by the file's number, apart
// from conjugation and differentiation.
func (c Convention) factor(l, m int) float64 {
	f := c.perNu()
	if c.Quantity == "master" {
		f *= spinFactor(l)
	}
	if c.PhaseOf == "heavy-body" && m%2 != 0 {
		f = -f
	}
	return f
}

// toStrain turns the file's numbers of one mode, sampled on a, into r h_lm/mu
// in place; for curvature the result lacks a linear function of time. The
// second result, nil but for curvature, is the error of integrating: the
// distance to what two samples fewer give, with a linear function of its own.
func (c Convention) toStrain(l, m int, a axis, z []complex128) []complex128 {
	f := complex(c.factor(l, m), 0)
	for i, x := range z {
		if c.Phase == "plus" {
			x = cmplx.Conj(x)
		}
		z[i] = f * x
	}
	if c.Quantity != "curvature" {
		return nil
	}
	h, e := a.twiceIntegrated(z, 8), a.twiceIntegrated(z, 6)
	for i := range h {
		z[i] = 2 * h[i]
		e[i] = z[i] - 2*e[i]
	}
	return e
}

// lessLinear subtracts from z the linear function of t that fits ref best, with
// weights 1/bar^2 (bar nil: equal weights). off and drift bound what errors of
// ref inside its bars, conspiring, do to that function: at t they change it by
// at most off + drift |t - mid|.
func lessLinear(t []float64, z, ref []complex128, bar []float64) (mid, off, drift float64) {
	least := math.Inf(1)
	for _, b := range bar {
		if b > 0 {
			least = math.Min(least, b)
		}
	}
	weight := func(i int) float64 {
		if bar == nil || !(bar[i] > least) {
			return 1
		}
		return (least / bar[i]) * (least / bar[i])
	}
	var s0, s1, s2 float64
	for i, x := range t {
		s0 += weight(i)
		s1 += weight(i) * (x - t[0])
	}
	mid = t[0] + s1/s0
	var b0, b1 complex128
	for i, x := range t {
		w, d := weight(i), x-mid
		s2 += w * d * d
		b0 += complex(w, 0) * ref[i]
		b1 += complex(w*d, 0) * ref[i]
		if bar != nil {
			off += w * bar[i]
			drift += w * math.Abs(d) * bar[i]
		}
	}
	if s2 <= 0 {
		return mid, 0, 0
	}
	p, q := b0/complex(s0, 0), b1/complex(s2, 0)
	for i, x := range t {
		z[i] -= p + q*complex(x-mid, 0)
	}
	return mid, off / s0, drift / s2
}

// FromStrain writes r h_lm/mu, sampled at the increasing times t (at least ten
// of them), in this convention: the inverse of how a file is read. The result
// is a new slice. TimeIs concerns the times and is the caller's.
func (c Convention) FromStrain(l, m int, t []float64, h []complex128) ([]complex128, error) {
	c, err := c.resolved()
	if err != nil {
		return nil, err
	}
	if len(t) != len(h) || len(t) < taps {
		panic("compare: FromStrain needs as many times as samples, and ten of them")
	}
	z := append([]complex128(nil), h...)
	if c.Quantity == "curvature" {
		a := newAxis(t)
		once := make([]complex128, len(z))
		a.rate(once, z, 9)
		a.rate(z, once, 9)
		for i := range z {
			z[i] /= 2
		}
	}
	f := complex(1/c.factor(l, m), 0)
	for i := range z {
		z[i] *= f
		if c.Phase == "plus" {
			z[i] = cmplx.Conj(z[i])
		}
	}
	return z, nil
}

// retardation relates the particle's time to retarded time along the
// reference's orbit.
type retardation struct {
	a     axis
	rstar []float64
}

// newRetardation keeps the part of the path on which r is far enough from the
// horizon that r_* has all its digits.
func newRetardation(s *result.Series, tortoise func(float64) float64) (*retardation, error) {
	if tortoise == nil || len(s.T) < 2 {
		return nil, &InputError{What: "the reference holds no orbit", Remedy: "give the model's waveform against retarded time (time_is: retarded)"}
	}
	var rs []float64
	n := 0
	for n < len(s.R) {
		x := tortoise(s.R[n])
		if !(x > -24) { // r - r_+ about 1e-6
			break
		}
		rs = append(rs, x)
		n++
	}
	if n < 2 {
		return nil, &InputError{What: "the reference's orbit starts at the horizon", Remedy: "give the model's waveform against retarded time (time_is: retarded)"}
	}
	return &retardation{a: newAxis(s.T[:n]), rstar: rs}, nil
}

// span is the range of particle times covered.
func (r *retardation) span() (float64, float64) { return r.a.t[0], r.a.t[len(r.a.t)-1] }

// u returns t - r_*(t) for increasing times inside span.
func (r *retardation) u(t []float64) []float64 {
	out := make([]float64, len(t))
	r.a.resampleReal(out, t, r.rstar)
	for i := range out {
		out[i] = t[i] - out[i]
	}
	return out
}

// at is u for one time; ok says whether the path covers it.
func (r *retardation) at(t float64) (u float64, ok bool) {
	if r == nil {
		return 0, false
	}
	lo, hi := r.span()
	if !(t >= lo && t <= hi) {
		return 0, false
	}
	return r.u([]float64{t})[0], true
}

// shift converts a model's particle times to retarded times and drops the rows
// that the path does not cover. It returns the kept range.
func (r *retardation) shift(t []float64) (u []float64, from, to int, err error) {
	lo, hi := r.span()
	for from < len(t) && t[from] < lo {
		from++
	}
	to = len(t)
	for to > from && t[to-1] > hi {
		to--
	}
	if to-from < 2 {
		return nil, 0, 0, &InputError{What: fmt.Sprintf("the model's particle times %.6g … %.6g do not overlap with the orbit's %.6g … %.6g", t[0], t[len(t)-1], lo, hi),
			Remedy: "give both against the same time"}
	}
	u = r.u(t[from:to])
	for i := 1; i < len(u); i++ {
		if !(u[i] > u[i-1]) {
			return nil, 0, 0, &InputError{What: fmt.Sprintf("u = t - r_*(t) does not increase at t = %.6g", t[from+i]), Remedy: "check the orbit, or give the waveform against retarded time"}
		}
	}
	return u, from, to, nil
}
