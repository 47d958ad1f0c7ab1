package wire

import (
	"math"

	"nullmark/hyperboloidal"
	"nullmark/source"
)

// pulseRatio is the spacing of the finest rung over that of the other.
const pulseRatio = 0.8

// fit places the layers around the pulse: the flat part holds it and the
// neighbourhood of the potential's top.
func (s *pulseScheme) fit(p source.Pulse, inner, outer float64, profile hyperboloidal.Profile) {
	s.pulse = p
	ri := math.Min(p.Centre-p.Reach(), 0)
	ro := math.Max(p.Centre+p.Reach(), 20)
	s.domain = hyperboloidal.Layers{Si: ri - inner, Ri: ri, Ro: ro, So: ro + outer, Profile: profile}
}
