package certify

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/demod"
	"nullmark/extract/strain"
)

// Average is the mean of a mode's quadratic signals over whole radial periods,
// per sign of m and without the factor (l+2)!/(l-2)!/(64 pi).
type Average struct {
	Power float64 // <|Psi_tau|^2>
	Spin  float64 // <Im(Psi conj(Psi_tau))>: m times it is the flux of angular momentum
}

// MeanOver averages with the window sin^{2 power} over power+1 radial periods
// ending at until: exact to round-off for signals whose squares repeat with the
// radial period (to 5e-11 for power 1, whose ends the samples do not resolve).
func MeanOver(s *Samples, end End, until, period float64, power int) (Average, error) {
	w := demod.Window{Start: until - float64(power+1)*period, Length: float64(power+1) * period, Power: power}
	if w.Start < 0 || until > s.Until()+1e-9*until {
		return Average{}, fmt.Errorf("averaging %d radial periods of %.4g M up to %.6g needs a longer run", power+1, period, until)
	}
	var a Average
	var sum float64
	k0 := int(math.Ceil(w.Start / s.Dt))
	k1 := min(int(math.Floor(until/s.Dt)), len(s.Pi[end])-1)
	for k := k0; k <= k1; k++ {
		g := w.Weight(float64(k) * s.Dt)
		p, q := s.Pi[end][k], s.Psi[end][k]
		a.Power += g * (real(p)*real(p) + imag(p)*imag(p))
		a.Spin += g * imag(q*cmplx.Conj(p))
		sum += g
	}
	a.Power /= sum
	a.Spin /= sum
	return a, nil
}

// WindowError bounds the relative error that MeanOver's sum over samples makes in
// Power. For power 1 the window starts with a second derivative w” = 2 (pi/T)^2,
// T = 2 period, at a time between two samples: by Euler–Maclaurin's formula for a
// shifted start each end adds at most |B_3|/3! dt^3 w” f, |B_3| <= 0.0482 (its
// polynomial on [0, 1]), f the power there, against T/2 times the mean; the sum of
// the weights, by which it is divided, errs alike with f = 1, so that the distance
// of f from the mean counts (a third of the mean stands for the next term). Higher
// powers start so smoothly that nothing is left to count.
func WindowError(s *Samples, end End, until, period float64, power int) float64 {
	if power > 1 {
		return 0
	}
	a, err := MeanOver(s, end, until, period, power)
	if err != nil {
		return 0 // the average itself is refused
	}
	p := s.Pi[end][min(int(until/s.Dt), len(s.Pi[end])-1)]
	x := s.Dt / (2 * period)
	return 2 * 0.0482 / 6 * 2 * math.Pi * math.Pi * 2 * x * x * x * (math.Abs((real(p)*real(p)+imag(p)*imag(p))/a.Power-1) + 1./3)
}

// Distance is the root mean square difference of two rungs' Psi_tau over the
// same window, relative to the finer's: unlike the difference of the averages it
// does not vanish by accident. It is +Inf where the coarser rung ends before the
// window starts.
func Distance(fine, coarse *Samples, end End, until, period float64, power int) float64 {
	w := demod.Window{Start: until - float64(power+1)*period, Length: float64(power+1) * period, Power: power}
	k0 := int(math.Ceil(w.Start / fine.Dt))
	k1 := min(int(math.Floor(until/fine.Dt)), len(fine.Pi[end])-1)
	last := coarse.Until()
	var at []float64
	for k := k0; k <= k1; k++ {
		t := float64(k) * fine.Dt
		if t > last {
			break
		}
		at = append(at, t)
	}
	if len(at) == 0 {
		return math.Inf(1)
	}
	other := strain.Resample(coarse.Pi[end], 0, coarse.Dt, at)
	var d, p float64
	for i, t := range at {
		g := w.Weight(t)
		a := fine.Pi[end][k0+i]
		b := a - other[i]
		d += g * (real(b)*real(b) + imag(b)*imag(b))
		p += g * (real(a)*real(a) + imag(a)*imag(a))
	}
	return math.Sqrt(d / p)
}

// Leftover is the part of a difference of two rungs of a scheme of the given
// order that bounds what is left in the finer.
func Leftover(order int) float64 { return leftover(order) }

// Guard is the fraction of the next coarser difference that replaces one which
// is small by accident.
const Guard = guard
