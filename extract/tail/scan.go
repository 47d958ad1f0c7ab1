package tail

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"

	"nullmark/extract/result"
)

// The scan: window starts and ends are spaced by a factor, and fits
// take up one correction after the other.
const (
	startRatio = 1.10
	endRatio   = 1.15
	maxTerms   = 4
	families   = 2
	keepBest   = 15
)

// The bar adds up how far the steadiest fit moves, the third quartile of the
// distances of the fits kept, the step to another number of terms and that to
// the other form. The shares are measured: they make the bars of the seeded
// population and of evolved pulses cover.
const (
	movedShare   = 5
	scatterShare = 2
	termsShare   = 2
	formShare    = 2
)

// bin is the mean over a short stretch of ln u.
type bin struct {
	u    float64
	y, z float64                         // mean ln|psi| of the run and of the second run
	row  [families][maxTerms + 2]float64 // means of 1, ln u and the corrections, u in units of scale
}

// bins averages ln|psi| and the functions it is fitted by over stretches of
// binWidth in ln u, so that a fit of the means is a fit of the samples.
func bins(s Series, begin, end float64) []bin {
	scale := begin
	var out []bin
	for k := s.index(begin); k <= s.index(end); {
		var b bin
		count := 0.0
		stop := s.time(k) * math.Exp(binWidth)
		for ; k <= s.index(end) && (count == 0 || s.time(k) < stop); k++ {
			u := s.time(k)
			b.u += u
			b.y += math.Log(math.Abs(s.Values[k]))
			if s.Other != nil {
				b.z += math.Log(math.Abs(s.Other[k]))
			}
			for f := range b.row {
				b.row[f][0]++
				b.row[f][1] += math.Log(u / scale)
				for j, v := range corrections(f, scale/u, math.Log(u/scale)) {
					b.row[f][2+j] += v
				}
			}
			count++
		}
		b.u /= count
		b.y /= count
		b.z /= count
		for f := range b.row {
			for j := range b.row[f] {
				b.row[f][j] /= count
			}
		}
		out = append(out, b)
	}
	return out
}

// corrections are the functions of x = 1/u by which ln|psi| departs from a power
// law, in the order in which the fits of a family take them up. At a fixed radius
// and on the horizon the tail is a series in 1/u whose logarithms come late (M.
// Casals & A. Ottewill, Phys. Rev. D 92, 124055 (2015), from memory); at null
// infinity evolutions show one in the first correction. Both are tried.
func corrections(family int, x, log float64) [maxTerms]float64 {
	if family == 0 {
		return [maxTerms]float64{x, x * x, x * x * x, x * x * x * x}
	}
	return [maxTerms]float64{x, x * log, x * x, x * x * log}
}

// trial is one fit.
type trial struct {
	ok       bool
	p        float64
	own      float64 // what the fit itself says: noise, difference to the second run
	moved    float64
	from, to float64
	family   int
	terms    int
}

// fit solves ln|psi| = c - p ln u + sum_{j<terms} a_j g_j(u), g the corrections,
// by QR. It is the integral of p(u) = p + a_0/u + 2 a_1/u^2 + ...
func fit(b []bin, family, terms int, second bool) trial {
	n, m := len(b), terms+2
	a := mat.NewDense(n, m, nil)
	cols := 1
	if second {
		cols = 2
	}
	rhs := mat.NewDense(n, cols, nil)
	for i := range b {
		for j := range m {
			a.Set(i, j, b[i].row[family][j])
		}
		rhs.Set(i, 0, b[i].y)
		if second {
			rhs.Set(i, 1, b[i].z)
		}
	}
	var qr mat.QR
	qr.Factorize(a)
	var x mat.Dense
	if err := qr.SolveTo(&x, false, rhs); err != nil {
		if c, ill := err.(mat.Condition); !ill || math.IsInf(float64(c), 0) {
			return trial{}
		}
	}
	t := trial{ok: true, p: -x.At(1, 0), from: b[0].u, to: b[n-1].u, family: family, terms: terms}
	if math.IsNaN(t.p) {
		return trial{}
	}
	rss := 0.0
	for i := range n {
		r := b[i].y
		for j := range m {
			r -= b[i].row[family][j] * x.At(j, 0)
		}
		rss += r * r
	}
	// Variance of p: s^2 |R^-T e|^2, e the unit vector of the ln u column.
	var r mat.Dense
	qr.RTo(&r)
	v := make([]float64, m)
	for i := range m {
		sum := 0.0
		if i == 1 {
			sum = 1
		}
		for j := range i {
			sum -= r.At(j, i) * v[j]
		}
		v[i] = sum / r.At(i, i)
	}
	norm := 0.0
	for _, q := range v {
		norm += q * q
	}
	t.own = math.Sqrt(rss / float64(n-m) * norm)
	if second {
		t.own = math.Max(t.own, math.Abs(x.At(1, 0)-x.At(1, 1)))
	}
	return t
}

