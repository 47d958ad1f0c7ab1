package result

// ComparisonSchema names the layout of comparison.json.
const ComparisonSchema = "nullmark.comparison/1"

// The three verdicts of a comparison.
const (
	Inside     = "inside"      // the error bar
	Differs    = "differs"     // the sentence says by how much and from when
	CannotTell = "cannot-tell" // the sentence says which asked accuracy would settle it
)

// Comparison is the whole of comparison.json. Differences are model minus
// reference; phases are those of h = A e^{-i phi} in radians; amplitudes are
// relative to the reference; times are u in M. Errors are absolute bounds.
type Comparison struct {
	Schema   string           `json:"schema"`
	Title    string           `json:"title"`
	Model    string           `json:"model"` // the model's name
	Range    [2]float64       `json:"range"` // u compared
	Shift    *Shift           `json:"shift"` // null: compared without any shift
	Settings Settings         `json:"settings"`
	Overall  Overall          `json:"overall"`
	Modes    []ModeComparison `json:"modes"`
	Hints    []string         `json:"hints"` // guesses at another convention, never applied
	Flux     *FluxComparison  `json:"flux,omitempty"`
	Balance  *Balance         `json:"balance,omitempty"`
	Numbers  []NumberPair     `json:"numbers,omitempty"` // two results set against each other
	Warnings []string         `json:"warnings"`
}

// Shift is what was added to the model's times and to its orbital phase:
// h_lm(u) is compared with A e^{-i (phi + m Phase)} taken at u + Time.
type Shift struct {
	Time   Q          `json:"time"`
	Phase  Q          `json:"phase"`
	Window [2]float64 `json:"window"`
}

// Settings says how the model was read and what the numbers assume.
type Settings struct {
	Quantity   string   `json:"quantity"`
	Phase      string   `json:"phase"`
	PhaseOf    string   `json:"phase_of"`
	TimeIs     string   `json:"time_is"`
	Per        string   `json:"per"`
	Align      string   `json:"align"`
	Noise      string   `json:"noise"`
	TotalMass  float64  `json:"total_mass,omitempty"` // solar masses, with a noise curve
	Parameters int      `json:"parameters"`           // D in mismatch = D/(2 SNR^2)
	Read       []string `json:"read"`                 // every conversion applied, in words
}

// ModeComparison is what was found in one mode. A difference is absent where
// it has no meaning (the phase of an m = 0 mode).
type ModeComparison struct {
	L                   int             `json:"l"`
	M                   int             `json:"m"`
	Verdict             string          `json:"verdict"`
	Sentence            string          `json:"sentence"`
	PhaseDifference     *Difference     `json:"phase_difference,omitempty"`
	AmplitudeDifference *Difference     `json:"amplitude_difference,omitempty"`
	FrequencyDifference *Difference     `json:"frequency_difference,omitempty"`
	Mismatch            *Q              `json:"mismatch,omitempty"`
	SNRVisible          *Q              `json:"snr_visible,omitempty"` // absent: no difference at any loudness
	SNRIs               string          `json:"snr_is,omitempty"`      // "at least" where the bar reaches zero mismatch
	Peak                *PeakComparison `json:"peak,omitempty"`
	// Significance is the largest ratio of |model - reference| to the bar and
	// Leaves the u at which that ratio first exceeds 1 (absent: never).
	Significance float64  `json:"significance"`
	Leaves       *float64 `json:"leaves,omitempty"`
	// Settles is the accuracy.relative that would decide a cannot-tell.
	Settles *float64 `json:"settles,omitempty"`
}

// Difference condenses a curve: its largest absolute value (with sign), its
// mean, its slope per M by least squares, values at markers and the largest
// value over each stage.
type Difference struct {
	Max     Q            `json:"max"`
	Mean    Q            `json:"mean"`
	Slope   Q            `json:"slope"`
	At      []MarkedQ    `json:"at"`
	ByStage map[string]Q `json:"by_stage"`
}

