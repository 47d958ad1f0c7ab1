package configs

import (
	"fmt"
	"math"
	"strings"
)

// form is the type of a key's value.
type form int

const (
	text     form = iota // one line of text
	pathForm             // a file name; choices are words that stand for no file
	choice               // one of choices
	subset               // a list of distinct choices
	real                 // a finite number within limits
	whole                // a whole number within limits
	pairs                // a list of [l, m]
	columns              // a mapping from quantities to column names
	arrays               // a mapping from "l,m" to one or two array names
	shift                // none, or {window: [u1, u2]}
)

// limits bounds a number; infinite ends do not bind.
type limits struct {
	low, high         float64
	lowOpen, highOpen bool
}

func between(low, high float64) limits { return limits{low: low, high: high} }
func inside(low, high float64) limits  { return limits{low, high, true, true} }
func above(low float64) limits         { return limits{low, math.Inf(1), true, true} }
func anywhere() limits                 { return inside(math.Inf(-1), math.Inf(1)) }

func (b limits) hold(x float64) bool {
	return (x > b.low || x == b.low && !b.lowOpen) && (x < b.high || x == b.high && !b.highOpen)
}

// String says the limits in words that follow "a number".
func (b limits) String() string {
	low, high := "from ", "below "
	if b.lowOpen {
		low = "above "
	}
	if !b.highOpen {
		high = "up to "
	}
	low += number(b.low)
	high += number(b.high)
	switch {
	case math.IsInf(b.low, -1) && math.IsInf(b.high, 1):
		return ""
	case math.IsInf(b.high, 1):
		return low
	case math.IsInf(b.low, -1):
		return high
	case !b.lowOpen && !b.highOpen:
		return low + " to " + number(b.high)
	}
	return low + " and " + high
}

// key is one row of the schema.
type key struct {
	path     string
	form     form
	bounds   limits   // real and whole
	even     bool     // whole: only even values
	infinite []string // real: orbit kinds for which .inf is allowed
	choices  []string
	hint     string   // what to write instead, added to the allowed values in a fault
	preset   any      // default, nil = none; of the Go type that the Case holds
	of       []string // orbit kinds that have this key, nil = no restriction
	need     []string // orbit kinds that must have it; always = whenever its section is there
	equation string   // the equation that it belongs to, "" = any
	doc      string
}

// always in key.need means: whenever the section of the key is there.
const always = "*"

const (
	maxL    = 100 // largest l of any mode; a judgement that keeps a slip of the pen from filling the memory
	maxText = 200 // characters of a text
)

var kinds = []string{Circular, Eccentric, Infall, Scatter, Inspiral, Table}

