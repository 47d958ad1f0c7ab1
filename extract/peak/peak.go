// Package peak measures the maximum of |h_lm| of a burst (a plunge, a merger, a
// close passage) and the same quantities at any other time, each with a bar.
//
// With h = A e^{-i phi}: A, dA/du, d^2A/du^2, the frequency omega = dphi/du and
// its slope domega/du follow from h and its derivatives,
//
//	q = h'/h = A'/A - i omega,  r = q' = h''/h - q^2,
//	A''/A = Re r + (Re q)^2,    domega/du = -Im r.
package peak

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/result"
	"nullmark/extract/signal"
)

// Options of Find and At. The zero value looks at the whole series and takes
// its bars as they are.
type Options struct {
	// From and To bound the search for the maximum; both zero: everywhere.
	From, To float64
	// Coarse is the same signal from a coarser run (any sampling), or nil. Its
	// bar is added to those of interpolation and samples; leave the samples'
	// bars nil where they say the same.
	Coarse *signal.Series
	// Factor times the difference from Coarse bounds the error (a power of the
	// ratio of the two spacings, with a margin).
	Factor float64
	// Guard keeps the bar from vanishing where a difference crosses zero: this
	// fraction of what the differences of h and its derivatives could at most
	// have made is added. 0 means 0.3, which
	// covers errors of the two rungs that are turned against each other by as
	// many rad.
	Guard float64
}

// Refusal says why a peak is not reported.
type Refusal struct {
	U   float64
	Why string
}

func (r *Refusal) Error() string { return fmt.Sprintf("peak: at u = %.6g: %s", r.U, r.Why) }

// quantities in the order in which state holds them.
const (
	amplitude = iota
	slope
	curvature
	frequency
	frequencySlope
	kinds
)

// names are the keys of At.
func names() [kinds]string {
	return [kinds]string{"amplitude", "amplitude_slope", "amplitude_curvature", "frequency", "frequency_slope"}
}

// state holds the quantities at one time, their next derivatives and how each
// depends on the errors of h and its first two derivatives: the error is
// Re sum_d by[d] dh^(d).
type state struct {
	jet *signal.Jet
	v   [kinds]float64
	by  [kinds][4]complex128
	// third derivative of A, second of omega.
	jerk, bend float64
}

func read(s signal.Series, u float64) (*state, error) {
	j, err := s.At(u)
	if err != nil {
		return nil, err
	}
	h := j.D[0]
	a := cmplx.Abs(h)
	if a == 0 {
		return nil, &Refusal{u, "the signal vanishes, so that it has no phase"}
	}
	st := &state{jet: j}
	q := j.D[1] / h
	r := j.D[2]/h - q*q
	p := j.D[3]/h - 3*q*r - q*q*q
	x := real(q)
	st.v = [kinds]float64{
		amplitude:      a,
		slope:          a * x,
		curvature:      a * (real(r) + x*x),
		frequency:      -imag(q),
		frequencySlope: -imag(r),
	}
	st.jerk = a * (real(p) + 3*x*real(r) + x*x*x)
	st.bend = -imag(p)
	// Complex-linear in eta_d = dh^(d)/h: the errors of ln h, q and r.
	ln := [4]complex128{1 / h}
	dq := [4]complex128{-q / h, 1 / h}
	dr := [4]complex128{(q*q - r) / h, -2 * q / h, 1 / h}
	ca := complex(a, 0)
	for d := range ln {
		st.by[amplitude][d] = ca * ln[d]
		st.by[slope][d] = ca * (dq[d] + complex(x, 0)*ln[d])
		st.by[curvature][d] = ca*(dr[d]+complex(2*x, 0)*dq[d]) + complex(st.v[curvature], 0)*ln[d]
		st.by[frequency][d] = 1i * dq[d] // Re(i z) = -Im z
		st.by[frequencySlope][d] = 1i * dr[d]
	}
	return st, nil
}

// second is what terms of second order in the relative error of h add to a
// first-order bar.
func (st *state) second(bar float64) float64 {
	e := st.jet.Linear(st.by[amplitude]) / st.v[amplitude]
	return bar * (1 + 2*e)
}

// At returns amplitude, amplitude_slope, amplitude_curvature (of |h|),
// frequency and frequency_slope at time u, e.g. that of a marker of the orbit.
// It refuses where the amplitude is not above its bar.
func At(s signal.Series, u float64, o Options) (map[string]result.Q, error) {
	if err := s.Check(); err != nil {
		return nil, err
	}
	st, err := read(s, u)
	if err != nil {
		return nil, err
	}
	var bars [kinds]float64
	for i := range bars {
		bars[i] = st.second(st.jet.Linear(st.by[i]))
	}
	if o.Coarse != nil {
		if err := o.Coarse.Check(); err != nil {
			return nil, fmt.Errorf("peak: the coarser series: %w", err)
		}
		ct, err := read(*o.Coarse, u)
		if err != nil {
			return nil, err
		}
		for i := range bars {
			bars[i] += o.rung(st.v[i], ct.v[i], st.by[i], st.jet, ct.jet)
		}
	}
	if bars[amplitude] >= st.v[amplitude] {
		return nil, &Refusal{u, fmt.Sprintf("the amplitude %.3g is not above its error bar %.3g", st.v[amplitude], bars[amplitude])}
	}
	out := make(map[string]result.Q, kinds)
	for i, n := range names() {
		out[n] = result.Q{Value: st.v[i], Error: bars[i]}
	}
	return out, nil
}