// MarkedQ is a value at a marked time.
type MarkedQ struct {
	Marker string  `json:"marker"`
	U      float64 `json:"u"`
	Value  Q       `json:"value"`
}

// PeakComparison sets the maxima of |h_lm| against each other.
type PeakComparison struct {
	Model      Peak `json:"model"`
	Reference  Peak `json:"reference"`
	Difference Peak `json:"difference"`
}

// View is a mismatch of the summed modes seen from one direction.
type View struct {
	From       string `json:"from"` // "face-on", "edge-on"
	Mismatch   Q      `json:"mismatch"`
	SNRVisible *Q     `json:"snr_visible,omitempty"`
	SNRIs      string `json:"snr_is,omitempty"`
}

// Overall is the answer in one line.
type Overall struct {
	Verdict    string   `json:"verdict"`
	Sentence   string   `json:"sentence"`
	Mismatch   *Q       `json:"mismatch,omitempty"`    // the larger of the views
	SNRVisible *Q       `json:"snr_visible,omitempty"` // of that view
	SNRIs      string   `json:"snr_is,omitempty"`
	Views      []View   `json:"views,omitempty"`
	Settles    *float64 `json:"settles,omitempty"`
}

// FluxComparison is the model's flux curve against certified fluxes.
type FluxComparison struct {
	Verdict  string      `json:"verdict"`
	Sentence string      `json:"sentence"`
	Curves   []FluxCurve `json:"curves"`
	Model    []FluxCurve `json:"model"`             // the model's own curves, only Newtonian filled
	Context  []FluxCurve `json:"context,omitempty"` // published expansions, only Newtonian filled
}

// FluxCurve is one flux against x = (M Omega)^(2/3). Newtonian is the
// reference (for model and context curves: these themselves) divided by (32/5) x^5 for the
// energy and (32/5) x^(7/2) for the angular momentum. Ratio is model/reference.
type FluxCurve struct {
	Of        string    `json:"of"` // "energy", "angular momentum"
	L         int       `json:"l,omitempty"`
	M         int       `json:"m,omitempty"` // both zero: the total
	Name      string    `json:"name,omitempty"`
	X         []float64 `json:"x"`
	Newtonian []Q       `json:"newtonian"`
	Ratio     []Q       `json:"ratio,omitempty"`
}

// Balance sets what the model's dynamics lose against what was measured.
type Balance struct {
	Verdict  string      `json:"verdict"`
	Sentence string      `json:"sentence"`
	Energy   *BalanceOf  `json:"energy,omitempty"`
	AngMom   *BalanceOf  `json:"angular_momentum,omitempty"`
	Note     string      `json:"note"`
	Range    *[2]float64 `json:"range,omitempty"`
}

// BalanceOf is one balance against u: Model is what the orbit loses per u,
// Measured the flux at infinity plus that into the horizon, Residual the
// difference model minus measured.
type BalanceOf struct {
	U        []float64 `json:"u"`
	Model    []Q       `json:"model"`
	Measured []Q       `json:"measured"`
	Residual []Q       `json:"residual"`
	Average  struct {
		Model    Q `json:"model"`
		Measured Q `json:"measured"`
		Residual Q `json:"residual"`
	} `json:"average"`
}

// NumberPair is one number of two results.
type NumberPair struct {
	Name       string `json:"name"` // "(2,2) energy at infinity"
	Model      Q      `json:"model"`
	Reference  Q      `json:"reference"`
	Difference Q      `json:"difference"`
	Verdict    string `json:"verdict"`
}

// Curves are the sampled differences behind a Comparison, for pictures and
// the csv. Samples where the reference's bar is too large to say anything are
// NaN in the differences.
type Curves struct {
	U     []float64
	Modes []ModeCurves
}

// ModeCurves are the curves of one mode, sampled like Curves.U.
type ModeCurves struct {
	L, M             int
	Model, Reference []complex128
	Phase, PhaseBar  []float64 // rad; nil for m = 0
	Amp, AmpBar      []float64
	Freq, FreqBar    []float64 // rad/M; nil for m = 0
}
