package wire

import (
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"sort"

	"nullmark/configs"
	"nullmark/extract/table"
	"nullmark/source/worldline"
)

// tablePath is a tabulated worldline whose time counts from its first row: the
// table's own time is this one plus origin. Markers and numbers say in addition
// where it turns and how it goes round.
type tablePath struct {
	*worldline.Table
	origin   float64
	last     float64 // time of the last row
	samples  worldline.Samples
	peri     []float64 // times of the periastra between the ends
	apo      []float64
	rmin     float64
	rmax     float64
	warnings []string
}

// tableFaults are what is wrong with a table, one sentence each.
type tableFaults []string

func (f tableFaults) Error() string { return "orbit.file: " + f[0] }

// tooShort says that a bound path is too short to average.
type tooShort struct {
	what       string // "radial" or "azimuthal"
	have, need float64
	untilKey   bool // span.until is what ends it
}

func (e *tooShort) Error() string {
	return fmt.Sprintf("a run with at least two %s periods after its start-up to average over, and this one has %.2g of them: go on for %.0f M more, at least", e.what, e.have, math.Ceil(e.need))
}

// newTablePath reads and checks the trajectory of a case.
func newTablePath(o *configs.Orbit) (*tablePath, error) {
	f, err := table.Open(o.File)
	if err != nil {
		return nil, tableFaults{sentence(err)}
	}
	defer f.Close()
	tr, err := table.ReadTrajectory(f, table.TrajectoryNames{
		T: o.Columns.T, R: o.Columns.R, Phi: o.Columns.Phi, Theta: o.Columns.Theta,
		PR: o.Columns.PR, PPhi: o.Columns.PPhi, E: o.Columns.E, L: o.Columns.L,
	})
	if err != nil {
		return nil, tableFaults{sentence(err)}
	}
	for i, th := range tr.Theta {
		if math.Abs(th-math.Pi/2) > 1e-9 {
			return nil, tableFaults{fmt.Sprintf("row %d, theta = %v: not in the equatorial plane theta = pi/2, to which tables are confined on this hole: turn the coordinates so that the motion lies in it", i+1, th)}
		}
	}
	p := &tablePath{origin: tr.T[0], warnings: f.Notes()}
	times := make([]float64, len(tr.T))
	for i, t := range tr.T {
		times[i] = t - p.origin
	}
	p.last = times[len(times)-1]
	p.samples = worldline.Samples{T: times, R: tr.R, Phi: tr.Phi, PR: tr.PR, PPhi: tr.PPhi, E: tr.Energy, L: tr.AngularMomentum}
	if p.Table, err = worldline.NewTable(p.samples, false); err != nil {
		return nil, p.faults(err, tr.T)
	}
	p.rmin, p.rmax = math.Inf(1), 0
	for _, r := range tr.R {
		p.rmin, p.rmax = math.Min(p.rmin, r), math.Max(p.rmax, r)
	}
	dr, _ := p.Uncertainty()
	p.turn(math.Max(1e-9*p.rmin, 30*dr))
	return p, nil
}

// sentence is what a file's fault says, without the directory, which the case
// file's fault shows already, and with rows counted from 1 like everywhere here.
func sentence(err error) string {
	var f *table.Fault
	if !errors.As(err, &f) {
		return err.Error()
	}
	short := *f
	short.File = filepath.Base(f.File)
	if short.Row >= 0 {
		short.Row++
	}
	return short.Error()
}

// faults turns what the worldline says into sentences, with the table's own times.
func (p *tablePath) faults(err error, times []float64) error {
	var list worldline.TableFaults
	if !errors.As(err, &list) {
		return tableFaults{err.Error()}
	}
	var out tableFaults
	for _, f := range list {
		if f.Column == "t" && f.Row >= 1 && f.Row <= len(times) {
			f.Value = times[f.Row-1]
		}
		out = append(out, f.Error())
	}
	return out
}

// turn finds the turning points of r that stand out from their surroundings by
// more than least.
func (p *tablePath) turn(least float64) {
	r, t := p.samples.R, p.samples.T
	lo, hi := 0, 0 // lowest and highest row since the last turning point
	way := 0       // +1 outwards, -1 inwards, 0 not known yet
	for i := range r {
		if r[i] < r[lo] {
			lo = i
		}
		if r[i] > r[hi] {
			hi = i
		}
		switch {
		case way >= 0 && r[hi]-r[i] > least:
			if way > 0 || hi > 0 {
				p.apo = append(p.apo, p.rest(t, hi))
			}
			way, lo = -1, i
		case way <= 0 && r[i]-r[lo] > least:
			if way < 0 || lo > 0 {
				p.peri = append(p.peri, p.rest(t, lo))
			}
			way, hi = 1, i
		}
	}
}

