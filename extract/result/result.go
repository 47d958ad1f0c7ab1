// Package result holds the data of a finished run: what result.json and the
// series files contain, with no behaviour beyond small look-ups. Every layer
// after the evolution (certification, storage, report, comparison) speaks in
// these types; none of them knows how the numbers were made.
//
// Units are G = c = M = 1 with the particle's mass factored out: fluxes in
// (mu/M)^2, strain as r h_lm/mu, radiated totals in mu^2/M (energy) and mu^2
// (angular momentum).
package result

// Schema names the layout of result.json.
const Schema = "nullmark.result/1"

// Q is a number with its absolute error bar: the truth is claimed to lie in
// [Value-Error, Value+Error].
type Q struct {
	Value float64 `json:"value"`
	Error float64 `json:"error"`
}

// Complex is a complex number whose two parts carry bars of their own.
type Complex struct {
	Re Q `json:"re"`
	Im Q `json:"im"`
}

// Flux is what leaves the orbit through one end (null infinity or the
// horizon): energy and angular momentum, positive when the orbit loses them.
type Flux struct {
	Energy          Q `json:"energy"`
	AngularMomentum Q `json:"angular_momentum"`
}

// Mode holds the certified numbers of one (l,m). Entries have m >= 0 and count
// m and -m together unless Counts says otherwise.
type Mode struct {
	L        int      `json:"l"`
	M        int      `json:"m"`
	Parity   string   `json:"parity,omitempty"` // "even" (Zerilli), "odd" (Regge–Wheeler) or "" where it does not apply
	Measure  string   `json:"measure"`          // "rate" (per coordinate time) or "total"
	Counts   string   `json:"counts"`           // "both signs of m" or "this m"
	Infinity *Flux    `json:"infinity,omitempty"`
	Horizon  *Flux    `json:"horizon,omitempty"`
	Strain   *Complex `json:"strain,omitempty"` // r h_lm e^{i m phi_p(u)}/mu, circular equatorial orbits
	Peak     *Peak    `json:"peak,omitempty"`
	// Met says whether every number of this mode has reached the asked
	// accuracy; Why says in words what stopped it when it has not.
	Met  bool   `json:"met"`
	Why  string `json:"why,omitempty"`
	Rung int    `json:"rung"` // index into Result.Rungs of the finest rung used
	// Budget splits the relative error bar of the strain at both ends into
	// its named parts ("discretisation", "transient", "round-off", …).
	Budget map[string]float64 `json:"budget,omitempty"`
}

// Peak describes the maximum of |r h_lm| of a plunge or an inspiral.
type Peak struct {
	U                  Q            `json:"u"`
	Amplitude          Q            `json:"amplitude"`
	Frequency          Q            `json:"frequency"`
	AmplitudeCurvature Q            `json:"amplitude_curvature"`
	FrequencySlope     Q            `json:"frequency_slope"`
	Delay              *Q           `json:"delay,omitempty"`         // U minus the time of the peak orbital frequency
	AtLightRing        map[string]Q `json:"at_light_ring,omitempty"` // amplitude, frequency, … at u = light-ring crossing
}

// PerM is the basis-independent sum over l at fixed m.
type PerM struct {
	M          int   `json:"m"`
	Infinity   *Flux `json:"infinity,omitempty"`
	Horizon    *Flux `json:"horizon,omitempty"`
	LConverged bool  `json:"l_converged"` // the last two l add at most the asked relative accuracy
}

// Total is the sum over all modes. The fluxes include the estimated tail
// beyond l_max, whose value and bar stand in Truncation as well.
type Total struct {
	Measure    string      `json:"measure"`
	Infinity   *Flux       `json:"infinity,omitempty"`
	Horizon    *Flux       `json:"horizon,omitempty"`
	Truncation *Truncation `json:"truncation,omitempty"`
	Recoil     *Recoil     `json:"recoil,omitempty"`
	// SpectrumPeak is the frequency, 1/M, of the largest dE/domega of a burst.
	SpectrumPeak *Q `json:"spectrum_peak,omitempty"`
}

// Truncation is the estimate of what the modes beyond LMax would add.
type Truncation struct {
	LMax     int    `json:"l_max"`
	Infinity *Flux  `json:"infinity,omitempty"`
	Horizon  *Flux  `json:"horizon,omitempty"`
	Note     string `json:"note,omitempty"`
}

// Recoil is the kick in units of (mu/M)^2 M^0: momentum per M, i.e. mu^2/M^2.
type Recoil struct {
	X     Q `json:"x"`
	Y     Q `json:"y"`
	Speed Q `json:"speed"`
}

// Rung is one resolution of the ladder as it was run.
type Rung struct {
	Modes       string  `json:"modes"`             // which modes ran on it, for a reader
	Points      int     `json:"points"`            // grid points
	Dx          float64 `json:"dx"`                // grid spacing in rho, M
	Dt          float64 `json:"dt"`                // time step, M
	Kernel      float64 `json:"kernel"`            // width sigma of the smoothed delta, M
	Moments     int     `json:"moments"`           // its vanishing moments
	Order       int     `json:"order"`             // difference order
	Angular     int     `json:"angular,omitempty"` // number of coupled l (Kerr)
	Until       float64 `json:"until"`             // last time evolved to, M
	CoreSeconds float64 `json:"core_seconds"`
}