// scan fits every window and number of terms, and reads the exponent off where
// it moves least under one step of each. It reports false where no fit has the
// neighbours to tell.
func scan(s Series, f *Fit, regular bool) bool {
	b := bins(s, f.Begin, f.End)
	second := s.Other != nil
	if second {
		for k := s.index(f.Begin); k <= s.index(f.End); k++ {
			if s.Other[k] == 0 {
				second = false
			}
		}
	}
	at := func(u float64) int { return sort.Search(len(b), func(i int) bool { return b[i].u >= u*(1-1e-12) }) }
	var starts, ends []int
	for u := f.Begin; u*minRatio <= f.End; u *= startRatio {
		starts = append(starts, at(u))
	}
	for u := f.End; u >= minRatio*f.Begin; u /= endRatio {
		i := at(u)
		ends = append(ends, min(i, len(b)-1))
	}
	var all []trial
	tried := families
	if regular {
		tried = 1
	}
	for family := range tried {
		all = append(all, cells(b, family, starts, ends, second)...)
	}
	if len(all) == 0 {
		return false
	}
	sort.SliceStable(all, func(i, j int) bool { return all[i].moved < all[j].moved })
	kept := all[:min(len(all), 5)]
	for len(kept) < min(len(all), keepBest) && all[len(kept)].moved <= 3*all[0].moved {
		kept = all[:len(kept)+1]
	}
	p := make([]float64, len(kept))
	for i, t := range kept {
		p[i] = t.p
	}
	sort.Float64s(p)
	value := p[len(p)/2]
	d := make([]float64, len(p))
	for i := range p {
		d[i] = math.Abs(p[i] - value)
	}
	sort.Float64s(d)
	best := all[0]
	spread := math.Max(best.moved, d[len(d)*3/4])
	// The steadiest fit with another number of terms, and that of the other
	// family, show what the form of the fit itself does.
	terms, form := 0.0, 0.0
	for _, t := range all {
		if terms == 0 && t.family == best.family && t.terms != best.terms {
			terms = math.Abs(t.p - best.p)
		}
		if form == 0 && t.family != best.family {
			form = math.Abs(t.p - value)
		}
	}
	f.Exponent = result.Q{Value: value, Error: movedShare*best.moved + scatterShare*d[len(d)*3/4] + termsShare*math.Min(terms, 5*spread) + formShare*form}
	f.From, f.To, f.Terms, f.Fits = best.from, best.to, best.terms, len(kept)
	return true
}

// cells fits every window and number of terms of one family and returns those
// that have neighbours to tell how far the exponent moves.
func cells(b []bin, family int, starts, ends []int, second bool) []trial {
	grid := make([][][]trial, len(starts))
	for i, from := range starts {
		grid[i] = make([][]trial, len(ends))
		for j, to := range ends {
			grid[i][j] = make([]trial, maxTerms+1)
			if to-from+1 < minBins || b[to].u < minRatio*b[from].u*(1-1e-9) {
				continue
			}
			for k := 1; k <= maxTerms; k++ {
				if to-from+1 >= 3*(k+2) {
					grid[i][j][k] = fit(b[from:to+1], family, k, second)
				}
			}
		}
	}
	var all []trial
	for i := range grid {
		for j := range grid[i] {
			for k, t := range grid[i][j] {
				if !t.ok {
					continue
				}
				starts, ends := 0, 0
				more := false
				for _, d := range neighbours() {
					p, q, r := i+d[0], j+d[1], k+d[2]
					if p < 0 || p >= len(grid) || q < 0 || q >= len(grid[i]) || r > maxTerms || !grid[p][q][r].ok {
						continue
					}
					n := grid[p][q][r]
					t.moved = math.Max(t.moved, math.Abs(n.p-t.p))
					switch {
					case d[0] != 0:
						starts++
					case d[1] != 0:
						ends++
					default:
						more = true
					}
				}
				if starts == 0 || ends == 0 || !more {
					continue
				}
				t.moved = math.Max(t.moved, t.own)
				all = append(all, t)
			}
		}
	}
	return all
}

// neighbours are the fits to which one is compared: one and two steps in the
// window's start and end, one more term.
func neighbours() [][3]int {
	return [][3]int{{-2, 0, 0}, {-1, 0, 0}, {1, 0, 0}, {2, 0, 0}, {0, -2, 0}, {0, -1, 0}, {0, 1, 0}, {0, 2, 0}, {0, 0, 1}}
}