// schema lists every key in the order in which a resolved case is written.
var schema = []key{
	{path: "title", form: text, preset: "untitled", doc: "One line for the heading of the result."},

	{path: "hole.spin", form: real, bounds: inside(-1, 1), preset: 0.0,
		doc: "Spin a/M of the hole; negative is retrograde for orbits with L > 0."},

	{path: "waves.equation", form: choice, choices: []string{Master, Teukolsky},
		doc: "`master`: Regge–Wheeler (odd) and Zerilli (even), spin 0 only, the default there; `teukolsky`: any spin, the default when the spin is not 0."},
	{path: "waves.spin_weight", form: whole, bounds: between(-2, 2), even: true, preset: -2, equation: Teukolsky,
		doc: "Spin weight of the field; 0 and 2 for pulses only."},
	{path: "waves.l_max", form: whole, bounds: between(0, maxL), preset: 8, hint: "at least 2 for gravitational waves",
		doc: "All modes up to this l are evolved."},
	{path: "waves.modes", form: pairs,
		doc: "In place of `waves.l_max`: just these modes, as `[[l, m], …]`."},

	{path: "orbit.kind", form: choice, choices: kinds, need: []string{always}, doc: "The kind of motion."},
	{path: "orbit.radius", form: real, bounds: above(0), of: []string{Circular}, need: []string{Circular},
		doc: "Radius of the orbit, M."},
	{path: "orbit.p", form: real, bounds: above(0), of: []string{Eccentric}, need: []string{Eccentric},
		doc: "Semi-latus rectum, M."},
	{path: "orbit.e", form: real, bounds: limits{low: 0, high: 1, highOpen: true}, of: []string{Eccentric}, need: []string{Eccentric},
		hint: "an unbound orbit is kind: scatter", doc: "Eccentricity."},
	{path: "orbit.inclination", form: real, bounds: between(0, 180), preset: 0.0, of: []string{Circular, Eccentric}, equation: Teukolsky,
		doc: "Inclination in degrees, cos = L/sqrt(L^2+Q); above 90 is retrograde."},
	{path: "orbit.radial_phase", form: real, bounds: anywhere(), preset: 0.0, of: []string{Eccentric},
		doc: "Radial phase at t = 0, rad; 0 is periastron."},
	{path: "orbit.polar_phase", form: real, bounds: anywhere(), preset: 0.0, of: []string{Eccentric}, equation: Teukolsky,
		doc: "Polar phase at t = 0, rad."},
	{path: "orbit.azimuth", form: real, bounds: anywhere(), preset: 0.0, of: []string{Eccentric},
		doc: "Azimuth phi at t = 0, rad."},
	{path: "orbit.mass_ratio", form: real, bounds: limits{low: 0, high: 0.25, lowOpen: true}, of: []string{Inspiral}, need: []string{Inspiral},
		doc: "Symmetric mass ratio nu, which sets the rate of the inspiral."},
	{path: "orbit.from", form: real, bounds: above(0), infinite: []string{Infall},
		of: []string{Infall, Scatter, Inspiral}, need: []string{Infall, Scatter, Inspiral},
		doc: "Start radius, M; for infall also `.inf`, with energy 1."},
	{path: "orbit.energy", form: real, bounds: above(0), of: []string{Infall, Scatter}, need: []string{Infall, Scatter},
		doc: "Energy E per mu; at least 1 for scatter."},
	{path: "orbit.angular_momentum", form: real, bounds: anywhere(), preset: 0.0, of: []string{Infall, Scatter}, need: []string{Scatter},
		doc: "Angular momentum L per mu M; with infall a plunge geodesic."},
	{path: "orbit.drive", form: pathForm, choices: []string{DrivePN}, of: []string{Inspiral}, need: []string{Inspiral},
		doc: "What drives the inspiral: `pn` for the published post-Newtonian flux, or a table of circular fluxes."},
	{path: "orbit.file", form: pathForm, of: []string{Table}, need: []string{Table},
		doc: "Trajectory (.npz, .npy or .csv) with time `t`, `r`, `phi` and optionally `theta`, `pr`, `pphi`, `E`, `L`."},
	{path: "orbit.columns", form: columns, of: []string{Table},
		doc: "Names of these quantities in the file where they differ, e.g. `{t: time, pphi: p_phi}`."},

	{path: "pulse.centre", form: real, bounds: anywhere(), need: []string{always}, doc: "Centre of the pulse in r_*, M."},
	{path: "pulse.width", form: real, bounds: above(0), need: []string{always}, doc: "Its width, M."},
	{path: "pulse.moving", form: choice, choices: []string{"out", "in", "static"}, preset: "out", doc: "Where it goes at first."},
	{path: "pulse.shape", form: choice, choices: []string{"gaussian", "compact"}, preset: "gaussian",
		doc: "`gaussian`: exp(-z^2/2), z = (r_*-centre)/width; `compact`: the same curvature at the top and exactly zero from 4 widths on."},

	{path: "accuracy.relative", form: real, bounds: inside(0, 1), preset: 1e-8,
		doc: "Wanted relative error of each flux, and of strain against its peak; the tool picks the numerics."},
	{path: "accuracy.floor", form: real, bounds: limits{low: 0, high: 1, highOpen: true}, preset: 1e-14,
		doc: "Modes below this fraction of the largest are held to it instead."},

	{path: "numerics.points", form: whole, bounds: between(64, 1_000_000), doc: "Grid points of the finest rung."},
	{path: "numerics.order", form: whole, bounds: between(2, 12), even: true, doc: "Order of the differences."},
	{path: "numerics.courant", form: real, bounds: limits{low: 0, high: 4, lowOpen: true}, doc: "Time step over grid spacing."},
	{path: "numerics.kernel_width", form: real, bounds: limits{low: 0, high: 100, lowOpen: true}, doc: "Width of the smoothed delta, in cells."},
	{path: "numerics.kernel_moments", form: whole, bounds: between(2, 16), even: true, doc: "Vanishing moments of the smoothed delta."},
	{path: "numerics.layer", form: real, bounds: limits{low: 0, high: 10_000, lowOpen: true}, doc: "Thickness of the outer layer, M."},
	{path: "numerics.angular", form: whole, bounds: between(1, 2*maxL), equation: Teukolsky, doc: "Number of coupled l."},
	{path: "numerics.rungs", form: whole, bounds: between(2, 5), doc: "How many resolutions an error bar is made from."},

	{path: "span.until", form: real, bounds: above(0), doc: "Last retarded time u, M; else chosen from the orbit."},

	{path: "model.name", form: text, preset: "model", doc: "A name for the page."},
	{path: "model.waveform.file", form: pathForm, need: []string{always}, doc: "File with the model's waveform."},
	{path: "model.waveform.time", form: text, preset: "t", doc: "Name of its time array."},
	{path: "model.waveform.modes", form: arrays, need: []string{always},
		doc: "Per mode one complex array or two real ones: `{\"2,2\": h22, \"2,1\": [re21, im21]}`."},
	{path: "model.quantity", form: choice, choices: []string{"strain", "master", "curvature"}, preset: "strain",
		doc: "What the arrays hold: r h_lm/mu, the half-normalised master function, or psi4."},
	{path: "model.phase", form: choice, choices: []string{"minus", "plus"}, preset: "minus", doc: "h = A e^{-i phi} (`minus`) or e^{+i phi} (`plus`)."},
	{path: "model.phase_of", form: choice, choices: []string{"particle", "heavy-body"}, preset: "particle",
		doc: "Whose azimuth the phase follows; odd m change sign between the two."},
	{path: "model.time_is", form: choice, choices: []string{"retarded", "particle"}, preset: "retarded",
		doc: "Retarded time, or the particle's (then u = t - r_* is applied)."},
	{path: "model.per", form: choice, choices: []string{"mu", "nu"}, preset: "mu", doc: "Amplitudes per mass ratio mu/M or per symmetric mass ratio nu."},
	{path: "model.mass_ratio", form: real, bounds: between(0, 1), preset: 0.0, doc: "mu/M, for `per: nu` and for E(t), L(t) of a force; 0 is the test-mass limit, where both are the same."},
	{path: "model.flux.file", form: pathForm, need: []string{always}, doc: "File with a flux curve."},
	{path: "model.flux.x", form: text, preset: "x", doc: "Its column of x = (M Omega)^(2/3)."},
	{path: "model.flux.energy", form: text, doc: "Its column of energy flux."},
	{path: "model.flux.angular_momentum", form: text, doc: "Its column of angular-momentum flux."},
	{path: "model.flux.against", form: pathForm, doc: "Table of a sweep over circular orbits to hold the curve against; else the run itself."},
	{path: "model.force.file", form: pathForm, need: []string{always}, doc: "File with what the dynamics lose."},
	{path: "model.force.t", form: text, preset: "t", doc: "Its column of time."},
	{path: "model.force.energy_rate", form: text, doc: "Its column of dE/dt in (mu/M)^2, as fluxes."},
	{path: "model.force.angular_momentum_rate", form: text, doc: "Its column of dL/dt in mu^2/M, as fluxes."},
	{path: "model.force.energy", form: text, doc: "Instead of a rate: its column of E(t) per mu, to be differentiated and divided by the mass ratio."},
	{path: "model.force.angular_momentum", form: text, doc: "Instead of a rate: its column of L(t) per mu M, to be differentiated and divided by the mass ratio."},
	{path: "model.noise.file", form: pathForm, need: []string{always}, doc: "File with a detector's noise curve; without the section the noise is flat."},
	{path: "model.noise.frequency", form: text, preset: "frequency", doc: "Its column of frequency, Hz."},
	{path: "model.noise.density", form: text, preset: "density", doc: "Its column of amplitude spectral density, 1/sqrt(Hz)."},
	{path: "model.noise.total_mass", form: real, bounds: above(0), need: []string{always}, doc: "Mass of the hole in solar masses, which scales frequencies."},
	{path: "align", form: shift, preset: Align{}, doc: "`none`, or `{window: [u1, u2]}`: one time and one phase shift, minimised there."},

	{path: "output.every", form: real, bounds: between(1e-3, 1e4), preset: 0.5, doc: "Sampling of stored series in u, M."},
	{path: "output.keep", form: subset, choices: []string{"waveform", "horizon", "flux", "report"},
		preset: []string{"waveform", "horizon", "flux", "report"}, doc: "Which of these files are written."},
}

