package compare

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"nullmark/extract/flux"
	"nullmark/extract/result"
)

// Force is what a model's dynamics lose, against the particle's time T: rates
// (dE/dt of the orbit, or the loss itself: the sign is read off) or, where a
// rate is nil, the constants themselves, which are differentiated. Rates are in
// the units of fluxes, (mu/M)^2 and mu^2/M; constants are per mu and mu M, so
// that their rates are the fluxes' times MassRatio = mu/M, which must be above
// zero for them.
type Force struct {
	File                   string
	MassRatio              float64
	T                      []float64
	EnergyRate, AngMomRate []float64
	Energy, AngMom         []float64
}

// mostShown bounds the points of a balance in comparison.json.
const mostShown = 2000

// balance sets the losses against the measured fluxes, per unit of u:
//
//	-dE/dt dt/du   against   F_inf(u) + F_hor(v) dv/du,
//
// where u = t - r_* and v = t + r_* along the orbit, so that both sides
// integrate to what was lost and what arrived.
func (f *Force) balance(ref *result.Bundle, tortoise func(float64) float64, master bool) (*result.Balance, error) {
	s := ref.Series
	if s == nil || len(s.U) < taps || len(s.Modes) == 0 {
		return nil, &InputError{What: "the reference holds no waveform to measure the flux from", Remedy: "run it with output.keep: [waveform]"}
	}
	if len(f.T) < taps {
		return nil, &InputError{What: fmt.Sprintf("the model's force has %d rows", len(f.T)), Remedy: fmt.Sprintf("give at least %d", taps)}
	}
	ret, err := newRetardation(s, tortoise)
	if err != nil {
		return nil, err
	}
	pathU := ret.u(ret.a.t)
	path := newAxis(pathU)
	lo := math.Max(math.Max(s.JunkUntil, pathU[0]), uAt(ret, f.T[0]))
	hi := math.Min(pathU[len(pathU)-1], uAt(ret, f.T[len(f.T)-1]))
	var hor *horizonSeries
	if master {
		hor = horizonFlux(ref)
	}
	if hor != nil { // v must be covered as well
		for i, t := range ret.a.t {
			if v := t + ret.rstar[i]; v < hor.v.t[0] {
				lo = math.Max(lo, pathU[i])
			} else if v > hor.v.t[len(hor.v.t)-1] {
				hi = math.Min(hi, pathU[i])
				break
			}
		}
	}
	res := ref.Result
	drifts := res.Orbit != nil && (res.Orbit.Kind == "inspiral" || res.Orbit.Kind == "table" && !(res.Orbit.Numbers["period_r"] > 0))
	if drifts { // the loss at t = u is wanted as well
		lo, hi = math.Max(lo, f.T[0]), math.Min(hi, f.T[len(f.T)-1])
	}
	plunges := ""
	if o := res.Orbit; o != nil {
		if isco, ok := o.Markers["isco"]; ok && o.Markers["light_ring"] > isco {
			if at, ok := ret.at(isco); ok && at < hi {
				hi = at
				plunges = "The balance ends where the last stable orbit is crossed: in the plunge what is lost leaves the near field later. "
			}
		}
	}
	a, b := 0, len(s.U)
	for a < b && s.U[a] < lo {
		a++
	}
	for b > a && s.U[b-1] > hi {
		b--
	}
	if b-a < taps && plunges != "" {
		return nil, &InputError{What: "the reference holds too little of the inspiral before the last stable orbit (after its start-up) to set a force against the fluxes", Remedy: "start it further out (orbit.from), or leave model.force out"}
	}
	if b-a < taps {
		return nil, &InputError{What: fmt.Sprintf("the model's force (t = %s … %s) and the reference (u = %s … %s) have no time in common", short(f.T[0]), short(f.T[len(f.T)-1]), short(s.U[0]), short(s.U[len(s.U)-1])),
			Remedy: "give the force along the reference's orbit"}
	}
	u := s.U[a:b]
	t := make([]float64, len(u))
	path.resampleReal(t, u, ret.a.t)
	dtdu := slope(u, t)
	e, l := infinityFlux(s, a, b)
	rate := res.Total != nil && res.Total.Measure == "rate"
	note := "Losses and fluxes are per unit of u; "
	if hor != nil {
		v := make([]float64, len(u))
		for i := range v {
			v[i] = 2*t[i] - u[i]
		}
		dvdu := slope(u, v)
		hor.add(e, l, v, dvdu)
		note += "the horizon's share is measured at the advanced time of the same emission. "
	} else if rate && res.Total.Horizon != nil {
		constant(e, res.Total.Horizon.Energy)
		constant(l, res.Total.Horizon.AngularMomentum)
		note += "the horizon's share is its average. "
	} else {
		note += "the horizon's share is not in the reference and left out. "
	}
	if rate && res.Total.Truncation != nil {
		for _, x := range []*result.Flux{res.Total.Truncation.Infinity, res.Total.Truncation.Horizon} {
			if x != nil {
				constant(e, x.Energy)
				constant(l, x.AngularMomentum)
			}
		}
	}
	if !rate && tailInL(s, a, b, e, l) {
		note += "The modes beyond the largest l are estimated at each time from how the flux falls with l. "
	}
	note += plunges
	if drifts {
		note += "To which time of the orbit a wave belongs is known to about r_* only: the difference between the losses at t = u and at t - r_* = u is part of the bar. "
	}
	out := &result.Balance{Range: &[2]float64{u[0], u[len(u)-1]}}
	bound := res.Orbit != nil && res.Orbit.Kind != "circular" && res.Orbit.Kind != "inspiral"
	if bound {
		note += "On a motion whose radius oscillates, energy stored in the near field makes losses and fluxes differ at each instant; only the averages have to agree. "
	}
	window, whole := periods(u, res.Orbit)
	if !whole {
		return nil, &InputError{What: fmt.Sprintf("the balance covers u = %s … %s, less than two radial periods of %s M", short(u[0]), short(u[len(u)-1]), short(res.Orbit.Numbers["period_r"])),
			Remedy: "give the force over a longer time, or run the reference longer (span.until)"}
	}
	if window < len(u) {
		note += fmt.Sprintf("Averages are over whole radial periods, u = %s … %s. ", short(u[0]), short(u[window-1]))
	}
	for _, k := range []struct {
		what        string
		rates, from []float64
		measured    []result.Q
		total       func(*result.Flux) result.Q
		dst         **result.BalanceOf
	}{
		{"energy", f.EnergyRate, f.Energy, e, func(x *result.Flux) result.Q { return x.Energy }, &out.Energy},
		{"angular momentum", f.AngMomRate, f.AngMom, l, func(x *result.Flux) result.Q { return x.AngularMomentum }, &out.AngMom},
	} {
		rates := k.rates
		if rates == nil && k.from != nil {
			if !(f.MassRatio > 0) {
				return nil, &InputError{What: "the model's force gives the orbit's " + k.what + " per mu, whose rate is the flux times the mass ratio, and no mass ratio is known",
					Remedy: "write model.mass_ratio"}
			}
			rates = slope(f.T, k.from)
			for i := range rates {
				rates[i] /= f.MassRatio
			}
		}
		if rates == nil {
			continue
		}
		loss, miss := f.sample(rates, t)
		of := &result.BalanceOf{}
		for i := range loss {
			loss[i] *= dtdu[i]
			miss[i] *= math.Abs(dtdu[i])
		}
		if drifts {
			at, _ := f.sample(rates, u)
			for i := range loss {
				miss[i] += math.Abs(loss[i] - at[i])
			}
		}
		lossMean, measuredMean := mean(u[:window], loss, miss), meanQ(u[:window], k.measured)
		if rate && res.Total.Infinity != nil { // certified, and with the sum's tail
			measuredMean = k.total(res.Total.Infinity)
			if res.Total.Horizon != nil {
				h := k.total(res.Total.Horizon)
				measuredMean.Value += h.Value
				measuredMean.Error += h.Error
			}
		}
		if lossMean.Value*measuredMean.Value < 0 {
			note += fmt.Sprintf("The %s rate is negative where the measured flux is positive and was read as the orbit's own change. ", k.what)
			for i := range loss {
				loss[i] = -loss[i]
			}
			lossMean.Value = -lossMean.Value
		}
		if q := f.MassRatio; k.rates != nil && q > 0 && q < 0.1 && math.Abs(lossMean.Value/(q*measuredMean.Value)-1) < 0.3 {
			note += fmt.Sprintf("The %s rate is about the mass ratio times the measured flux: it looks as if it were per mu and not in units of (mu/M)^2; nothing was changed. ", k.what)
		}
		step := (len(u) + mostShown - 1) / mostShown
		for i := 0; i < len(u); i += step {
			of.U = append(of.U, u[i])
			m := result.Q{Value: loss[i], Error: miss[i]}
			of.Model = append(of.Model, m)
			of.Measured = append(of.Measured, k.measured[i])
			of.Residual = append(of.Residual, less(m, k.measured[i]))
		}
		of.Average.Model, of.Average.Measured = lossMean, measuredMean
		of.Average.Residual = less(lossMean, measuredMean)
		*k.dst = of
	}
	if out.Energy == nil && out.AngMom == nil {
		return nil, &InputError{What: "the model's force names neither an energy nor an angular momentum", Remedy: "name energy_rate or angular_momentum_rate"}
	}
	out.Note = note[:len(note)-1]
	var horizon [2]float64
	if rate && res.Total.Horizon != nil {
		horizon = [2]float64{res.Total.Horizon.Energy.Value, res.Total.Horizon.AngularMomentum.Value}
	}
	judgeBalance(out, bound, horizon)
	return out, nil
}

