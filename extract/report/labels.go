package report

import (
	"sort"
	"strings"
)

// label turns a stored key into words: omega_phi → "ω φ".
func label(key string) string {
	for _, p := range [][2]string{{"omega_", "frequency Ω_"}, {"period_", "period of "}} {
		if rest, found := strings.CutPrefix(key, p[0]); found {
			return p[1] + label(rest)
		}
	}
	words := strings.Split(clean(key), "_")
	for i, w := range words {
		switch w {
		case "omega":
			words[i] = "Ω"
		case "phi":
			words[i] = "φ"
		case "theta":
			words[i] = "θ"
		}
	}
	switch key {
	case KeyISCO:
		return "radius of the innermost stable circular orbit"
	case KeyLightRing:
		return "radius of the light ring"
	case KeyHorizon:
		return "radius of the horizon"
	case "rstar":
		return "tortoise coordinate r_*"
	case "isco":
		return "innermost stable circular orbit"
	}
	return strings.Join(words, " ")
}

// unitOf guesses nothing: it knows the families of keys that results use and
// says "G = c = M = 1" for the rest.
func unitOf(key string) string {
	has := func(parts ...string) bool {
		for _, p := range parts {
			if strings.Contains(key, p) {
				return true
			}
		}
		return false
	}
	switch {
	case has("amplitude_slope"):
		return "1/M"
	case has("slope", "curvature"):
		return "1/M²"
	case has("omega", "frequency"):
		return "1/M"
	case has("inclination"):
		return "degrees"
	case has("phase", "azimuth"):
		return "rad"
	case has("radius", "period", "time", "r_min", "r_max", "rstar"), key == "p", key == "u":
		return "M"
	case key == "Q", has("carter"):
		return "μ² M²"
	case key == "e", has("eccentricity", "amplitude", "mass_ratio", "spin", "velocity", "speed"), key == "x", key == "v":
		return "1"
	}
	return "G = c = M = 1"
}

func sortedKeys[V any](m map[string]V) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	sort.Strings(keys)
	return keys
}
