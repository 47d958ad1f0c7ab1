package wire

import (
	"math"
	"testing"

	"nullmark/extract/result"
)

// TestShippedOrbits runs each shipped case of an orbit that is not circular at
// reduced accuracy and compares with the numbers of the case as it stands. Those
// were made by this tool (modes that are run alone carry the same numbers) and are
// themselves held to sources elsewhere: the eccentric ones to the independent table,
// the inspiral's to the published merger, the infall's to the independent value.
// They are given to what their bars claim.
func TestShippedOrbits(t *testing.T) {
	energy := func(l, m int) func(*result.Result) result.Q {
		return func(r *result.Result) result.Q { return r.Find(l, m).Infinity.Energy }
	}
	for _, c := range []struct {
		name   string
		sets   []string
		ours   func(*result.Result) result.Q
		stored result.Q
	}{
		{"eccentric", []string{"waves.modes=[[2,2]]", "accuracy.relative=1e-5"}, energy(2, 2), result.Q{Value: 2.5783704063607e-4, Error: 3e-16}},
		{"plunge", []string{"waves.modes=[[2,2]]", "accuracy.relative=1e-5"}, func(r *result.Result) result.Q { return r.Find(2, 2).Peak.Amplitude }, result.Q{Value: 1.45371241235, Error: 1e-11}},
		// From nearer by: what is estimated outside the range takes over.
		{"scatter", []string{"waves.modes=[[3,3]]", "accuracy.relative=1e-3", "orbit.from=150"}, energy(3, 3), result.Q{Value: 1.4147545186e-3, Error: 1.7e-9}},
		{"infall", []string{"waves.modes=[[3,3]]", "accuracy.relative=1e-3"}, energy(3, 3), result.Q{Value: 6.87815380e-4, Error: 6.6e-11}},
		{"inspiral", []string{"waves.modes=[[2,2]]", "accuracy.relative=1e-4", "orbit.from=6.5"}, func(r *result.Result) result.Q { return r.Find(2, 2).Peak.Frequency }, result.Q{Value: 0.27335935, Error: 1e-7}},
	} {
		if c.name == "infall" && !*long {
			continue // TestInfallReachesTheReference runs that file
		}
		res := run(t, shipped(t, c.name, c.sets...)).Result
		q := c.ours(res)
		if off := math.Abs(q.Value - c.stored.Value); off > q.Error+c.stored.Error {
			t.Errorf("%s: %.12g +- %.1e, stored %.12g +- %.1e", c.name, q.Value, q.Error, c.stored.Value, c.stored.Error)
		}
		t.Logf("%s: off by %.1e, bar %.1e (relative); %.1f core-seconds", c.name, math.Abs(q.Value/c.stored.Value-1), q.Error/q.Value, res.Provenance.CoreSeconds)
	}
}

// TestBadOrbitsAreNamed: one sentence each, naming the key and what to write.
func TestBadOrbitsAreNamed(t *testing.T) {
	for _, c := range []struct{ file, set, key, says string }{
		{"eccentric", "orbit.p=6.37", "orbit.p", "infall"},
		{"eccentric", "orbit.p=6.37", "orbit.p", "scatter"},
		{"eccentric", "orbit.e=-0.1", "orbit.e", "from 0"},
		{"eccentric", "orbit.e=1.1", "orbit.e", "scatter"},
		{"eccentric", "span.until=600", "span.until", "radial periods"},
		{"scatter", "orbit.energy=0.99", "orbit.energy", "eccentric"},
		{"scatter", "orbit.angular_momentum=3", "orbit.angular_momentum", "infall"},
		{"scatter", "orbit.from=4", "orbit.from", "periastron"},
		{"scatter", "span.until=900", "span.until", "at least"},
		{"infall", "orbit.angular_momentum=6", "orbit.angular_momentum", "scatter"},
		{"infall", "orbit.from=1.9", "orbit.from", "horizon"},
		{"plunge", "orbit.from=2.9", "orbit.from", "light ring"},
		{"plunge", "span.until=300", "span.until", "at least"},
		{"inspiral", "orbit.from=5.9", "orbit.from", "infall"},
		{"inspiral", "orbit.mass_ratio=0.3", "orbit.mass_ratio", "0.25"},
		{"inspiral", "orbit.mass_ratio=0", "orbit.mass_ratio", "above 0"},
	} {
		fault := refused(t, c.file, c.set)
		if !contains(fault, c.key) || !contains(fault, c.says) {
			t.Errorf("%s with %s: %q does not name %q and %q", c.file, c.set, fault, c.key, c.says)
		}
	}
	w := Warnings(shipped(t, "inspiral", "orbit.mass_ratio=0.02"))
	if len(w) != 1 || !contains(w[0], "orbit.mass_ratio") {
		t.Errorf("nu = 0.02 warns %q", w)
	}
	if w := Warnings(shipped(t, "inspiral", "orbit.mass_ratio=0.01")); len(w) != 0 {
		t.Errorf("nu = 0.01 warns %q", w)
	}
}