// judgeBalance decides on the averages and, where losses and fluxes must agree
// at each instant, on every sample. horizon holds the average fluxes into the
// horizon of energy and angular momentum, zero where they are not known.
func judgeBalance(b *result.Balance, averagesOnly bool, horizon [2]float64) {
	worst := 0.0
	var off []string
	for k, of := range []*result.BalanceOf{b.Energy, b.AngMom} {
		if of == nil {
			continue
		}
		top, text := 0.0, ""
		try := func(residual, measured result.Q, where string) {
			s := math.Abs(residual.Value) / math.Max(residual.Error, 1e-15*math.Abs(measured.Value))
			if s > top {
				top = s
				text = fmt.Sprintf("%s by %s ± %s %% of the measured flux%s", [2]string{"energy", "angular momentum"}[k],
					signed(100*residual.Value/measured.Value), barText(100*math.Abs(residual.Error/measured.Value)), where)
			}
		}
		a := of.Average
		try(a.Residual, a.Measured, " on average")
		if h := horizon[k]; h != 0 && math.Abs(a.Residual.Value+h) <= found*a.Residual.Error {
			text += " (the horizon's share)"
		}
		if !averagesOnly {
			for i := range of.U {
				try(of.Residual[i], of.Measured[i], " at u = "+short(of.U[i]))
			}
		}
		worst = math.Max(worst, top)
		if top > 1 {
			off = append(off, text)
		}
	}
	text := strings.Join(off, " and ")
	switch {
	case worst > found:
		b.Verdict = result.Differs
		b.Sentence = "The model's dynamics do not lose what the waves carry away: losses less fluxes are off in " + text + "."
	case worst > 1:
		b.Verdict = result.CannotTell
		b.Sentence = "Whether the model's dynamics lose what the waves carry away cannot be told: losses less fluxes are off in " + text + "."
	default:
		b.Verdict = result.Inside
		b.Sentence = "The model's dynamics lose what the waves carry away, inside the error bar."
	}
}

