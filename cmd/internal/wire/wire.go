// Package wire is the only place where a resolved case becomes numerical
// objects: it chooses grids, builds slicings, equations and sources, drives the
// ladder of resolutions and hands certified numbers on.
package wire

import (
	"context"
	"errors"
	"fmt"

	"nullmark/configs"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// Progress is how far a run has come, in work units: Done <= Total. Total may
// grow when a rung is climbed.
type Progress struct {
	Stage       string
	Done, Total float64
}

// Keeper stores finished parts of a run, so that nothing computed is lost. A
// part that is not there, or damaged, is computed again.
type Keeper interface {
	Load(key string) ([]byte, bool)
	Save(key string, data []byte) error
}

// Options of a run. They change no number of the result.
type Options struct {
	Workers  int            // at least 1
	Progress func(Progress) // may be nil; called from several goroutines, one at a time
	Keep     Keeper         // may be nil
}

// PlannedMode is what a plan foresees for one mode.
type PlannedMode struct {
	L, M              int
	Points            int
	Dx, Dt, Kernel    float64
	Until             float64
	Rung              int
	OfLargestInfinity float64 `json:",omitempty"`
}

// Plan is what follows from a case before anything is evolved.
type Plan struct {
	Orbit       *result.Orbit
	Modes       []PlannedMode
	Rungs       []result.Rung
	CoreSeconds float64
	MemoryBytes uint64
	Warnings    []string
}

// Checks returns the physics checks of case files.
func Checks() []func(*configs.Case) []configs.Problem {
	return []func(*configs.Case) []configs.Problem{checkCircular, checkEccentric, checkBurst, checkSpan, pulseProblems, checkTable, checkKerr}
}

func checkCircular(c *configs.Case) []configs.Problem {
	if c.Orbit == nil || c.Orbit.Kind != configs.Circular || c.Waves.Equation != configs.Master {
		return nil
	}
	switch r := c.Orbit.Radius; {
	case r <= hyperboloidal.Horizon:
		return []configs.Problem{{Key: "orbit.radius", Value: r, Want: "above 3: the horizon of this hole lies at r = 2, and no circular orbit exists at or inside the light ring r = 3"}}
	case r <= hyperboloidal.LightRing:
		return []configs.Problem{{Key: "orbit.radius", Value: r, Want: "above 3: no timelike circular orbit exists at or inside the light ring r = 3"}}
	case r > 1000:
		return []configs.Problem{{Key: "orbit.radius", Value: r, Want: "at most 1000: the periods of wider orbits are out of reach of a time-domain run"}}
	}
	return nil
}

// checkEccentric passes on what the worldline refuses.
func checkEccentric(c *configs.Case) []configs.Problem {
	if c.Orbit == nil || c.Orbit.Kind != configs.Eccentric || c.Waves.Equation != configs.Master {
		return nil
	}
	if _, err := newEccentric(c.Orbit); err != nil {
		return refusal(err)
	}
	return nil
}

// refusal turns what a worldline says of impossible parameters into a problem of
// the case file.
func refusal(err error) []configs.Problem {
	var no *worldline.Impossible
	if errors.As(err, &no) {
		return []configs.Problem{{Key: "orbit." + no.Key, Value: no.Value, Want: no.Want}}
	}
	return nil
}

// Warnings returns what a user should know about a valid case, a sentence each.
func Warnings(c *configs.Case) []string {
	var w []string
	if c.Waves.Equation == configs.Teukolsky {
		w = kerrWarnings(c)
	} else if c.Orbit != nil && c.Orbit.Kind == configs.Circular {
		if r := c.Orbit.Radius; r < hyperboloidal.ISCORadius {
			w = append(w, fmt.Sprintf("the circular orbit at r = %g lies inside the innermost stable one (r = 6): it is unstable, and the numbers hold for a particle kept on it", r))
		}
		for _, lm := range c.Waves.Modes {
			if lm[1] == 0 {
				w = append(w, fmt.Sprintf("the mode (%d,0) is static on a circular orbit: it radiates nothing and is not evolved", lm[0]))
			}
		}
	}
	if c.Orbit != nil && c.Orbit.Kind == configs.Inspiral && c.Orbit.MassRatio > 1e-2 {
		w = append(w, fmt.Sprintf("orbit.mass_ratio %g is above 0.01: the waves are those of the first order in it, and what the second order adds is of the size of the mass ratio itself", c.Orbit.MassRatio))
	}
	if c.Accuracy.Relative < 5e-12 {
		w = append(w, fmt.Sprintf("accuracy.relative %.3g is below what double precision reaches (about 5e-12 in a flux): expect \"not met\"", c.Accuracy.Relative))
	}
	return w
}

// engine runs and plans the cases of one kind.
type engine struct {
	run  func(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error)
	plan func(c *configs.Case) (*Plan, error)
}

// engineOf picks the engine of a case, or says that there is none.
func engineOf(c *configs.Case) (engine, error) {
	with := func(run func(context.Context, *configs.Case, numerics, Options) (*result.Bundle, error), plan func(*configs.Case, numerics) (*Plan, error)) engine {
		return engine{
			run: func(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error) {
				return run(ctx, c, choose(c), o)
			},
			plan: func(c *configs.Case) (*Plan, error) { return plan(c, choose(c)) },
		}
	}
	if c.Pulse != nil {
		return engine{runPulse, planPulse}, nil
	}
	if c.Waves.Equation == configs.Teukolsky {
		switch {
		case c.Orbit.Kind == configs.Circular && c.Orbit.Inclination == 0:
			return engine{runKerrCircular, planKerrCircular}, nil
		case kerrSteady(c.Orbit.Kind):
			return engine{runKerrBound, planKerrBound}, nil
		case c.Orbit.Kind == configs.Infall:
			return engine{runKerrFall, planKerrFall}, nil
		}
		return engine{}, fmt.Errorf("orbit.kind %s with waves.equation teukolsky is not available in this version", c.Orbit.Kind)
	}
	switch c.Orbit.Kind {
	case configs.Circular:
		return with(runCircular, planCircular), nil
	case configs.Eccentric:
		return with(runBound, planBound), nil
	case configs.Infall, configs.Scatter, configs.Inspiral:
		return with(runBurst, planBurst), nil
	case configs.Table:
		return with(runTable, planTable), nil
	}
	return engine{}, fmt.Errorf("orbit.kind %s is not available in this version", c.Orbit.Kind)
}

// Run evolves the case and certifies its numbers. The error wraps the
// context's when that ends first, and is an *evolve.Failure when the evolution
// breaks down.
func Run(ctx context.Context, c *configs.Case, o Options) (*result.Bundle, error) {
	o.Workers = max(o.Workers, 1)
	e, err := engineOf(c)
	if err != nil {
		return nil, err
	}
	return e.run(ctx, c, o)
}

// MakePlan says what Run would do.
func MakePlan(c *configs.Case) (*Plan, error) {
	e, err := engineOf(c)
	if err != nil {
		return nil, err
	}
	return e.plan(c)
}

// conventions are what the tool states in every result.
func conventions() map[string]string {
	return map[string]string{
		"units":             "G = c = M = 1 (M the hole's mass), particle mass mu factored out: fluxes in (mu/M)^2, strain as r h_lm/mu",
		"strain":            "h = h_plus - i h_cross = (1/r) sum h_lm(u) -2Y_lm(theta, phi), spherical harmonics, -2Y22 = sqrt(5/64 pi) (1+cos theta)^2 e^{2 i phi}",
		"negative m":        "h_{l,-m} = (-1)^l conj(h_lm) for equatorial orbits",
		"time dependence":   "e^{-i omega t}; prograde h_lm = A e^{-i phi_lm} with d phi_lm/dt > 0; phases refer to the particle",
		"retarded time":     "u = t - r_*, r_* = r + 2 ln(r/2-1); the label at null infinity is u itself, no shift against the orbit",
		"advanced time":     "v = t + r_* at the horizon",
		"sign of flux":      "positive = leaving the orbit: outward at infinity, into the hole at the horizon",
		"error bars":        "absolute; the truth is claimed inside value +- error",
		"master functions":  "even: Zerilli-Moncrief, odd: Cunningham-Price-Moncrief; r h_lm = (1/2) sqrt((l+2)!/(l-2)!) (Psi_even + i Psi_odd)",
		"circular series":   "before junk_until the raw signal of the evolution, from there on the certified tone, without what the switch-on left",
		"circular strain":   "strain = r h_lm e^{i m phi_p(u)}/mu with phi_p(u) the particle's azimuth at time t = u",
		"horizon series":    "psi_l_m is the master function on the horizon against advanced time v; dE/dv = (1/64 pi) (l+2)!/(l-2)! |d psi/dv|^2 for each sign of m",
		"truncation":        "the total holds the listed modes plus the estimated tail beyond l_max, stated apart as truncation",
		"slicing":           "tau - rho = t - r_* in the outer layer, tau + rho = t + r_* in the inner one",
		"orbital frequency": "omega_phi = r^{-3/2}",
	}
}
