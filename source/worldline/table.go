package worldline

import (
	"fmt"
	"math"
	"sort"
)

// Samples are the rows of a trajectory. T, R and Phi are required; the others
// are nil where they are not given. PR is the covariant u_r = u^r/f, PPhi the
// covariant u_phi = L.
type Samples struct {
	T, R, Phi      []float64
	PR, PPhi, E, L []float64
}

// Table is a worldline through samples, by splines of degree 9 in time: of
// r-2, or of r_* when the path comes inside r = 3. The velocity is that of the
// spline, and E and L are those of the instantaneous velocity (u^t from the
// norm), unless the table's own are asked for.
//
// A path that ends inside r = 3 moving inwards, or that passes r = handover,
// is continued from there as the geodesic with its last velocity: below that
// the norm of a tabulated velocity loses all digits, and the motion is a
// geodesic to leading order anyway.
type Table struct {
	radial, azimuth *spline
	energy, angular *spline // the table's own, or nil
	inR             bool    // radial is r-2
	own             bool
	turnsPhase      []float64
	end             float64
	plunge          *Infall
	errR, errPhi    float64
	ownDifference   float64
	markers         []Marker
}

// handover is the radius at which a tabulated plunge becomes a geodesic.
const handover = 2.1

const minRows = 20

// NewTable checks the samples and builds the worldline. With own, State carries
// the E and L of the table (columns E and L, or pphi for L and E from pr and
// pphi) instead of those of the instantaneous velocity. The slices are copied.
// Faults come as TableFaults.
func NewTable(in Samples, own bool) (*Table, error) {
	n := len(in.T)
	for _, c := range [][]float64{in.R, in.Phi} {
		if len(c) != n {
			panic("worldline: NewTable: columns of different lengths")
		}
	}
	for _, c := range [][]float64{in.PR, in.PPhi, in.E, in.L} {
		if c != nil && len(c) != n {
			panic("worldline: NewTable: columns of different lengths")
		}
	}
	if faults := checkSamples(&in); len(faults) > 0 {
		return nil, faults
	}
	c := &Table{own: own, inR: true, end: in.T[n-1]}
	for _, r := range in.R {
		if r < 3 {
			c.inR = false
		}
	}
	t := append([]float64(nil), in.T...)
	v := make([]float64, n)
	for i, r := range in.R {
		v[i] = r - 2
		if !c.inR {
			v[i] = r + 2*math.Log((r-2)/2)
		}
	}
	phi := append([]float64(nil), in.Phi...)
	c.radial, c.azimuth = newSpline(t, v), newSpline(t, phi)
	c.turnsPhase = make([]float64, n)
	for i := range phi {
		_, c.turnsPhase[i] = reduce(phi[i], 0)
	}
	if faults := noisy(t, in.R, "r", 1e-5); len(faults) > 0 {
		return nil, faults
	}
	if faults := noisy(t, phi, "phi", 1e-5); len(faults) > 0 {
		return nil, faults
	}
	c.errR, c.errPhi = halved(t, v), halved(t, phi)
	// the ends of physical motion and the speed between rows
	var s State
	for i := range n - 1 {
		x := t[i] + (t[i+1]-t[i])/2
		if !c.state(x, &s) {
			return nil, TableFaults{{i + 2, "r", in.R[i+1], "between the row above and this one the path is faster than light: check t, r and phi here"}}
		}
		if s.R < handover {
			break
		}
	}
	if err := c.owns(&in); err != nil {
		return nil, err
	}
	c.state(t[n-1], &s)
	switch {
	case in.R[n-1] < handover:
		z := c.scan(t[0], func(s *State) float64 { return s.R - handover })
		c.end = z[0]
	case in.R[n-1] < 3 && s.P < 0:
	default:
		c.markers = c.find()
		return c, nil
	}
	if !c.state(c.end, &s) {
		return nil, TableFaults{{n, "r", in.R[n-1], "the path is faster than light at its end: check the last rows"}}
	}
	geo, err := NewInfall(s.R, s.E, s.L, s.Phi)
	if err != nil {
		return nil, fmt.Errorf("the table's last rows do not lead into the horizon: %w", err)
	}
	c.plunge = geo
	c.markers = c.find()
	return c, nil
}