// quantities are the names that orbit.columns may map.
var quantities = []string{"t", "r", "phi", "theta", "pr", "pphi", "E", "L"}

// at returns the field of a quantity in c.
func (c *Columns) at(quantity string) *string {
	switch quantity {
	case "t":
		return &c.T
	case "r":
		return &c.R
	case "phi":
		return &c.Phi
	case "theta":
		return &c.Theta
	case "pr":
		return &c.PR
	case "pphi":
		return &c.PPhi
	case "E":
		return &c.E
	case "L":
		return &c.L
	}
	panic("configs: no column is called " + quantity)
}

// parent returns the section that a path stands in, "" at the top.
func parent(path string) string {
	return path[:max(strings.LastIndexByte(path, '.'), 0)]
}

// name returns the last part of a path.
func name(path string) string { return path[strings.LastIndexByte(path, '.')+1:] }

// sections are the paths that hold keys, in the order of the schema, and
// whether the Case leaves them nil when they are not typed.
var sections, optional = func() (list []string, optional map[string]bool) {
	seen := map[string]bool{"": true}
	for _, k := range schema {
		var up []string
		for p := parent(k.path); !seen[p]; p = parent(p) {
			seen[p] = true
			up = append([]string{p}, up...)
		}
		list = append(list, up...)
	}
	return list, map[string]bool{"orbit": true, "pulse": true, "model": true,
		"model.waveform": true, "model.flux": true, "model.force": true, "model.noise": true}
}()