// sample interpolates rates at the increasing times t, with an error from two
// samples fewer.
func (f *Force) sample(rates, t []float64) (y, miss []float64) {
	a := newAxis(f.T)
	y, miss = make([]float64, len(t)), make([]float64, len(t))
	n := len(f.T)
	var w [taps]float64
	j := 0
	for i, x := range t {
		x = math.Min(math.Max(x, f.T[0]), f.T[n-1])
		j = a.find(x, j)
		poly := func(k int) float64 {
			first := min(max(j-k/2+1, 0), n-k)
			a.weightsAt(w[:k], x, first)
			s := 0.0
			for q := 0; q < k; q++ {
				s += w[q] * rates[first+q]
			}
			return s
		}
		y[i] = poly(8)
		miss[i] = math.Abs(y[i] - poly(6))
	}
	return y, miss
}

// uAt is u of a particle time, clamped to the path.
func uAt(r *retardation, t float64) float64 {
	lo, hi := r.span()
	u, _ := r.at(math.Min(math.Max(t, lo), hi))
	return u
}

// slope is dy/du of a real series at its samples.
func slope(u, y []float64) []float64 {
	a := newAxis(u)
	n := len(u)
	full := min(7, n)
	out := make([]float64, n)
	var w [taps]float64
	known := -1
	for i := range out {
		first := min(max(i-full/2, 0), n-full)
		if !a.uniform || i-first != known {
			fornberg(w[:full], u[i], u[first:first+full], 1)
			known = i - first
		}
		for k := 0; k < full; k++ {
			out[i] += w[k] * y[first+k]
		}
	}
	return out
}

