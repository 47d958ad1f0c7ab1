package wire

import (
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// describePath lists what a worldline says of itself.
func describePath(w worldline.Worldline) *result.Orbit {
	o := &result.Orbit{Kind: w.Kind(), Numbers: map[string]float64{
		"horizon_radius": hyperboloidal.Horizon, "light_ring_radius": hyperboloidal.LightRing, "isco_radius": hyperboloidal.ISCORadius,
	}}
	for _, n := range w.Numbers() {
		switch n.Name {
		case "E":
			o.Energy = n.Value
		case "L":
			o.AngMom = n.Value
		default:
			o.Numbers[n.Name] = n.Value
		}
	}
	for _, k := range w.Markers() {
		if o.Markers == nil {
			o.Markers = map[string]float64{}
		}
		if _, there := o.Markers[k.Name]; !there {
			o.Markers[k.Name] = k.T
		}
	}
	return o
}
