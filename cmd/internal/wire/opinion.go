package wire

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/configs"
	"nullmark/equations/frequency"
	"nullmark/extract/kerr"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
	"nullmark/source/worldline"
)

// CanAsk says whether a second opinion exists for the case: circular orbits,
// either equation. The error says in a sentence why not.
func CanAsk(c *configs.Case) error {
	if c.Orbit == nil || c.Orbit.Kind != configs.Circular {
		return fmt.Errorf("a second opinion exists for orbit.kind circular only")
	}
	return nil
}

// SecondOpinion solves the case of a finished result once more in the frequency
// domain and stores in res, number by number, what that gives: the energy at both
// ends, summed over l at each m (equation teukolsky) and by mode, and the strain
// by mode.
func SecondOpinion(ctx context.Context, c *configs.Case, res *result.Result, workers int) error {
	if err := CanAsk(c); err != nil {
		return err
	}
	h, err := hyperboloidal.NewKerr(c.Hole.Spin)
	if err != nil {
		return err
	}
	orb, err := worldline.NewKerrBound(h, c.Orbit.Radius, 0, math.Cos(c.Orbit.Inclination*math.Pi/180), 0, c.Orbit.PolarPhase, 0)
	if err != nil {
		return err
	}
	top := map[int]int{}
	var ms []int
	for _, m := range res.Modes {
		if _, seen := top[m.M]; !seen {
			ms = append(ms, m.M)
		}
		top[m.M] = max(top[m.M], m.L)
	}
	parts := make([][]result.SecondOpinion, len(ms))
	err = each(ctx, max(workers, 1), len(ms), func(_ context.Context, i int) error {
		m := ms[i]
		parts[i], err = opinionAt(c, res, h, orb, m, top[m])
		return err
	})
	if err != nil {
		return fmt.Errorf("the second opinion failed: %w", err)
	}
	res.SecondOpinion = nil
	for _, p := range parts {
		for _, o := range p {
			o.Compare()
			res.SecondOpinion = append(res.SecondOpinion, o)
		}
	}
	return nil
}

// opinionLeast is how many l's a sum has at least, opinionMargin how many
// beyond those compared are carried.
const (
	opinionLeast  = 8
	opinionMargin = 6
)

// tilted says whether an orbit leaves the equator.
func tilted(c *configs.Case) bool {
	return c.Orbit.Inclination != 0 && c.Orbit.Inclination != 180
}

// opinionAt is the second opinion at one m: a sum over the tones of the orbit.
func opinionAt(c *configs.Case, res *result.Result, h hyperboloidal.Kerr, orb *worldline.KerrBound, m, top int) ([]result.SecondOpinion, error) {
	n := max(top-lowest(m)+1, opinionLeast) + opinionMargin
	kmax := 0
	if tilted(c) {
		kmax = n + 2
	}
	all, err := frequency.Circular(h, orb, -2, m, n, kmax)
	if err != nil {
		return nil, fmt.Errorf("m = %d: %w", m, err)
	}
	// energies by end and l with their uncertainties
	var e, de [2][]float64
	for k := range e {
		e[k], de[k] = make([]float64, n), make([]float64, n)
	}
	for _, w := range all {
		sp, err := kerr.NewSpheroidal(h, m, n, w.Omega)
		if err != nil {
			return nil, err
		}
		hor := sp.Horizon(w.Horizon)
		var most [2]float64
		for l := range n {
			most[0] = math.Max(most[0], cmplx.Abs(w.Infinity[l]))
			most[1] = math.Max(most[1], math.Sqrt(math.Abs(hor[l].Energy)))
		}
		for l := range n {
			a := cmplx.Abs(w.Infinity[l])
			q := kerr.Infinity(m, w.Omega, w.Infinity[l]).Energy
			e[0][l] += q
			if a > 0 {
				de[0][l] += 2 * q / a * (w.Change[0] + opinionFloor) * most[0]
			}
			e[1][l] += hor[l].Energy
			de[1][l] += 2 * math.Sqrt(math.Abs(hor[l].Energy)) * (w.Change[1] + opinionFloor) * most[1]
		}
	}
	where := [2]string{"energy at infinity", "energy at the horizon"}
	var out []result.SecondOpinion
	for _, p := range res.PerM {
		if p.M != m || c.Waves.Equation != configs.Teukolsky {
			continue
		}
		for k, f := range []*result.Flux{p.Infinity, p.Horizon} {
			if f == nil {
				continue
			}
			s := result.Q{}
			for l := range n {
				s.Value += e[k][l]
				s.Error += de[k][l]
			}
			s.Error += math.Abs(e[k][n-1]) + math.Abs(e[k][n-2]) // where the sum is cut
			factor := 2.0                                        // both signs of m
			if m == 0 {
				factor = 1
			}
			out = append(out, result.SecondOpinion{M: m, What: where[k], Value: f.Energy, Second: result.Q{Value: factor * s.Value, Error: factor * s.Error}})
		}
	}
	for i := range res.Modes {
		q := &res.Modes[i]
		l := q.L - lowest(m)
		if q.M != m || q.L > c.Waves.LMax {
			continue
		}
		factor := signs(res, m)
		for k, f := range []*result.Flux{q.Infinity, q.Horizon} {
			if f != nil {
				out = append(out, result.SecondOpinion{L: q.L, M: m, What: where[k], Value: f.Energy, Second: result.Q{Value: factor * e[k][l], Error: factor * de[k][l]}})
			}
		}
		if q.Strain == nil || len(all) != 1 {
			continue
		}
		s := kerr.Strain(all[0].Omega, all[0].Infinity[l])
		most := 0.0
		for _, z := range all[0].Infinity {
			most = math.Max(most, cmplx.Abs(kerr.Strain(all[0].Omega, z)))
		}
		bar := (all[0].Change[0] + opinionFloor) * most
		out = append(out,
			result.SecondOpinion{L: q.L, M: m, What: "real part of strain", Value: q.Strain.Re, Second: result.Q{Value: real(s), Error: bar}},
			result.SecondOpinion{L: q.L, M: m, What: "imaginary part of strain", Value: q.Strain.Im, Second: result.Q{Value: imag(s), Error: bar}})
	}
	return out, nil
}

// opinionFloor is the round-off of the frequency-domain solver, of its strongest
// amplitude (4e-12 is seen in a flux at m = 4, a = 0.9, r = 6).
const opinionFloor = 5e-12

// signs is 2 where the entries of a result count m and -m together.
func signs(res *result.Result, m int) float64 {
	for i := range res.Modes {
		if res.Modes[i].M == m && res.Modes[i].Counts == bothSigns {
			return 2
		}
	}
	return 1
}
