package configs

import (
	"fmt"
	"math"
	"slices"
	"strings"
)

// setting is what decides which keys belong to a case.
type setting struct {
	kind     string // orbit kind, "" when there is no orbit or its kind is faulty
	equation string // "" when it cannot be told
}

// setting reads it from a sheet whose leaves are parsed.
func (s *sheet) setting() setting {
	var set setting
	if e, ok := s.effective("orbit.kind"); ok && !s.bad["orbit.kind"] {
		set.kind = e.value.(string)
	}
	equation, typed := s.effective("waves.equation")
	switch {
	case s.bad["waves.equation"]:
	case typed:
		set.equation = equation.value.(string)
	case !s.bad["hole.spin"]:
		set.equation = Master
		if s.spin() != 0 {
			set.equation = Teukolsky
		}
	}
	return set
}

func (s *sheet) spin() float64 {
	if e, ok := s.effective("hole.spin"); ok {
		return e.value.(float64)
	}
	return 0
}

// suits reports whether the key belongs to a case with this setting, as far
// as the setting is known.
func (k *key) suits(set setting) bool {
	return (k.of == nil || set.kind == "" || slices.Contains(k.of, set.kind)) &&
		(k.equation == "" || set.equation == "" || k.equation == set.equation)
}

// preset returns the default of a key in this case, nil where the key has none
// or does not belong to it.
func (s *sheet) preset(k *key) any {
	set := s.setting()
	if k.path == "waves.equation" {
		return set.equation
	}
	for p := parent(k.path); p != ""; p = parent(p) {
		if _, typed := s.present[p]; optional[p] && !typed {
			return nil
		}
	}
	if !k.suits(set) {
		return nil
	}
	return k.preset
}

// rules checks the keys against each other and against this version.
func (r Reader) rules(s *sheet) {
	r.whole(s)
	set := s.setting()
	if set.kind != "" {
		r.orbit(s, set.kind)
	}
	r.waves(s, set)
	for i := range schema {
		k := &schema[i]
		s.belonging(k, set)
		if !r.hidden(k.path, set) {
			s.required(k, set)
		}
	}
	r.numbers(s, set)
}

// whole checks what the case consists of: exactly one of orbit and pulse, and
// a model only where there is one to speak of.
func (r Reader) whole(s *sheet) {
	orbit, hasOrbit := s.present["orbit"]
	pulse, hasPulse := s.present["pulse"]
	switch {
	case hasOrbit && hasPulse:
		at := pulse
		if orbit.layer > pulse.layer || orbit.layer == pulse.layer && orbit.line > pulse.line {
			at = orbit
		}
		s.say(at.layer, at.line, "pulse", "", "orbit and pulse are both given; a case has exactly one of them")
	case !hasOrbit && !hasPulse && !s.meant["orbit"] && !s.meant["pulse"]:
		s.say(fileLayer, 0, "orbit", "", "orbit is missing; a case has exactly one of orbit (a particle) and pulse (initial data)")
	}
	for _, section := range []string{"pulse", "model"} {
		if at, typed := s.present[section]; typed && r.lacks(section) {
			s.say(at.layer, at.line, section, "", section+" is not available in this version")
		}
	}
	at, hasModel := s.present["model"]
	if hasModel && !r.lacks("model") {
		some := false
		for _, part := range []string{"model.waveform", "model.flux", "model.force"} {
			_, typed := s.present[part]
			some = some || typed || s.meant[part]
		}
		if !some {
			s.say(at.layer, at.line, "model", "", "model names nothing to compare; it needs at least one of waveform, flux, force")
		}
	}
	if e, typed := s.effective("align"); typed && !hasModel && !s.meant["model"] {
		s.say(e.layer, e.line, "align", e.shown, "align belongs to a model, and the case has none")
	}
}

// orbit says when the kind of orbit is not available.
func (r Reader) orbit(s *sheet, kind string) {
	if feature := "orbit.kind " + kind; r.lacks(feature) {
		e, _ := s.effective("orbit.kind")
		s.say(e.layer, e.line, "orbit.kind", kind, feature+" is not available in this version")
	}
}