// rest is the time near row i at which the radial velocity vanishes.
func (p *tablePath) rest(t []float64, i int) float64 {
	a, b := t[max(i-1, 0)], t[min(i+1, len(t)-1)]
	_, end := p.Table.Span()
	b = math.Min(b, end)
	var s worldline.State
	at := func(x float64) float64 {
		p.At(x, &s)
		return s.P
	}
	pa, pb := at(a), at(b)
	if (pa < 0) == (pb < 0) {
		return t[i]
	}
	for range 60 {
		c := a + (b-a)/2
		if v := at(c); (v < 0) == (pa < 0) {
			a = c
		} else {
			b = c
		}
	}
	return a + (b-a)/2
}

// Markers implements worldline.Worldline: those of the table and its turning
// points.
func (p *tablePath) Markers() []worldline.Marker {
	list := p.Table.Markers()
	var s worldline.State
	for _, x := range []struct {
		name  string
		times []float64
	}{{worldline.MarkPeriastron, p.peri}, {worldline.MarkApastron, p.apo}} {
		for _, t := range x.times {
			p.At(t, &s)
			list = append(list, worldline.Marker{Name: x.name, T: t, R: s.R})
		}
	}
	sort.SliceStable(list, func(i, j int) bool { return list[i].T < list[j].T })
	return list
}

// Numbers implements worldline.Worldline.
func (p *tablePath) Numbers() []worldline.Number {
	dr, dphi := p.Uncertainty()
	list := append(p.Table.Numbers(),
		worldline.Number{Name: "first_time", Value: p.origin}, worldline.Number{Name: "last_time", Value: p.origin + p.last},
		worldline.Number{Name: "r_min", Value: p.rmin}, worldline.Number{Name: "r_max", Value: p.rmax},
		worldline.Number{Name: "interpolation_error_r", Value: dr}, worldline.Number{Name: "interpolation_error_phi", Value: dphi},
	)
	out := list[:0]
	for _, n := range list {
		if n.Name != "own_difference" || p.hasOwn() {
			out = append(out, n)
		}
	}
	return out
}

// hasOwn says whether the table brings energy and angular momentum of its own.
func (p *tablePath) hasOwn() bool {
	s := p.samples
	return (s.L != nil || s.PPhi != nil) && (s.E != nil || s.PR != nil)
}

// plunges says whether the path ends in the hole.
func (p *tablePath) plunges() bool {
	_, end := p.Table.Span()
	return math.IsInf(end, 1)
}

// passes says whether the path comes by once: it is unbound at an end, or it has
// one periastron and leaves it at both ends.
func (p *tablePath) passes() bool {
	var a, b worldline.State
	p.At(0, &a)
	p.At(p.last, &b)
	if math.Max(a.E, b.E) >= 1 {
		return true
	}
	return len(p.peri) == 1 && len(p.apo) == 0 && math.Min(a.R, b.R) > 1.3*p.rmin
}

// transient says whether a table is measured by totals.
func (p *tablePath) transient() bool { return p.plunges() || p.passes() }

// cycle is what a bound path is averaged over.
type cycle struct {
	radial  bool
	period  float64
	advance float64 // mean orbital frequency
	note    string
}

// cycle looks at the end of the path, before the time to: over the last whole
// radial periods, or over whole turns where the radius does not come back
// regularly.
func (p *tablePath) cycle(to float64, most int) cycle {
	var a, b worldline.State
	frequency := func(from, to float64) float64 {
		p.At(from, &a)
		p.At(to, &b)
		return math.Abs(b.Phi-a.Phi) / (to - from)
	}
	turns := p.peri
	if len(p.apo) > len(turns) {
		turns = p.apo
	}
	for len(turns) > 0 && turns[len(turns)-1] > to {
		turns = turns[:len(turns)-1]
	}
	if n := len(turns); n >= 2 {
		k := min(n-1, most)
		mean := (turns[n-1] - turns[n-1-k]) / float64(k)
		even := true
		for i := n - k; i < n; i++ {
			even = even && math.Abs(turns[i]-turns[i-1]-mean) < 0.2*mean
		}
		if even {
			return cycle{radial: true, period: mean, advance: frequency(turns[n-1-k], turns[n-1])}
		}
		return p.round(to, most, "the radial motion is not regular: fluxes are averaged over whole turns")
	}
	if len(p.peri)+len(p.apo) > 0 {
		// Too little to see a period: the geodesic that touches the path at
		// its mean radius gives the size of one.
		r := (p.rmin + p.rmax) / 2
		w := math.Pow(r, -1.5) * math.Sqrt(math.Max(1-6/r, 0.02))
		return cycle{radial: true, period: 2 * math.Pi / w, advance: frequency(0, to)}
	}
	return p.round(to, most, "")
}

