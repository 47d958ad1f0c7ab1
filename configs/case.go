// Package configs reads case files. A case passes through two stages: as
// typed (a file, the environment, --set) with every fault collected at once,
// and resolved: complete, immutable, stored with each run and accepted again
// as input. One table (schema.go) states every key, its type, range, default
// and meaning; reading, writing and the printed reference all follow it.
//
// The package knows arithmetic limits only. Limits that need the physics of
// an orbit (a light ring, a separatrix) come in through Reader.Checks and are
// reported in the same words. Units are G = c = M = 1.
package configs

import "sort"

// Case is a resolved case: every key has its value. It is built by Reader and
// is not to be modified; two reads never share memory. The tags are the key
// names of the case file.
type Case struct {
	Title    string   `mapstructure:"title"`
	Hole     Hole     `mapstructure:"hole"`
	Waves    Waves    `mapstructure:"waves"`
	Orbit    *Orbit   `mapstructure:"orbit"` // exactly one of Orbit, Pulse is not nil
	Pulse    *Pulse   `mapstructure:"pulse"`
	Accuracy Accuracy `mapstructure:"accuracy"`
	Numerics Numerics `mapstructure:"numerics"`
	Span     Span     `mapstructure:"span"`
	Model    *Model   `mapstructure:"model"` // nil: nothing to compare with
	Align    Align    `mapstructure:"align"`
	Output   Output   `mapstructure:"output"`
}

// Hole is the black hole of mass 1.
type Hole struct {
	Spin float64 `mapstructure:"spin"` // a/M, in (-1, 1)
}

// Names of the equations in Waves.Equation.
const (
	Master    = "master"    // Regge–Wheeler (odd) and Zerilli (even)
	Teukolsky = "teukolsky" // any spin
)

// Waves says which equation is solved and for which modes.
type Waves struct {
	Equation   string   `mapstructure:"equation"`    // Master or Teukolsky
	SpinWeight int      `mapstructure:"spin_weight"` // -2, 0 or 2; 0 and without meaning for Master
	LMax       int      `mapstructure:"l_max"`       // the largest l; that of Modes where Modes is given
	Modes      [][2]int `mapstructure:"modes"`       // {l, m} sorted; empty = all up to LMax
}

// Names of the orbit kinds in Orbit.Kind.
const (
	Circular  = "circular"
	Eccentric = "eccentric"
	Infall    = "infall"
	Scatter   = "scatter"
	Inspiral  = "inspiral"
	Table     = "table"
)

// Orbit is the particle's motion. Fields that do not belong to Kind are zero.
type Orbit struct {
	Kind            string  `mapstructure:"kind"`
	Radius          float64 `mapstructure:"radius"`           // circular: r, M
	P               float64 `mapstructure:"p"`                // eccentric: semi-latus rectum, M
	E               float64 `mapstructure:"e"`                // eccentric: eccentricity
	Inclination     float64 `mapstructure:"inclination"`      // degrees, cos = L/sqrt(L^2+Q)
	RadialPhase     float64 `mapstructure:"radial_phase"`     // rad at t = 0, from periastron
	PolarPhase      float64 `mapstructure:"polar_phase"`      // rad at t = 0
	Azimuth         float64 `mapstructure:"azimuth"`          // rad at t = 0
	From            float64 `mapstructure:"from"`             // start radius, M; +Inf allowed for infall
	Energy          float64 `mapstructure:"energy"`           // per mu
	AngularMomentum float64 `mapstructure:"angular_momentum"` // per mu M
	MassRatio       float64 `mapstructure:"mass_ratio"`       // nu
	Drive           string  `mapstructure:"drive"`            // DrivePN or the absolute path of a table
	File            string  `mapstructure:"file"`             // table: absolute path
	Columns         Columns `mapstructure:"columns"`          // table: names in the file
}

// DrivePN is the value of Orbit.Drive that takes the published post-Newtonian flux.
const DrivePN = "pn"

// Columns maps the quantities of a trajectory file to the names they have
// there. An empty name means that the file uses the quantity's own name.
type Columns struct {
	T, R, Phi, Theta, PR, PPhi, E, L string
}

// Pulse is initial data without a particle: a Gaussian in r_*, or a pulse of the
// same curvature that is zero beyond 4 widths.
type Pulse struct {
	Centre float64 `mapstructure:"centre"` // r_*, M
	Width  float64 `mapstructure:"width"`  // M
	Moving string  `mapstructure:"moving"` // "out", "in" or "static"
	Shape  string  `mapstructure:"shape"`  // "gaussian" or "compact"
}

// Accuracy is what the user wants to reach.
type Accuracy struct {
	Relative float64 `mapstructure:"relative"` // relative error of each flux, and of strain against its peak
	Floor    float64 `mapstructure:"floor"`    // modes below this fraction of the largest are held to it instead
}

