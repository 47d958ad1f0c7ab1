package totals

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/demod"
	"nullmark/extract/result"
	"nullmark/extract/signal"
)

// Short says that an interval holds too few radial periods for an average.
type Short struct{ Have, Want float64 }

func (e *Short) Error() string {
	return fmt.Sprintf("totals: the settled part of the run holds %.3g radial periods, averages take at least %g", e.Have, e.Want)
}

// Window is the last sin^{2 power} window over power+1 radial periods that ends
// by the time end: over fluxes, which repeat with the radial period, every
// harmonic but the mean falls on a zero of its spectrum.
func Window(end, period float64, power int) demod.Window {
	length := float64(power+1) * period
	return demod.Window{Start: end - length, Length: length, Power: power}
}

// Mean is sum w f / sum w over the uniform samples f (sample k at start + k dt).
// The trapezoidal sum of the window is exact to round-off for the mean.
func Mean(f []float64, start, dt float64, w demod.Window) float64 {
	var sum, weight float64
	k0, k1 := inside(len(f), start, dt, w)
	for k := k0; k <= k1; k++ {
		g := w.Weight(start + float64(k)*dt)
		sum += g * f[k]
		weight += g
	}
	return sum / weight
}

func inside(n int, start, dt float64, w demod.Window) (first, last int) {
	first = max(0, int(math.Ceil((w.Start-start)/dt)))
	last = min(n-1, int(math.Floor((w.Start+w.Length-start)/dt)))
	return first, last
}

// AverageOptions of Average.
type AverageOptions struct {
	// From is where the start-up has decayed; To the last time used, 0 the end.
	From, To float64
	// Period is the radial period in coordinate time.
	Period float64
	// Power is k of the window sin^{2k} over k+1 periods; 0: the largest of 1
	// to 4 that leaves one period for the shifted window.
	Power int
	// Margin times the change of the average over one period is the transient's
	// bar; 0 means 2. A remainder that falls like a power n of time leaves
	// change*u/(n Period), so a late window needs more.
	Margin float64
}

// Average is a mode's mean flux over radial periods and the parts of its bar.
type Average struct {
	Flux result.Flux
	// Transient is the part of the bars from the change over one period,
	// Samples that from the samples' bars.
	Transient, Samples struct{ Energy, AngularMomentum float64 }
	Window             demod.Window
}

// Mean averages the fluxes of one mode, m and -m together, over the last whole
// radial periods, with a bar from the bars of the samples and from the change
// against the window one period earlier. The caller adds the discretisation
// (see Disagreement). A *Short error says that two periods after From are not
// there.
func (o AverageOptions) Mean(f Field) (*Average, error) {
	x, err := Of(f)
	if err != nil {
		return nil, err
	}
	if !(o.Period > 8*f.Rate.Dt) {
		return nil, &signal.Fault{What: fmt.Sprintf("radial period %g with samples %g apart", o.Period, f.Rate.Dt)}
	}
	end := o.To
	if end == 0 {
		end = f.Rate.End()
	}
	have := (end - math.Max(o.From, f.Rate.Start)) / o.Period
	power := o.Power
	if power == 0 {
		power = min(4, int(have+1e-9)-2)
	}
	if power < 1 || have+1e-9 < float64(power+2) {
		return nil, &Short{have, float64(max(power, 1) + 2)}
	}
	margin := o.Margin
	if margin == 0 {
		margin = 2
	}
	now := Window(end, o.Period, power)
	before := now
	before.Start -= o.Period
	mean := func(v []float64, w demod.Window) float64 { return Mean(v, f.Rate.Start, f.Rate.Dt, w) }
	out := &Average{Window: now}
	out.Flux.Energy.Value = mean(x.Energy, now)
	out.Flux.AngularMomentum.Value = mean(x.AngMom, now)
	out.Transient.Energy = margin * math.Abs(out.Flux.Energy.Value-mean(x.Energy, before))
	out.Transient.AngularMomentum = margin * math.Abs(out.Flux.AngularMomentum.Value-mean(x.AngMom, before))
	out.Samples.Energy = mean(x.EnergyErr, now)
	out.Samples.AngularMomentum = mean(x.AngMomErr, now)
	out.Flux.Energy.Error = out.Transient.Energy + out.Samples.Energy
	out.Flux.AngularMomentum.Error = out.Transient.AngularMomentum + out.Samples.AngularMomentum
	return out, nil
}

// Disagreement is the relative distance of two runs of the same field in the
// window, D = sqrt(<w |a-b|^2> / <w |a|^2>), b resampled at a's times. An energy
// flux differs by at most 2D + D^2 of itself, and a discretisation bar is what
// the order of the scheme leaves of that; unlike the difference of the two
// fluxes D has no accidental zeros.
func Disagreement(fine, coarse signal.Series, w demod.Window) (float64, error) {
	a, b, err := signal.Onto(fine, coarse)
	if err != nil {
		return 0, err
	}
	const slack = 1e-6
	if w.Start < a.Start-a.Dt*(1+slack) || w.Start+w.Length > a.End()+a.Dt*(1+slack) {
		return 0, &signal.Fault{What: fmt.Sprintf("the window [%g, %g] is not inside what the two runs have in common, [%g, %g]", w.Start, w.Start+w.Length, a.Start, a.End())}
	}
	var gap, size float64
	k0, k1 := inside(len(a.Values), a.Start, a.Dt, w)
	for k := k0; k <= k1; k++ {
		g := w.Weight(a.Time(k))
		d, v := cmplx.Abs(a.Values[k]-b.Values[k]), cmplx.Abs(a.Values[k])
		gap += g * d * d
		size += g * v * v
	}
	if size == 0 {
		return 0, &signal.Fault{What: "the field vanishes in the window"}
	}
	return math.Sqrt(gap / size), nil
}
