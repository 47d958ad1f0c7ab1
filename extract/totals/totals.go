// Package totals integrates what a master function radiates: energy and angular
// momentum of a transient by mode, and averages over radial periods of a bound
// orbit, each with a bar. Units: mu^2/M and mu^2 for totals, (mu/M)^2 and
// mu^2/M for averages.
//
// With Psi normalised as Zerilli–Moncrief and Cunningham–Price–Moncrief,
//
//	dE/du = (1/64 pi) (l+2)!/(l-2)! |dPsi/du|^2
//	dL/du = (1/64 pi) (l+2)!/(l-2)! m Im(Psi conj(dPsi/du))
//
// per sign of m, at null infinity and with advanced time at the horizon.
//
// Source: K. Martel and E. Poisson, Phys. Rev. D 71, 104003 (2005).
package totals

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/extract/signal"
)

// Field is one mode at one end: Psi and its time derivative Rate at the same
// sample times.
type Field struct {
	L, M      int
	Psi, Rate signal.Series
}

// Fluxes are samples of energy and angular momentum flux, m and -m together,
// with bounds of their errors from the bars of the field.
type Fluxes struct {
	Energy, EnergyErr []float64
	AngMom, AngMomErr []float64
}

// Of forms the fluxes of all samples of f, m and -m together (m = 0 once).
func Of(f Field) (*Fluxes, error) {
	if err := f.Rate.Check(); err != nil {
		return nil, fmt.Errorf("totals: mode (%d,%d): the time derivative: %w", f.L, f.M, err)
	}
	if err := f.Psi.Check(); err != nil {
		return nil, fmt.Errorf("totals: mode (%d,%d): the field: %w", f.L, f.M, err)
	}
	if !signal.Same(f.Psi, f.Rate) {
		return nil, &signal.Fault{What: fmt.Sprintf("mode (%d,%d): the field and its time derivative are sampled at different times", f.L, f.M)}
	}
	c := flux.Norm(f.L) / (64 * math.Pi)
	if f.M != 0 {
		c *= 2
	}
	n := len(f.Rate.Values)
	out := &Fluxes{make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)}
	cm := c * float64(f.M)
	for k := range n {
		psi, pi := f.Psi.Values[k], f.Rate.Values[k]
		e0, e1 := f.Psi.Bar(k), f.Rate.Bar(k)
		a0, a1 := cmplx.Abs(psi), cmplx.Abs(pi)
		out.Energy[k] = c * a1 * a1
		out.EnergyErr[k] = c * (2*a1*e1 + e1*e1)
		out.AngMom[k] = cm * imag(psi*cmplx.Conj(pi))
		out.AngMomErr[k] = math.Abs(cm) * (a0*e1 + a1*e0 + e0*e1)
	}
	return out, nil
}

// Options of Radiated.
type Options struct {
	// From and To bound the integral, From after the start-up (retarded or
	// advanced time); both zero: everything.
	From, To float64
	// Cut says that the signal was already on at From (an inspiral): the total
	// is then what leaves from From on, with no bar for what left before.
	Cut bool
	// Coarse is the same mode from a coarser run, or nil; Factor times the
	// difference of the totals enters the bars.
	Coarse *Field
	Factor float64
}

// Open says that a flux does not fall off at an end of the interval, so that
// what lies beyond cannot be bounded.
type Open struct {
	L, M int
	What string
	U    float64
}

func (e *Open) Error() string {
	return fmt.Sprintf("totals: mode (%d,%d): the %s flux does not fall off towards %.6g; the interval must reach further", e.L, e.M, e.What, e.U)
}

// Radiated integrates the fluxes of one mode, m and -m together, over the
// interval. The bar adds the bars of the samples (their bound, integrated),
// quadrature, what the fall of the flux leaves beyond both ends, and the
// coarser run's difference.
func Radiated(f Field, o Options) (*result.Flux, error) {
	x, err := Of(f)
	if err != nil {
		return nil, err
	}
	first, last, err := f.Rate.Span(o.From, o.To)
	if err != nil {
		return nil, fmt.Errorf("totals: mode (%d,%d): %w", f.L, f.M, err)
	}
	out := &result.Flux{}
	for _, p := range []struct {
		what string
		v, e []float64
		to   *result.Q
	}{
		{"energy", x.Energy, x.EnergyErr, &out.Energy},
		{"angular momentum", x.AngMom, x.AngMomErr, &out.AngularMomentum},
	} {
		if f.M == 0 && p.to == &out.AngularMomentum {
			continue // none
		}
		v, e := p.v[first:last+1], p.e[first:last+1]
		value, quadrature := signal.Integral(v, f.Rate.Dt)
		bars, _ := signal.Integral(e, f.Rate.Dt)
		p.to.Value, p.to.Error = value, quadrature+math.Abs(bars)
		top := largest(v)
		rest, ok := signal.Rest(v, e, f.Rate.Dt, (len(v)-top)/6, -float64(top))
		if !ok {
			return nil, &Open{f.L, f.M, p.what, f.Rate.Time(last)}
		}
		p.to.Error += rest
		if o.Cut {
			continue
		}
		rest, ok = signal.Rest(signal.Reverse(v), signal.Reverse(e), f.Rate.Dt, top/6, float64(top-len(v)))
		if !ok {
			return nil, &Open{f.L, f.M, p.what, f.Rate.Time(first)}
		}
		p.to.Error += rest
	}
	if o.Coarse != nil {
		c := o
		c.Coarse = nil
		other, err := Radiated(*o.Coarse, c)
		if err != nil {
			return nil, fmt.Errorf("totals: the coarser run: %w", err)
		}
		out.Energy.Error += o.Factor * math.Abs(out.Energy.Value-other.Energy.Value)
		out.AngularMomentum.Error += o.Factor * math.Abs(out.AngularMomentum.Value-other.AngularMomentum.Value)
	}
	return out, nil
}

func largest(v []float64) int {
	k := 0
	for i, x := range v {
		if math.Abs(x) > math.Abs(v[k]) {
			k = i
		}
	}
	return k
}