// rung is what the coarser series adds to the bar of a quantity of value v here
// and other there, whose error depends on those of h and its derivatives by c:
// Factor times the difference of the two, and the guard's part of what the
// differences of h, h', h” at the same time could have made of it.
func (o Options) rung(v, other float64, c [4]complex128, here, there *signal.Jet) float64 {
	guard := o.Guard
	if guard == 0 {
		guard = 0.3
	}
	var could float64
	for d := range c {
		could += cmplx.Abs(c[d]) * cmplx.Abs(here.D[d]-there.D[d])
	}
	return o.Factor * (math.Abs(v-other) + guard*could)
}

// locate returns the state at the maximum of |h| in the samples first..last.
func locate(s signal.Series, first, last int) (*state, error) {
	k, top := first, -1.0
	for i := first; i <= last; i++ {
		if a := cmplx.Abs(s.Values[i]); a > top {
			k, top = i, a
		}
	}
	const margin = 3
	if k < first+margin || k > last-margin {
		return nil, &Refusal{s.Time(k), "the largest amplitude lies at an end of the interval, where it need not be a maximum"}
	}
	u := s.Time(k)
	var st *state
	for range 50 {
		var err error
		if st, err = read(s, u); err != nil {
			return nil, err
		}
		if !(st.v[curvature] < 0) {
			return nil, &Refusal{u, "the amplitude has no resolved maximum (its curvature is not negative)"}
		}
		step := -st.v[slope] / st.v[curvature]
		step = math.Max(-s.Dt, math.Min(step, s.Dt))
		u += step
		if math.Abs(u-s.Time(k)) > 3*s.Dt {
			return nil, &Refusal{u, "the amplitude is too rough around its largest sample for a maximum to be located"}
		}
		if math.Abs(step) <= 1e-13*math.Max(1, math.Abs(u)) {
			break
		}
	}
	return read(s, u)
}

// Find measures the largest maximum of |h| in [From, To]. It refuses (a
// *Refusal) when that lies at an end of the interval, or is not resolved by the
// samples and their bars. Delay and AtLightRing are left for the caller, who
// knows the orbit.
func Find(s signal.Series, o Options) (*result.Peak, error) {
	if err := s.Check(); err != nil {
		return nil, err
	}
	first, last, err := s.Span(o.From, o.To)
	if err != nil {
		return nil, err
	}
	st, err := locate(s, first, last)
	if err != nil {
		return nil, err
	}
	by := atMaximum(st)
	j := st.jet
	u := result.Q{Value: j.U, Error: st.second(j.Linear(by.u))}
	var bars [kinds]float64
	for i := range bars {
		bars[i] = st.second(j.Linear(by.v[i]))
	}
	if o.Coarse != nil {
		if err := o.Coarse.Check(); err != nil {
			return nil, fmt.Errorf("peak: the coarser series: %w", err)
		}
		top, err := partner(*o.Coarse, j.U)
		if err != nil {
			return nil, err
		}
		there, err := o.Coarse.At(j.U)
		if err != nil {
			return nil, err
		}
		u.Error += o.rung(j.U, top.jet.U, by.u, j, there)
		for i := range bars {
			bars[i] += o.rung(st.v[i], top.v[i], by.v[i], j, there)
		}
	}
	// The maximum's time is known to first order only.
	u.Error += math.Abs(st.jerk/(2*st.v[curvature])) * u.Error * u.Error
	bars[amplitude] += math.Abs(st.v[curvature]) / 2 * u.Error * u.Error
	if bars[curvature] >= -st.v[curvature] {
		return nil, &Refusal{j.U, fmt.Sprintf("the maximum is flatter than the error bars can tell (curvature %.3g with bar %.3g)", st.v[curvature], bars[curvature])}
	}
	q := func(i int) result.Q { return result.Q{Value: st.v[i], Error: bars[i]} }
	return &result.Peak{
		U:                  u,
		Amplitude:          q(amplitude),
		Frequency:          q(frequency),
		AmplitudeCurvature: q(curvature),
		FrequencySlope:     q(frequencySlope),
	}, nil
}

// partner finds the maximum of the coarse series near u.
func partner(c signal.Series, u float64) (*state, error) {
	const around = 5 // M
	k := func(t float64) int {
		return max(0, min(int(math.Round((t-c.Start)/c.Dt)), len(c.Values)-1))
	}
	wide := math.Max(around, 8*c.Dt)
	st, err := locate(c, k(u-wide), k(u+wide))
	if err != nil {
		return nil, fmt.Errorf("peak: the coarser series has no maximum of its own near u = %.6g: %w", u, err)
	}
	return st, nil
}

// dependence is how the maximum's time and the quantities there depend on the
// errors of h, h', h”.
type dependence struct {
	u [4]complex128
	v [kinds][4]complex128
}

// atMaximum adds to each quantity's dependence that of the time at which it is
// taken: du = -dA'/A”.
func atMaximum(st *state) dependence {
	out := dependence{v: st.by}
	rate := [kinds]float64{
		amplitude:      0,
		slope:          st.v[curvature],
		curvature:      st.jerk,
		frequency:      st.v[frequencySlope],
		frequencySlope: st.bend,
	}
	for d := range out.u {
		out.u[d] = st.by[slope][d] / complex(-st.v[curvature], 0)
		for i := range out.v {
			out.v[i][d] += complex(rate[i], 0) * out.u[d]
		}
	}
	return out
}

// Delay is the maximum's time minus that of an event of the orbit (both as
// retarded times), e.g. the peak of the orbital frequency; the bars add.
func Delay(u, event result.Q) *result.Q {
	return &result.Q{Value: u.Value - event.Value, Error: u.Error + event.Error}
}