// Numerics are an expert's overrides; nil lets the tool choose.
type Numerics struct {
	Points        *int     `mapstructure:"points"`
	Order         *int     `mapstructure:"order"`
	Courant       *float64 `mapstructure:"courant"`
	KernelWidth   *float64 `mapstructure:"kernel_width"` // cells
	KernelMoments *int     `mapstructure:"kernel_moments"`
	Layer         *float64 `mapstructure:"layer"`   // thickness, M
	Angular       *int     `mapstructure:"angular"` // number of coupled l
	Rungs         *int     `mapstructure:"rungs"`
}

// Span limits the evolved time; nil leaves it to the orbit.
type Span struct {
	Until *float64 `mapstructure:"until"` // M
}

// Output says what is stored.
type Output struct {
	Every float64  `mapstructure:"every"` // sampling of stored series in u, M
	Keep  []string `mapstructure:"keep"`  // subset of waveform, horizon, flux, report, in this order
}

// Model names the modeller's files that a result is compared with.
type Model struct {
	Name     string         `mapstructure:"name"`
	Waveform *ModelWaveform `mapstructure:"waveform"`
	Quantity string         `mapstructure:"quantity"` // "strain", "master" or "curvature"
	Phase    string         `mapstructure:"phase"`    // "minus": h = A e^{-i phi}; "plus"
	PhaseOf  string         `mapstructure:"phase_of"` // "particle" or "heavy-body"
	TimeIs   string         `mapstructure:"time_is"`  // "retarded" or "particle"
	Per      string         `mapstructure:"per"`      // "mu" or "nu"
	// MassRatio is mu/M for Per "nu"; 0 is the test-mass limit.
	MassRatio float64     `mapstructure:"mass_ratio"`
	Flux      *ModelFlux  `mapstructure:"flux"`
	Force     *ModelForce `mapstructure:"force"`
	Noise     *ModelNoise `mapstructure:"noise"` // nil: flat noise
}

// ModelWaveform names the arrays of a model's waveform.
type ModelWaveform struct {
	File  string      `mapstructure:"file"`
	Time  string      `mapstructure:"time"`
	Modes []ModelMode `mapstructure:"modes"` // sorted by l, then m
}

// ModelMode is one mode: the name of a complex array, or of its real and
// imaginary part.
type ModelMode struct {
	L, M   int
	Arrays []string // one or two names
}

// ModelFlux names the columns of a flux curve; an empty name is not there.
type ModelFlux struct {
	File            string `mapstructure:"file"`
	X               string `mapstructure:"x"`
	Energy          string `mapstructure:"energy"`
	AngularMomentum string `mapstructure:"angular_momentum"`
	Against         string `mapstructure:"against"` // a sweep's table; "": the run itself
}

// ModelForce names the columns of what the dynamics lose; an empty name is
// not there.
type ModelForce struct {
	File                string `mapstructure:"file"`
	T                   string `mapstructure:"t"`
	EnergyRate          string `mapstructure:"energy_rate"`
	AngularMomentumRate string `mapstructure:"angular_momentum_rate"`
	Energy              string `mapstructure:"energy"`           // E(t), where there is no rate
	AngularMomentum     string `mapstructure:"angular_momentum"` // L(t), where there is no rate
}

// ModelNoise names the columns of a detector's noise curve.
type ModelNoise struct {
	File      string  `mapstructure:"file"`
	Frequency string  `mapstructure:"frequency"`  // Hz
	Density   string  `mapstructure:"density"`    // amplitude spectral density, 1/sqrt(Hz)
	TotalMass float64 `mapstructure:"total_mass"` // solar masses
}

// Align is how a model is shifted before it is compared: not at all, or by
// one time and one phase that minimise the difference for u in [From, To].
type Align struct {
	Windowed bool
	From, To float64
}

// ModeList returns the modes to evolve as {l, m} with m >= 0, ordered by l and
// then m: those named in the case (m < 0 follows by symmetry and is folded
// onto its partner), or all from LMin to LMax with m = 0 included. The slice
// is the caller's.
func (c *Case) ModeList() [][2]int {
	var list [][2]int
	if len(c.Waves.Modes) == 0 {
		for l := c.LMin(); l <= c.Waves.LMax; l++ {
			for m := 0; m <= l; m++ {
				list = append(list, [2]int{l, m})
			}
		}
		return list
	}
	seen := map[[2]int]bool{}
	for _, lm := range c.Waves.Modes {
		lm[1] = max(lm[1], -lm[1])
		if !seen[lm] {
			seen[lm] = true
			list = append(list, lm)
		}
	}
	sortModes(list)
	return list
}

// LMin returns the smallest l that radiates: |spin weight| for the pulses of
// the Teukolsky equation, 2 for everything else.
func (c *Case) LMin() int {
	if c.Pulse != nil && c.Waves.Equation == Teukolsky {
		return max(c.Waves.SpinWeight, -c.Waves.SpinWeight)
	}
	return 2
}

func sortModes(list [][2]int) {
	sort.Slice(list, func(i, j int) bool {
		a, b := list[i], list[j]
		return a[0] < b[0] || a[0] == b[0] && a[1] < b[1]
	})
}
