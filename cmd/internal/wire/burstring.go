package wire

import (
	"fmt"
	"math"

	"nullmark/extract/result"
	"nullmark/extract/ringing"
)

// afterPeak is how long after the maximum of |h_lm| the fit of a ringdown begins
// at the earliest: before that the particle still drives the hole.
const afterPeak = 20.0

// ringdown fits the fundamental frequency of every mode with m > 0 that has a
// peak, by the analysis that pulses get. To the bar of the fit comes what the two
// finest rungs say differently. Overtones are not quoted here: the remnant of the
// particle near the horizon decays about as fast as they do.
func (r *burstRun) ringdown(res *result.Result) {
	if !r.falls {
		return
	}
	end := r.n.domain.Retarded(r.ends) - 1
	for _, m := range r.modes {
		entry := res.Find(m.l, m.m)
		if m.m == 0 || entry == nil || entry.Peak == nil {
			continue
		}
		// Peaks are quoted in the time of a table, samples in that of the run.
		first := entry.Peak.U.Value - r.origin
		at := ladderOfTimes(traitStep, first, end)
		from := at[0] + afterPeak
		var fits [2]*ringing.Fit
		var err error
		for back := range fits {
			s := r.seriesOn(m, m.rung-back, at, false)
			fits[back], err = ringing.Analyse(ringing.Series{Start: s.Start, Step: s.Dt, Values: s.Values},
				ringing.Options{L: m.l, M: m.m, Overtones: -1, From: &from})
			if err != nil {
				break
			}
		}
		if err != nil {
			res.Warnings = append(res.Warnings, fmt.Sprintf("ringdown of mode (%d,%d): %v", m.l, m.m, err))
			continue
		}
		for _, q := range fits[0].Ringing("infinity") {
			if q.L != m.l || q.M != m.m || q.N != 0 {
				continue
			}
			other := fits[1].Find(m.l, m.m, 0)
			if other == nil {
				res.Warnings = append(res.Warnings, fmt.Sprintf("ringdown of mode (%d,%d): the coarser rung shows no such frequency, so none is quoted", m.l, m.m))
				continue
			}
			q.Re.Error += math.Abs(q.Re.Value - other.Omega.Re.Value)
			q.Im.Error += math.Abs(q.Im.Value - other.Omega.Im.Value)
			res.Ringing = append(res.Ringing, q)
		}
	}
}