// round is a cycle of whole turns in azimuth.
func (p *tablePath) round(to float64, most int, note string) cycle {
	var a, b worldline.State
	p.At(to, &b)
	back := func(t float64) float64 {
		p.At(t, &a)
		return math.Abs(b.Phi-a.Phi) / (2 * math.Pi)
	}
	k := float64(most)
	if all := back(0); all < k {
		return cycle{period: to / math.Max(all, 1e-9), advance: 2 * math.Pi * all / to, note: note}
	}
	lo, hi := 0.0, to // back(lo) >= k > back(hi)
	for range 60 {
		c := lo + (hi-lo)/2
		if back(c) >= k {
			lo = c
		} else {
			hi = c
		}
	}
	return cycle{period: (to - lo) / k, advance: 2 * math.Pi * k / (to - lo), note: note}
}

// checkTable passes on what is wrong with a table.
func checkTable(c *configs.Case) []configs.Problem {
	if c.Orbit == nil || c.Orbit.Kind != configs.Table || c.Hole.Spin != 0 {
		return nil
	}
	p, err := newTablePath(c.Orbit)
	var list []configs.Problem
	var faults tableFaults
	if errors.As(err, &faults) {
		for _, f := range faults {
			list = append(list, configs.Problem{Key: "orbit.file", Value: c.Orbit.File, Want: "a trajectory that can be followed; " + f})
		}
		return list
	}
	if err != nil {
		return []configs.Problem{{Key: "orbit.file", Value: c.Orbit.File, Want: "a trajectory that can be followed; " + err.Error()}}
	}
	if p.transient() {
		return p.room(c)
	}
	n := choose(c)
	_, err = p.plan(&n, c)
	var short *tooShort
	var beyond *tooLong
	switch {
	case errors.As(err, &short) && short.untilKey:
		return []configs.Problem{{Key: "span.until", Value: *c.Span.Until, Want: "the end of " + short.Error()}}
	case errors.As(err, &short):
		return []configs.Problem{{Key: "orbit.file", Value: c.Orbit.File, Want: short.Error()}}
	case errors.As(err, &beyond):
		return []configs.Problem{{Key: "span.until", Value: *c.Span.Until, Want: beyond.Error()}}
	}
	return nil
}

// notes are the warnings that belong to a table measured by totals.
func (p *tablePath) notes() []string {
	w := append([]string{}, p.warnings...)
	if !p.plunges() {
		w = append(w, fmt.Sprintf("the table holds a single passage: the totals are those between its first and its last row (r = %.6g and %.6g)", p.samples.R[0], p.samples.R[len(p.samples.R)-1]))
	}
	return w
}

// room refuses a plunge or passage that leaves no time for the start-up before
// it, or none after it.
func (p *tablePath) room(c *configs.Case) []configs.Problem {
	const before = 60
	r, err := newBurstRun(c, choose(c), Options{})
	if err != nil {
		return nil
	}
	what := "its closest approach"
	if p.plunges() {
		what = "its plunge"
	}
	if r.event < before {
		return []configs.Problem{{Key: "orbit.file", Value: c.Orbit.File,
			Want: fmt.Sprintf("a trajectory that begins at least %d M before %s, and this one begins %.4g M before it: begin earlier", before, what, r.event)}}
	}
	var s worldline.State
	p.At(math.Min(r.event, p.last), &s)
	last := r.n.domain.Retarded(r.ends)
	if least := r.event - math.Max(s.Rstar, 0) + afterEvent; last < least {
		if r.n.until > 0 && last < r.n.domain.Retarded(lastSlice(p, &r.n, p.last))-1 {
			return []configs.Problem{{Key: "span.until", Value: *c.Span.Until, Want: fmt.Sprintf("at least %g on this orbit: %s and what follows", math.Ceil(least+p.origin), what)}}
		}
		return []configs.Problem{{Key: "orbit.file", Value: c.Orbit.File,
			Want: fmt.Sprintf("a trajectory that goes on for at least %.0f M more after %s", math.Ceil(least-last), what)}}
	}
	return nil
}