// checkSamples finds the faults that single rows and their neighbours show.
func checkSamples(in *Samples) (faults TableFaults) {
	n := len(in.T)
	add := func(row int, col string, v float64, what string) {
		if len(faults) < 20 {
			faults = append(faults, TableFault{row, col, v, what})
		}
	}
	if n < minRows {
		last := math.NaN()
		if n > 0 {
			last = in.T[n-1]
		}
		add(n, "t", last, fmt.Sprintf("the table ends here: write at least %d rows", minRows))
		return faults
	}
	type column struct {
		name string
		v    []float64
	}
	cols := []column{{"t", in.T}, {"r", in.R}, {"phi", in.Phi}, {"pr", in.PR}, {"pphi", in.PPhi}, {"E", in.E}, {"L", in.L}}
	for i := range n {
		for _, c := range cols {
			if c.v != nil && (math.IsNaN(c.v[i]) || math.IsInf(c.v[i], 0)) {
				add(i+1, c.name, c.v[i], "not a finite number")
			}
		}
		if in.R[i] <= 2 {
			add(i+1, "r", in.R[i], "inside or on the horizon: end the table outside r = 2")
		}
		if i > 0 && in.T[i] <= in.T[i-1] {
			add(i+1, "t", in.T[i], fmt.Sprintf("time must increase strictly; the row above has %v", in.T[i-1]))
		}
	}
	if len(faults) > 0 {
		return faults
	}
	for i := 1; i < n; i++ {
		dt := in.T[i] - in.T[i-1]
		near := math.Inf(-1)
		if i > 1 {
			near = in.T[i-1] - in.T[i-2]
		}
		if i < n-1 {
			near = max(near, in.T[i+1]-in.T[i])
		}
		if dt > 5*near {
			add(i+1, "t", in.T[i], fmt.Sprintf("a gap: %.6g M since the row above where its neighbours are at most %.6g M apart; fill in the missing rows", dt, near))
			continue
		}
		ra, rb := in.R[i-1], in.R[i]
		ds := (rb - ra) + 2*math.Log((rb-2)/(ra-2))
		if math.Abs(ds) > dt*(1+1e-9) {
			add(i+1, "r", rb, fmt.Sprintf("faster than light: r_* changes by %.6g in a time of %.6g since the row above", ds, dt))
			continue
		}
		// no circular speed exceeds sqrt(f)/r <= 1/sqrt(27)
		if d := in.Phi[i] - in.Phi[i-1]; math.Abs(d) > dt/math.Sqrt(27)*(1+1e-9) {
			what := fmt.Sprintf("faster than light: phi changes by %.6g in a time of %.6g since the row above", d, dt)
			if math.Abs(math.Abs(d)-2*math.Pi) < 1 {
				what += "; phi must be counted through all turns, not wrapped"
			}
			add(i+1, "phi", in.Phi[i], what)
		}
	}
	return faults
}

// residuals returns how far each value lies from the polynomial of degree 7
// through its eight nearest neighbours, in units in which independent noise of
// size 1 gives 1 (rms).
func residuals(t, v []float64) []float64 {
	const side = 4
	n := len(t)
	out := make([]float64, n)
	for i := range n {
		a := min(max(0, i-side), n-2*side-1)
		sum, norm := 0.0, 1.0
		for j := a; j <= a+2*side; j++ {
			if j == i {
				continue
			}
			w := 1.0
			for k := a; k <= a+2*side; k++ {
				if k != j && k != i {
					w *= (t[i] - t[k]) / (t[j] - t[k])
				}
			}
			sum += w * (v[j] - v[i])
			norm += w * w
		}
		out[i] = math.Abs(sum) / math.Sqrt(norm)
	}
	return out
}

