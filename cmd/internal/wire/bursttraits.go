package wire

import (
	"math"

	"nullmark/equations"
	"nullmark/extract/certify"
	"nullmark/extract/peak"
	"nullmark/extract/recoil"
	"nullmark/extract/result"
	"nullmark/extract/signal"
	"nullmark/extract/strain"
	"nullmark/source/worldline"
)

// traitStep is the sampling of the series from which peaks and recoil are read.
const traitStep = 0.25

// times are the retarded times from which a transient's traits are read.
func (r *burstRun) times() []float64 {
	return ladderOfTimes(traitStep, r.after, r.n.domain.Retarded(r.ends)-1)
}

// seriesOn is the strain (or its time derivative) of a mode on one rung.
func (r *burstRun) seriesOn(m *ladder, rung int, at []float64, rate bool) signal.Series {
	s := m.runs[rung]
	field := s.Psi[certify.Infinity]
	if rate {
		field = s.Pi[certify.Infinity]
	}
	v := strain.Resample(field, r.n.domain.Retarded(0), s.Dt, at)
	fac := strain.Factor(m.l, m.parity == equations.Odd)
	for i := range v {
		v[i] *= fac
	}
	return signal.Series{Start: at[0], Dt: traitStep, Values: v}
}

// peaks fills the maximum of |r h_lm| of every mode with m > 0, its delay against
// the peak orbital frequency, and the values at the light-ring crossing.
func (r *burstRun) peaks(res *result.Result) {
	if !r.falls {
		return
	}
	at := r.times()
	left := certify.Leftover(min(r.n.order, r.n.moments, resampled))
	markers := map[string]float64{}
	for _, k := range r.path.Markers() {
		markers[k.Name] = k.T
	}
	for _, m := range r.modes {
		entry := res.Find(m.l, m.m)
		if m.m == 0 || entry == nil {
			continue
		}
		fine, mid := r.seriesOn(m, m.rung, at, false), r.seriesOn(m, m.rung-1, at, false)
		fine.Err = make([]float64, len(at))
		for i, u := range at {
			fine.Err[i] = r.starts[m].at(int(certify.Infinity), u+r.n.domain.So) * abs(strain.Factor(m.l, false))
		}
		o := peak.Options{From: r.event - 60, To: at[len(at)-1] - 5, Coarse: &mid, Factor: math.Max(left, r.unsettledAtPeak(m, at, fine, mid))}
		p, err := peak.Find(fine, o)
		if err != nil {
			continue // a mode without a clear maximum has none to report
		}
		_, dphi := r.path.Uncertainty()
		if t, ok := markers[worldline.MarkPeakOmega]; ok {
			p.Delay = peak.Delay(p.U, result.Q{Value: t, Error: dphi})
		}
		if t, ok := markers[worldline.MarkLightRing]; ok {
			if q, err := peak.At(fine, t, o); err == nil {
				p.AtLightRing = q
			}
		}
		p.U.Value += r.origin
		entry.Peak = p
	}
}

// unsettledAtPeak is what the rungs leave open around a mode's largest sample,
// in units of their last difference, as they approach each other there.
func (r *burstRun) unsettledAtPeak(m *ladder, at []float64, fine, mid signal.Series) float64 {
	if m.runs[m.rung-2] == nil {
		return 0
	}
	coarse := r.seriesOn(m, m.rung-2, at, false)
	top := 0
	for i, v := range fine.Values {
		if at[i] >= r.event-60 && abs(v) > abs(fine.Values[top]) {
			top = i
		}
	}
	last, before := []float64{0}, []float64{0}
	const reach = int(12 / traitStep)
	for i := max(0, top-reach); i <= min(len(at)-1, top+reach); i++ {
		last[0] = math.Max(last[0], abs(fine.Values[i]-mid.Values[i]))
		before[0] = math.Max(before[0], abs(mid.Values[i]-coarse.Values[i]))
	}
	return unsettled(last, before)[0]
}

func abs(z complex128) float64 { return math.Hypot(real(z), imag(z)) }

// rates are the time derivatives of all modes' strains, from the finest rung but
// back, with what the start-up may have left in them as bars.
func (r *burstRun) rates(at []float64, back int) []recoil.Mode {
	var out []recoil.Mode
	for _, m := range r.modes {
		s := r.seriesOn(m, m.rung-back, at, true)
		s.Err = make([]float64, len(at))
		fac := abs(strain.Factor(m.l, false))
		for i, u := range at {
			s.Err[i] = fac * math.Sqrt(math.Max(r.starts[m].density(certify.Infinity, u+r.n.domain.So, 10), 0))
		}
		out = append(out, recoil.Mode{L: m.l, M: m.m, Rate: s})
	}
	return out
}

// circles says whether the orbit turns slowly, almost on a circle, where the
// counted range begins: an inspiral, or a bound particle with angular momentum
// that starts its plunge.
func (r *burstRun) circles() bool {
	var s worldline.State
	r.path.At(0, &s)
	return r.falls && s.L != 0 && s.E < 1
}

// kick is the recoil from all neighbouring pairs of modes that were run.
func (r *burstRun) kick(res *result.Result) {
	at := r.times()
	rates := func(back int) []recoil.Mode { return r.rates(at, back) }
	lMax := 0
	for _, m := range r.modes {
		lMax = max(lMax, m.l)
	}
	fine, err := recoil.Of(rates(0), lMax)
	if err != nil {
		return
	}
	mid, err := recoil.Of(rates(1), lMax)
	if err != nil {
		return
	}
	k, err := recoil.Kick(fine, recoil.Options{
		From: at[0], To: at[len(at)-1], Turning: r.turning || r.circles(),
		Coarse: mid, Factor: certify.Leftover(min(r.n.order, r.n.moments)),
	})
	if err == nil {
		res.Total.Recoil = k
	}
}