// waves checks the equation against the hole and this version, and the two
// ways to name modes against each other.
func (r Reader) waves(s *sheet, set setting) {
	spin, typedSpin := s.effective("hole.spin")
	equation, typedEquation := s.effective("waves.equation")
	feature := "waves.equation " + set.equation
	if _, pulse := s.present["pulse"]; pulse && set.equation == Teukolsky {
		feature = pulsesTeukolsky
	}
	switch {
	case r.lacks(feature) && typedEquation:
		s.say(equation.layer, equation.line, "waves.equation", set.equation, feature+" is not available in this version")
	case r.lacks(feature) && typedSpin:
		s.say(spin.layer, spin.line, "hole.spin", spin.shown,
			fmt.Sprintf("hole.spin %s needs %s, which is not available in this version", spin.shown, feature))
	case set.equation == Master && typedSpin && s.spin() != 0:
		s.refuse(spin.layer, spin.line, "hole.spin", spin.shown, "0 with waves.equation master (a spinning hole needs waves.equation teukolsky)")
	}

	top, hasTop := s.effective("waves.l_max")
	modes, hasModes := s.effective("waves.modes")
	if hasTop && hasModes {
		switch {
		case top.layer == modes.layer:
			s.say(modes.layer, max(top.line, modes.line), "waves.modes", modes.shown, "waves.l_max and waves.modes are both given; a case has at most one of them")
		case top.layer > modes.layer:
			s.forget("waves.modes")
			hasModes = false
		default:
			s.forget("waves.l_max")
			hasTop = false
		}
	}
	weight := -2
	if e, typed := s.effective("waves.spin_weight"); typed {
		weight = e.value.(int)
		if _, particle := s.present["orbit"]; particle && weight != -2 {
			s.refuse(e.layer, e.line, "waves.spin_weight", e.shown, "-2 for a particle (other spin weights are for pulses)")
			weight = -2
		}
	}
	if set.equation != Teukolsky {
		weight = -2
	}
	least := max(weight, -weight)
	reason := " (gravitational waves begin at l = 2)"
	if hasTop {
		if top.value.(int) < least {
			s.refuse(top.layer, top.line, "waves.l_max", top.shown, fmt.Sprintf("a whole number from %d to %d%s", least, maxL, reason))
		}
	}
	if hasModes {
		for i, lm := range modes.value.([][2]int) {
			if lm[0] < least {
				s.refuse(modes.layer, modes.items[i].line, modes.items[i].key, fmt.Sprintf("[%d, %d]", lm[0], lm[1]),
					fmt.Sprintf("a pair [l, m] with l >= %d%s", least, reason))
			}
		}
	}
}

// forget drops a key in all layers.
func (s *sheet) forget(path string) {
	for l := range layers {
		delete(s.values[l], path)
	}
}

// belonging refuses a key that this kind of orbit or this equation does not have.
func (s *sheet) belonging(k *key, set setting) {
	for l := range layers {
		e, typed := s.values[l][k.path]
		if !typed || k.suits(set) {
			continue
		}
		if k.of != nil && set.kind != "" && !slices.Contains(k.of, set.kind) {
			s.say(l, e.line, k.path, e.shown, fmt.Sprintf("%s does not belong to orbit.kind %s, which has %s",
				k.path, set.kind, strings.Join(keysOf(set), ", ")))
			continue
		}
		s.say(l, e.line, k.path, e.shown, fmt.Sprintf("%s belongs to waves.equation %s, and this case has %s", k.path, k.equation, set.equation))
	}
}

// keysOf lists the names of the orbit's keys.
func keysOf(set setting) []string {
	var list []string
	for i := range schema {
		if k := &schema[i]; k.of != nil && k.suits(set) {
			list = append(list, name(k.path))
		}
	}
	return list
}

// hidden reports whether a missing key is not worth a word, because what it
// belongs to is not available anyway.
func (r Reader) hidden(path string, set setting) bool {
	first, _, _ := strings.Cut(path, ".")
	return r.lacks(first) || first == "orbit" && r.lacks("orbit.kind "+set.kind)
}

// required reports a key that is missing from its section.
func (s *sheet) required(k *key, set setting) {
	section := parent(k.path)
	at, there := s.present[section]
	_, typed := s.effective(k.path)
	if !there || typed || s.bad[k.path] || s.meant[k.path] || s.bad[section] {
		return
	}
	switch {
	case slices.Contains(k.need, always):
		s.say(at.layer, at.line, k.path, "", fmt.Sprintf("%s is missing; it must be %s", k.path, k.allowed()))
	case set.kind != "" && slices.Contains(k.need, set.kind):
		s.say(at.layer, at.line, k.path, "", fmt.Sprintf("%s is missing; orbit.kind %s needs it, %s", k.path, set.kind, k.allowed()))
	}
}

// numbers checks values whose limits depend on other values.
func (r Reader) numbers(s *sheet, set setting) {
	from, hasFrom := s.effective("orbit.from")
	energy, hasEnergy := s.effective("orbit.energy")
	if hasFrom && math.IsInf(from.value.(float64), 1) && set.kind != "" {
		row := find("orbit.from")
		if !slices.Contains(row.infinite, set.kind) && row.suits(set) {
			s.refuse(from.layer, from.line, row.path, from.shown, "a finite radius with orbit.kind "+set.kind)
		} else if set.kind == Infall && hasEnergy && energy.value.(float64) != 1 {
			s.refuse(energy.layer, energy.line, "orbit.energy", energy.shown, "1 with orbit.from .inf (a fall from rest at infinity)")
		}
	}
	if hasEnergy && set.kind == Scatter && energy.value.(float64) < 1 {
		s.refuse(energy.layer, energy.line, "orbit.energy", energy.shown, "at least 1 (an orbit with less energy is bound: kind eccentric or infall)")
	}
}
