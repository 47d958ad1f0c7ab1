package wire

import (
	"math"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/result"
	"nullmark/source/worldline"
)

// seriesOf samples strain and horizon field of all modes.
func (r *climb) seriesOf(c *configs.Case, path worldline.Worldline, junk map[*ladder]junkSeries, dphi float64) *result.Series {
	if len(r.modes) == 0 {
		return nil
	}
	until := math.Inf(1)
	for _, m := range r.modes {
		until = math.Min(until, m.until)
	}
	d := r.n.domain
	s := &result.Series{Prefix: "h", HorizonPrefix: "psi"}
	s.U = ladderOfTimes(c.Output.Every, r.origin, r.origin+d.Retarded(until))
	s.V = ladderOfTimes(c.Output.Every, math.Ceil(r.origin+d.Advanced(0)), r.origin+d.Advanced(until))
	atU, atV := since(s.U, r.origin), since(s.V, r.origin)
	t0, t1 := path.Span()
	var st worldline.State
	for i, t := range atU {
		if t >= t0 && t <= t1 {
			path.At(t, &st)
			if st.Rstar < worldline.HorizonApproach {
				break
			}
			s.T, s.R, s.Phi = append(s.T, s.U[i]), append(s.R, st.R), append(s.Phi, st.Phi)
		}
	}
	for _, m := range r.modes {
		out := result.ModeSeries{L: m.l, M: m.m}
		out.Wave, out.WaveErr, out.Evidence = r.sampledWith(m, certify.Infinity, d.Retarded(0), atU, c.Output.Every, junk[m], dphi)
		out.Horizon, out.HorizonErr, _ = r.sampledWith(m, certify.Horizon, d.Advanced(0), atV, c.Output.Every, junk[m], dphi)
		s.Modes = append(s.Modes, out)
	}
	return s
}

// since is the times counted from origin.
func since(times []float64, origin float64) []float64 {
	if origin == 0 {
		return times
	}
	out := make([]float64, len(times))
	for i, t := range times {
		out[i] = t - origin
	}
	return out
}
