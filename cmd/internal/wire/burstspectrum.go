package wire

import (
	"nullmark/configs"
	"nullmark/extract/certify"
	"nullmark/extract/recoil"
	"nullmark/extract/result"
	"nullmark/extract/spectrum"
)

// spectrumOf is dE/domega of a burst over the counted range, all modes together,
// and its peak's frequency. A driven inspiral has none: its spectrum is that of the
// part that was run. Frequencies end where the density has fallen to 1e-12 of its
// largest.
func (r *burstRun) spectrumOf(res *result.Result) *result.Spectrum {
	if r.path.Kind() == configs.Inspiral {
		return nil
	}
	at := r.times()
	parts := func(rates []recoil.Mode) []spectrum.Part {
		var out []spectrum.Part
		for _, m := range rates {
			out = append(out, spectrum.Strain(m.M, m.Rate))
		}
		return out
	}
	o := spectrum.Options{Coarse: parts(r.rates(at, 1)), Factor: certify.Leftover(min(r.n.order, r.n.moments))}
	fine := parts(r.rates(at, 0))
	s, err := spectrum.Of(fine, o)
	if err != nil {
		return nil
	}
	top := 0.0
	last := 0
	for _, v := range s.Density {
		top = max(top, v)
	}
	for i, v := range s.Density {
		if v > 1e-12*top && s.Omega[i] < 4 {
			last = i
		}
	}
	// The peak is that of the modes that carry the energy.
	var strong, strongCoarse []spectrum.Part
	for i, m := range r.modes {
		if m.mov.flux[certify.Infinity].energy > 1e-5*r.largest {
			strong, strongCoarse = append(strong, fine[i]), append(strongCoarse, o.Coarse[i])
		}
	}
	o.Coarse = strongCoarse
	if q, err := spectrum.Peak(strong, o); err == nil {
		res.Total.SpectrumPeak = &q
	}
	return &result.Spectrum{Omega: s.Omega[:last+1], Density: s.Density[:last+1], Err: s.Err[:last+1]}
}