func constant(dst []result.Q, q result.Q) {
	for i := range dst {
		dst[i].Value += q.Value
		dst[i].Error += q.Error
	}
}

// infinityFlux sums over modes, both signs of m,
//
//	dE/du = |h'|^2/(16 pi),  dL/du = m Im(h conj(h'))/(16 pi)
//
// on samples a … b-1 of the series.
func infinityFlux(s *result.Series, a, b int) (e, l []result.Q) {
	e, l = make([]result.Q, b-a), make([]result.Q, b-a)
	listed := map[[2]int]bool{}
	for _, m := range s.Modes {
		listed[[2]int{m.L, m.M}] = true
	}
	ax := newAxis(s.U)
	d, rough := make([]complex128, len(s.U)), make([]complex128, len(s.U))
	for i := range s.Modes {
		m := &s.Modes[i]
		both := 1.0
		if m.M > 0 && !listed[[2]int{m.L, -m.M}] {
			both = 2
		}
		addFlux(ax, d, rough, m.Wave, m.WaveErr, float64(m.M), both/(16*math.Pi), a, b, e, l)
	}
	return e, l
}

// tailInL adds to the fluxes of samples a … b-1 what the l beyond the largest
// add, estimated sample by sample, where all m > 0 of every l up to it are
// there and fall off; otherwise it adds nothing and returns false.
func tailInL(s *result.Series, a, b int, e, l []result.Q) bool {
	has := map[[2]int]bool{}
	top := 0
	for _, m := range s.Modes {
		has[[2]int{m.L, m.M}] = true
		top = max(top, m.L)
	}
	for l := 2; l <= top; l++ {
		for m := 1; m <= l; m++ {
			if !has[[2]int{l, m}] {
				return false
			}
		}
	}
	n := b - a
	eL, lL := make([][]result.Q, top-1), make([][]result.Q, top-1)
	for k := range eL {
		part := &result.Series{U: s.U}
		for _, m := range s.Modes {
			if m.L == k+2 {
				part.Modes = append(part.Modes, m)
			}
		}
		eL[k], lL[k] = infinityFlux(part, a, b)
	}
	var restE, restL []result.Q
	row := make([]float64, top-1)
	for i := 0; i < n; i++ {
		for _, k := range []struct {
			by  [][]result.Q
			dst *[]result.Q
		}{{eL, &restE}, {lL, &restL}} {
			for j := range row {
				row[j] = k.by[j][i].Value
			}
			q, ok := flux.Tail(row, 0)
			if !ok {
				return false
			}
			*k.dst = append(*k.dst, q)
		}
	}
	for i := range restE {
		e[i], l[i] = plus(e[i], restE[i]), plus(l[i], restL[i])
	}
	return true
}

func plus(a, b result.Q) result.Q {
	return result.Q{Value: a.Value + b.Value, Error: a.Error + b.Error}
}