// noisy names rows that stand out from their neighbours, or the whole column
// when it is rougher than limit.
func noisy(t, v []float64, name string, limit float64) (faults TableFaults) {
	res := residuals(t, v)
	sorted := append([]float64(nil), res...)
	sort.Float64s(sorted)
	median := sorted[len(sorted)/2]
	if median > limit {
		return TableFaults{{1, name, v[0], fmt.Sprintf("the column is not smooth: rows differ from their neighbours by %.2g throughout (noise, too few digits or too wide steps); at most %.2g can be differentiated", median, limit)}}
	}
	const window = 16
	for i := range res {
		if res[i] < 1e-6 {
			continue
		}
		// the largest of a spike's own neighbourhood, against what surrounds it
		a, b := max(0, i-window), min(len(res), i+window+1)
		peak := true
		local := make([]float64, 0, b-a)
		for k := a; k < b; k++ {
			if k >= i-5 && k <= i+5 {
				peak = peak && res[k] <= res[i]
				continue
			}
			local = append(local, res[k])
		}
		sort.Float64s(local)
		if peak && res[i] > 300*local[len(local)*3/4]+1e-12 && len(faults) < 20 {
			faults = append(faults, TableFault{i + 1, name, v[i], fmt.Sprintf("this value departs by about %.2g from the smooth curve through its neighbours: correct or leave out the row", res[i])})
		}
	}
	return faults
}

// halved estimates the interpolation error: a spline through every second row
// is compared with the rows left out, and the difference is carried over to the
// full table by the order of the spline (2^10; at the ends, where the error is largest,
// 2^7 was measured), but not below what noise and rounding of the rows make.
func halved(t, v []float64) float64 {
	var th, vh []float64
	for i := 0; i < len(t); i += 2 {
		th, vh = append(th, t[i]), append(vh, v[i])
	}
	worst := 0.0
	if len(th) >= splineCoef {
		s := newSpline(th, vh)
		for i := 1; i < len(t) && t[i] < th[len(th)-1]; i += 2 {
			k := s.find(t[i])
			inc, _ := s.at(k, t[i])
			worst = max(worst, math.Abs(s.base[k]+inc-v[i]))
		}
	}
	res := residuals(t, v)
	sort.Float64s(res)
	size := 0.0
	for _, x := range v {
		size = max(size, math.Abs(x))
	}
	return max(worst/128, min(worst, 3*res[len(res)/2]), 4e-15*size) // measured: 2.3e-15 on even steps, 3.6e-15 on uneven ones
}

// state fills s from the splines and reports whether the speed is below light.
func (c *Table) state(t float64, s *State) bool {
	i := c.radial.find(t)
	inc, dv := c.radial.at(i, t)
	da, dphi := c.azimuth.at(i, t)
	s.T = t
	s.Phi = c.azimuth.base[i] + da
	s.Phase = c.turnsPhase[i] + da
	w := c.radial.base[i] + inc
	if c.inR {
		if w <= 0 {
			return false
		}
		place(chartY, w, s)
		dv *= s.R / s.Y
	} else {
		place(chartLog, logOfTortoise(w), s)
		s.Rstar = w
	}
	f := s.Y / s.R
	d := (1-dv)*(1+dv) - s.R*s.R*dphi*dphi/f
	if !(d > 0) {
		return false
	}
	s.E = math.Sqrt(f / d)
	s.L = s.R * s.R * dphi * s.E / f
	if c.own && c.energy != nil {
		e, _ := c.energy.at(i, t)
		l, _ := c.angular.at(i, t)
		s.E, s.L = c.energy.base[i]+e, c.angular.base[i]+l
	}
	s.P = s.E * dv
	return true
}

// owns reads the table's own constants, where it has them.
func (c *Table) owns(in *Samples) error {
	n := len(in.T)
	l := in.L
	if l == nil {
		l = in.PPhi
	}
	e := in.E
	var s State
	if e == nil && in.PR != nil && l != nil {
		e = make([]float64, n)
		for i, r := range in.R {
			f := (r - 2) / r
			e[i] = energyOf(r-2, r, f*in.PR[i], l[i])
		}
	}
	if in.PR != nil && l != nil && in.E != nil {
		for i, r := range in.R {
			f := (r - 2) / r
			if norm := energyOf(r-2, r, f*in.PR[i], l[i]); math.Abs(norm-e[i]) > 1e-3 {
				return TableFaults{{i + 1, "E", e[i], fmt.Sprintf("not the energy of the four-velocity given by pr and pphi, %.8g: check the columns (per particle mass, covariant)", norm)}}
			}
		}
	}
	if e == nil || l == nil {
		if c.own {
			return TableFaults{{1, "E", math.NaN(), "the table's own constants are asked for but it has no columns E and L (or pr and pphi)"}}
		}
		return nil
	}
	own := c.own
	c.own = false
	defer func() { c.own = own }()
	for i := range n {
		if in.R[i] < handover || !c.state(in.T[i], &s) {
			break
		}
		c.ownDifference = max(c.ownDifference, math.Abs(s.E-e[i])/s.E, math.Abs(s.L-l[i])/max(math.Abs(s.L), 1))
	}
	c.energy = newSpline(c.radial.t, append([]float64(nil), e...))
	c.angular = newSpline(c.radial.t, append([]float64(nil), l...))
	return nil
}

