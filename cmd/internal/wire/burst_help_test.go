package wire

import (
	"nullmark/source/worldline"
)

// peakOmega is the orbital frequency at its marker.
func peakOmega(w worldline.Worldline) float64 {
	var s worldline.State
	for _, k := range w.Markers() {
		if k.Name == worldline.MarkPeakOmega {
			w.At(k.T, &s)
			return s.Omega()
		}
	}
	return 0
}