// find returns the row of a path, nil where there is none.
func find(path string) *key {
	for i := range schema {
		if schema[i].path == path {
			return &schema[i]
		}
	}
	return nil
}

// allowed says what the key takes, in words that follow "must be".
func (k *key) allowed() string {
	var s string
	switch k.form {
	case text:
		s = fmt.Sprintf("one line of text of at most %d characters, in quotes where it looks like a number", maxText)
	case pathForm:
		s = "the name of a file"
		if len(k.choices) > 0 {
			s = strings.Join(k.choices, ", ") + " or " + s
		}
	case choice:
		s = oneOf(k.choices)
	case subset:
		s = "a list of some of " + strings.Join(k.choices, ", ") + ", none twice"
	case real, whole:
		s = "a number"
		if k.form == whole {
			s = "a whole number"
		}
		if k.even {
			s = "an even number"
		}
		if b := k.bounds.String(); b != "" {
			s += " " + b
		}
		if len(k.infinite) > 0 {
			s += ", or .inf with kind: " + strings.Join(k.infinite, " or ")
		}
	case pairs:
		s = fmt.Sprintf("a list of pairs [l, m] of whole numbers with |m| <= l <= %d, not empty and none twice", maxL)
	case columns:
		s = "a mapping of some of " + strings.Join(quantities, ", ") + " to the names in the file"
	case arrays:
		s = `a mapping of "l,m" to the name of one complex array or a list of two real ones`
	case shift:
		s = "none or {window: [u1, u2]} with u1 < u2"
	}
	if k.hint != "" {
		s += " (" + k.hint + ")"
	}
	return s
}

func oneOf(words []string) string {
	if len(words) == 1 {
		return words[0]
	}
	return strings.Join(words[:len(words)-1], ", ") + " or " + words[len(words)-1]
}