// scan returns the zeros of v along the tabulated part from t0 on.
func (c *Table) scan(t0 float64, v func(*State) float64) (zeros []float64) {
	var s State
	g := func(t float64) float64 {
		if !c.state(t, &s) {
			return math.NaN()
		}
		return v(&s)
	}
	prev := math.NaN()
	for i, t := range c.radial.t {
		if t < t0 {
			continue
		}
		if t > c.end {
			break
		}
		x := g(t)
		if x == 0 {
			zeros = append(zeros, t)
		} else if !math.IsNaN(prev) && !math.IsNaN(x) && prev != 0 && (prev < 0) != (x < 0) {
			zeros = append(zeros, bracketed(g, c.radial.t[i-1], t, prev, x))
		}
		prev = x
	}
	return zeros
}

func (c *Table) find() (list []Marker) {
	var s State
	add := func(name string, times []float64) {
		for _, t := range times {
			c.At(t, &s)
			list = append(list, Marker{name, t, s.R})
		}
	}
	t0 := c.radial.t[0]
	last := func(z []float64) []float64 { return z[max(0, len(z)-1):] }
	add(MarkISCO, last(c.scan(t0, func(s *State) float64 { return s.R - 6 })))
	ring := last(c.scan(t0, func(s *State) float64 { return s.R - 3 }))
	add(MarkLightRing, ring)
	if len(ring) > 0 {
		// peak of Omega: zero of its slope near the light ring
		omega := func(t float64) float64 {
			k := c.azimuth.find(t)
			_, d := c.azimuth.at(k, t)
			return d
		}
		a, b := max(t0, ring[0]-5), min(c.end, ring[0]+5)
		const h = 1e-2
		slope := func(t float64) float64 {
			return 8*(omega(t+h)-omega(t-h)) - (omega(t+2*h) - omega(t-2*h))
		}
		if a, b = a+2*h, b-2*h; a < b {
			if ga, gb := slope(a), slope(b); (ga < 0) != (gb < 0) {
				add(MarkPeakOmega, []float64{bracketed(slope, a, b, ga, gb)})
			}
		}
	}
	if c.plunge != nil {
		for _, m := range c.plunge.markers {
			list = append(list, Marker{m.Name, m.T + c.end, m.R})
		}
	}
	sort.SliceStable(list, func(i, j int) bool { return list[i].T < list[j].T })
	return list
}

// Kind returns "table".
func (c *Table) Kind() string { return "table" }

// At implements Worldline.
func (c *Table) At(t float64, s *State) {
	if t > c.end && c.plunge != nil {
		c.plunge.At(t-c.end, s)
		s.T = t
		return
	}
	if !(t >= c.radial.t[0] && t <= c.end) {
		panic(fmt.Sprintf("worldline: time %v outside [%v, %v]", t, c.radial.t[0], c.end))
	}
	c.state(t, s)
}

// Span is that of the rows; a plunging table has no end.
func (c *Table) Span() (t0, t1 float64) {
	if c.plunge != nil {
		return c.radial.t[0], math.Inf(1)
	}
	return c.radial.t[0], c.end
}

// Markers implements Worldline.
func (c *Table) Markers() []Marker { return append([]Marker(nil), c.markers...) }

// Numbers implements Worldline.
func (c *Table) Numbers() []Number {
	var a, b State
	c.At(c.radial.t[0], &a)
	c.At(c.end, &b)
	return []Number{
		{"rows", float64(len(c.radial.t))}, {"E", a.E}, {"L", a.L},
		{"E_final", b.E}, {"L_final", b.L}, {"own_difference", c.ownDifference},
	}
}

// Drift returns the largest relative difference between the table's own E and L
// (where it has them) and those of its velocity.
func (c *Table) Drift() float64 { return c.ownDifference }

// Uncertainty implements Worldline: the estimated interpolation errors.
func (c *Table) Uncertainty() (rstar, phi float64) { return c.errR, c.errPhi }
