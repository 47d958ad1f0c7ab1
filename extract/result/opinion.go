package result

import "math"

// SecondOpinion sets one number of a result beside what another method gives
// for it: the frequency-domain solver, which shares the source's formulas with
// the evolution and neither slicing, grid, kernel, stepping nor demodulation.
type SecondOpinion struct {
	L      int    `json:"l,omitempty"` // 0: summed over l
	M      int    `json:"m"`
	What   string `json:"what"` // "energy at infinity", "energy at the horizon", "real part of strain", …
	Value  Q      `json:"value"`
	Second Q      `json:"second"`
	// Difference is Value minus Second, InBars its size in units of the sum of
	// both bars.
	Difference float64 `json:"difference"`
	InBars     float64 `json:"in_bars"`
}

// Compare fills Difference and InBars.
func (s *SecondOpinion) Compare() {
	s.Difference, s.InBars = s.Value.Value-s.Second.Value, 0
	if s.Difference != 0 {
		s.InBars = math.Abs(s.Difference) / (s.Value.Error + s.Second.Error)
	}
}
