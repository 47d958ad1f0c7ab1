package wire

import (
	"errors"
	"fmt"
	"math"

	"nullmark/configs"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// nearExtremal is the |spin| from which a run is slow to settle.
const nearExtremal = 0.99

// kerrKind says whether the Teukolsky equation is wired for a kind of orbit.
func kerrKind(kind string) bool { return kerrSteady(kind) || kind == configs.Infall }

// kerrSteady says whether it is a kind of bound orbit.
func kerrSteady(kind string) bool { return kind == configs.Circular || kind == configs.Eccentric }

// checkKerr holds an orbit on Kerr against what exists there.
func checkKerr(c *configs.Case) []configs.Problem {
	if c.Waves.Equation != configs.Teukolsky || c.Orbit == nil {
		return nil // pulses have checks of their own
	}
	if !kerrKind(c.Orbit.Kind) {
		return []configs.Problem{{Key: "orbit.kind", Value: c.Orbit.Kind, Want: "circular, eccentric or infall with waves.equation teukolsky in this version"}}
	}
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil {
		return []configs.Problem{{Key: "hole.spin", Value: c.Hole.Spin, Want: "strictly between -1 and 1"}}
	}
	if c.Orbit.Kind == configs.Circular {
		return checkKerrCircular(c, h)
	}
	o := c.Orbit
	if o.Kind == configs.Infall {
		_, bad := kerrFallOf(c, h)
		return bad
	}
	if !(o.P/(1-o.E) <= 500) {
		return []configs.Problem{{Key: "orbit.p", Value: o.P, Want: fmt.Sprintf("at most %.6g with e = %g: orbits that reach beyond r = 500 are out of reach of a time-domain run", 500*(1-o.E), o.E)}}
	}
	_, err = kerrOrbit(c, h)
	return kerrRefusal(err)
}

func checkKerrCircular(c *configs.Case, h hyperboloidal.Kerr) []configs.Problem {
	r, cos := c.Orbit.Radius, cosInclination(c.Orbit.Inclination)
	what := fmt.Sprintf("at spin %g", h.Spin())
	lr := h.LightRing()
	if cos != 1 {
		what += fmt.Sprintf(" and inclination %g", c.Orbit.Inclination)
		lr = worldline.KerrPhotonOrbit(h, cos)
	}
	switch {
	case r <= h.OuterHorizon():
		return []configs.Problem{{Key: "orbit.radius", Value: r, Want: fmt.Sprintf("above %.6g: the horizon of this hole lies at r = %.6g, and no circular orbit exists at or inside the light ring r = %.6g (%s)", lr, h.OuterHorizon(), lr, what)}}
	case r <= lr:
		return []configs.Problem{{Key: "orbit.radius", Value: r, Want: fmt.Sprintf("above %.6g: no timelike circular orbit exists at or inside the light ring r = %.6g %s", lr, lr, what)}}
	case r > 1000:
		return []configs.Problem{{Key: "orbit.radius", Value: r, Want: "at most 1000: the periods of wider orbits are out of reach of a time-domain run"}}
	}
	return nil
}

// kerrRefusal turns what a worldline says of impossible parameters into a problem
// of the case file.
func kerrRefusal(err error) []configs.Problem {
	var no *worldline.KerrOrbitError
	if errors.As(err, &no) {
		want := no.Reason
		if !math.IsNaN(no.Limit) {
			want = fmt.Sprintf("above %.6g: %s", no.Limit, no.Reason)
		}
		return []configs.Problem{{Key: "orbit." + no.Key, Value: no.Value, Want: want}}
	}
	return nil
}

// kerrWarnings are the sentences for a valid case of the Teukolsky equation.
func kerrWarnings(c *configs.Case) []string {
	var w []string
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil || c.Orbit == nil {
		return nil
	}
	if a := math.Abs(h.Spin()); a > nearExtremal {
		w = append(w, fmt.Sprintf("hole.spin %g is close to extremal: modes of the hole die away slowly (the switch-on takes four times as long) and more l's are coupled; expect a run several times as long and bars that settle late", c.Hole.Spin))
	}
	if c.Orbit.Kind == configs.Circular {
		if r, isco := c.Orbit.Radius, kerrInnermost(c, h); r < isco {
			w = append(w, fmt.Sprintf("the circular orbit at r = %g lies inside the innermost stable one (r = %.6g at spin %g and this inclination): it is unstable, and the numbers hold for a particle kept on it", r, isco, h.Spin()))
		}
		if !tilted(c) {
			for _, lm := range c.Waves.Modes {
				if lm[1] == 0 {
					w = append(w, fmt.Sprintf("the mode (%d,0) is static on a circular orbit: it radiates nothing and is not evolved", lm[0]))
				}
			}
		}
	}
	return w
}

// kerrInnermost is the radius of the innermost stable circular orbit at the
// inclination of the case.
func kerrInnermost(c *configs.Case, h hyperboloidal.Kerr) float64 {
	if c.Orbit.Inclination == 0 {
		return h.ISCO()
	}
	return worldline.KerrSeparatrix(h, 0, cosInclination(c.Orbit.Inclination))
}
