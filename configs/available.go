package configs

// features says what this version can run. Keys and values with a false entry
// are known and checked like the rest, and answered with one sentence; making
// an entry true is all that their arrival needs here. Values of a key are
// written as "key value", whole sections and keys by their path.
var features = map[string]bool{
	"orbit.kind " + Circular:      true,
	"orbit.kind " + Eccentric:     true,
	"orbit.kind " + Infall:        true,
	"orbit.kind " + Scatter:       true,
	"orbit.kind " + Inspiral:      true,
	"orbit.kind " + Table:         true,
	"waves.equation " + Master:    true,
	"waves.equation " + Teukolsky: true,
	pulsesTeukolsky:               true,
	"pulse":                       true,
	"model":                       true,
}

// pulsesTeukolsky is the Teukolsky equation for pulses, apart from its use for
// particles.
const pulsesTeukolsky = "waves.equation " + Teukolsky + " with pulse"

// lacks reports whether the feature is known and switched off.
func (r Reader) lacks(feature string) bool {
	table := r.features
	if table == nil {
		table = features
	}
	available, known := table[feature]
	return known && !available
}