// Accuracy says what was asked and whether it was reached.
type Accuracy struct {
	Asked float64 `json:"asked"`
	Floor float64 `json:"floor"`
	Met   bool    `json:"met"`
	Worst Worst   `json:"worst"`
}

// Worst names the number that is furthest from what was asked.
type Worst struct {
	L        int     `json:"l"`
	M        int     `json:"m"`
	What     string  `json:"what"`     // e.g. "energy at the horizon"
	Relative float64 `json:"relative"` // bar / the scale it is held against
}

// Orbit is what follows from the worldline. Unknown entries are absent.
type Orbit struct {
	Kind    string             `json:"kind"`
	Energy  float64            `json:"E"`
	AngMom  float64            `json:"L"`
	Numbers map[string]float64 `json:"numbers,omitempty"` // "radius", "omega_phi", "omega_r", "period_phi", "p", "e", …
	Markers map[string]float64 `json:"markers,omitempty"` // times: "isco", "light_ring", "peak_orbital_frequency", "horizon", …
}

// Provenance says by what, where and at what cost a result was made.
type Provenance struct {
	Version         string  `json:"version"`
	Commit          string  `json:"commit"`
	Go              string  `json:"go"`
	Host            string  `json:"host_arch"` // architecture, never a machine's name
	Start           string  `json:"start"`     // RFC 3339, UTC
	Seconds         float64 `json:"seconds"`
	CoreSeconds     float64 `json:"core_seconds"`
	PeakMemoryBytes uint64  `json:"peak_memory_bytes"`
	Workers         int     `json:"workers"`
}

// Ringing is one fitted damped oscillation e^{-i omega u}.
type Ringing struct {
	L     int    `json:"l"`
	M     int    `json:"m"`
	N     int    `json:"n"`
	Re    Q      `json:"re"`
	Im    Q      `json:"im"`
	Where string `json:"where"` // "infinity" or "horizon"
}

// Tail is one fitted late-time power law.
type Tail struct {
	L        int    `json:"l"`
	M        int    `json:"m"`
	Where    string `json:"where"` // "infinity", "horizon", "radius 10"
	Exponent Q      `json:"exponent"`
}

// Result is the whole of result.json.
type Result struct {
	Schema      string            `json:"schema"`
	Title       string            `json:"title"`
	Case        any               `json:"case"` // the resolved case, as in case.yaml
	Conventions map[string]string `json:"conventions"`
	Provenance  Provenance        `json:"provenance"`
	Orbit       *Orbit            `json:"orbit,omitempty"`
	Modes       []Mode            `json:"modes,omitempty"`
	PerM        []PerM            `json:"per_m,omitempty"`
	Total       *Total            `json:"total,omitempty"`
	Ringing     []Ringing         `json:"ringing,omitempty"`
	Tail        []Tail            `json:"tail,omitempty"`
	// SecondOpinion is there when it was asked for.
	SecondOpinion []SecondOpinion `json:"second_opinion,omitempty"`
	Rungs         []Rung          `json:"rungs"`
	Accuracy      Accuracy        `json:"accuracy"`
	Warnings      []string        `json:"warnings"`
}

// ModeSeries is the stored time series of one mode, sampled like its Series.
type ModeSeries struct {
	L, M int
	// Wave is r h_lm/mu at null infinity (or, for pulses, the field psi_l_m).
	Wave []complex128
	// WaveErr is the absolute error bar of each sample of Wave.
	WaveErr []float64
	// Horizon is the field from which absorption is computed, against V.
	Horizon    []complex128
	HorizonErr []float64
	// Evidence is |difference of Wave between the two finest rungs|, the
	// picture of convergence (nil where it was not kept).
	Evidence []float64
	// Tones is the sum of the fitted damped oscillations of a pulse, sampled
	// like Wave, NaN before the fit begins; nil where none was fitted.
	Tones []complex128
}

// LocalIndex is -d ln|psi|/d ln t of a pulse's decay at one place against the
// time that belongs there (see Tail), with a bar at each time.
type LocalIndex struct {
	L, M  int
	Where string // as in Tail
	Times []float64
	Index []float64
	Error []float64
}

// Series are the sampled outputs of a run: U retarded time at null infinity,
// V advanced time at the horizon, and the particle's path against time T.
type Series struct {
	Prefix        string // "h" (strain) or "psi" (pulses)
	U, V          []float64
	Modes         []ModeSeries
	Decay         []LocalIndex // pulses with a tail
	T, R, Phi     []float64    // the particle; nil for pulses
	JunkUntil     float64      // samples with u below this still carry the start-up
	HorizonPrefix string       // name prefix of the horizon field, e.g. "psi"
}

// Spectrum is the energy spectrum of a burst at null infinity, summed over the
// modes that were run, positive frequencies standing for both signs:
// dE/domega in mu^2 against omega in 1/M, with absolute bars.
type Spectrum struct {
	Omega, Density, Err []float64
}

// Bundle is everything a run hands to storage and report.
type Bundle struct {
	Result   *Result
	Series   *Series
	Spectrum *Spectrum // nil where there is none
}

// Find returns the mode (l,m), or nil.
func (r *Result) Find(l, m int) *Mode {
	for i := range r.Modes {
		if r.Modes[i].L == l && r.Modes[i].M == m {
			return &r.Modes[i]
		}
	}
	return nil
}