// addFlux adds weight |h'|^2 and weight m Im(h conj(h')) of one mode. An error
// of h is taken to vary as fast as h does.
func addFlux(ax axis, d, rough, h []complex128, bar []float64, m, weight float64, a, b int, e, l []result.Q) {
	ax.rate(d, h, 9)
	ax.rate(rough, h, 7)
	var hh, dd float64
	for i := a; i < b; i++ {
		hh += sq(h[i])
		dd += sq(d[i])
	}
	typical := 0.0
	if hh > 0 {
		typical = math.Sqrt(dd / hh)
	}
	for i := a; i < b; i++ {
		size, speed := cmplx.Abs(h[i]), cmplx.Abs(d[i])
		err := 0.0
		if bar != nil {
			err = bar[i]
		}
		w := typical
		if size > 0 {
			w = math.Max(w, math.Min(speed/size, 4*typical))
		}
		miss := err*w + cmplx.Abs(d[i]-rough[i])
		e[i-a].Value += weight * speed * speed
		e[i-a].Error += weight * (2*speed + miss) * miss
		l[i-a].Value += weight * m * imag(h[i]*cmplx.Conj(d[i]))
		l[i-a].Error += weight * math.Abs(m) * (size*miss + speed*err + err*miss)
	}
}

// horizonSeries is the measured flux into the horizon against v.
type horizonSeries struct {
	v    axis
	e, l []result.Q
}

// horizonFlux measures it from the master functions at the horizon,
//
//	dE/dv = (l+2)!/(l-2)! |Psi'|^2/(64 pi),  dL/dv likewise with m,
//
// and returns nil where the reference does not hold them.
func horizonFlux(ref *result.Bundle) *horizonSeries {
	s := ref.Series
	if len(s.V) < taps {
		return nil
	}
	h := &horizonSeries{v: newAxis(s.V), e: make([]result.Q, len(s.V)), l: make([]result.Q, len(s.V))}
	d, rough := make([]complex128, len(s.V)), make([]complex128, len(s.V))
	listed := map[[2]int]bool{}
	for _, m := range s.Modes {
		listed[[2]int{m.L, m.M}] = true
	}
	any := false
	for i := range s.Modes {
		m := &s.Modes[i]
		if len(m.Horizon) != len(s.V) {
			continue
		}
		any = true
		both := 1.0
		if m.M > 0 && !listed[[2]int{m.L, -m.M}] {
			both = 2
		}
		n := spinFactor(m.L)
		addFlux(h.v, d, rough, m.Horizon, m.HorizonErr, float64(m.M), both*n*n/(64*math.Pi), 0, len(s.V), h.e, h.l)
	}
	if !any {
		return nil
	}
	return h
}

// add adds the horizon's flux at advanced times v, per unit of u.
func (h *horizonSeries) add(e, l []result.Q, v, dvdu []float64) {
	j := 0
	for i, x := range v {
		x = math.Min(math.Max(x, h.v.t[0]), h.v.t[len(h.v.t)-1])
		j = h.v.find(x, j)
		for _, k := range []struct{ dst, src []result.Q }{{e, h.e}, {l, h.l}} {
			n := len(h.v.t)
			full := min(6, n)
			first := min(max(j-full/2+1, 0), n-full)
			var w [taps]float64
			h.v.weightsAt(w[:full], x, first)
			y := 0.0
			for q := 0; q < full; q++ {
				y += w[q] * k.src[first+q].Value
			}
			k.dst[i].Value += y * dvdu[i]
			k.dst[i].Error += math.Max(k.src[j].Error, k.src[j+1].Error) * math.Abs(dvdu[i])
		}
	}
}

// periods is the number of leading samples that make whole radial periods, or
// all of them where the orbit has none; ok is false when less than two fit.
func periods(u []float64, o *result.Orbit) (n int, ok bool) {
	if o == nil || !(o.Numbers["period_r"] > 0) {
		return len(u), true
	}
	p := o.Numbers["period_r"]
	k := math.Floor((u[len(u)-1] - u[0]) / p)
	if k < 2 {
		return 0, false
	}
	return nearest(u, u[0]+k*p) + 1, true
}

// mean is the average over u by the trapezoidal rule.
func mean(u, y, bar []float64) result.Q {
	var q result.Q
	for i := 1; i < len(u); i++ {
		d := (u[i] - u[i-1]) / 2
		q.Value += d * (y[i] + y[i-1])
		q.Error += d * (bar[i] + bar[i-1])
	}
	span := u[len(u)-1] - u[0]
	return result.Q{Value: q.Value / span, Error: q.Error / span}
}

func meanQ(u []float64, q []result.Q) result.Q {
	y, b := make([]float64, len(u)), make([]float64, len(u))
	for i := range u {
		y[i], b[i] = q[i].Value, q[i].Error
	}
	return mean(u, y, b)
}
