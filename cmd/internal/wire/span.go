package wire

import (
	"fmt"
	"math"
	"slices"

	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/hyperboloidal"
)

// afterEvent is how much of what follows the event of a transient a run must
// contain, M.
const afterEvent = 40.0

// checkSpan refuses a span.until that ends before there is anything to read.
func checkSpan(c *configs.Case) []configs.Problem {
	if c.Span.Until == nil || c.Orbit == nil || c.Waves.Equation != configs.Master {
		return nil
	}
	least, why := 0.0, ""
	switch {
	case c.Orbit.Kind == configs.Circular && c.Orbit.Radius > hyperboloidal.LightRing:
		r := newCircularRun(c, choose(c), Options{})
		for _, m := range r.modes {
			if u := r.n.domain.Retarded(certify.Earliest(m.circ.tone, m.circ.power)); u > least {
				least = u
				why = fmt.Sprintf("the start-up and %d periods of the mode (%d,%d)", m.circ.power+1, m.l, m.m)
			}
		}
	case c.Orbit.Kind == configs.Eccentric:
		r, err := newBoundRun(c, choose(c), Options{})
		if err != nil {
			return nil // another check says why
		}
		least = r.n.domain.Retarded(r.n.on() + r.window() + r.period)
		why = fmt.Sprintf("the start-up and %d radial periods", r.power+2)
	case slices.Contains([]string{configs.Infall, configs.Scatter, configs.Inspiral}, c.Orbit.Kind):
		r, err := newBurstRun(c, choose(c), Options{})
		if err != nil {
			return nil
		}
		least = r.event + afterEvent
		why = "the orbit up to its closest or fastest and what follows"
	}
	if *c.Span.Until >= least {
		return nil
	}
	return []configs.Problem{{Key: "span.until", Value: *c.Span.Until,
		Want: fmt.Sprintf("at least %g on this orbit: %s", math.Ceil(least), why)}}
}
