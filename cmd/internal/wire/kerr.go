package wire

import (
	"context"
	"fmt"
	"math"
	"sort"
	"strings"
	"time"

	"nullmark/configs"
	"nullmark/equations/coupled"
	"nullmark/extract/certify"
	"nullmark/extract/kerr"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
)

// kerrNumerics is every choice of the scheme for the Teukolsky equation.
type kerrNumerics struct {
	domain   coupled.Domain
	coarsest float64 // spacing of rung 0, M
	rungs    int     // how many a bar is made from
	maxRung  int
	fixed    bool // no climbing
	angular  int  // > 0: l's carried on the finest rung
	until    float64
	order    int
	courant  float64
	cells    float64
	moments  int
	plunge   bool // the worldline goes through the horizon
}

// kerrCoarsest is the largest spacing of a rung: beyond 0.6 the horizon's end of
// the grid is stiff at large m.
const kerrCoarsest = 0.5

// chooseKerr gives the numerics of an orbit between rmin and rmax: a ladder whose
// finest first rung has the given spacing, overridden by what the case file says.
func chooseKerr(c *configs.Case, h hyperboloidal.Kerr, rmin, rmax, finest float64) kerrNumerics {
	n := kerrNumerics{rungs: 3, order: 12, courant: 1.2, cells: 2, moments: 16}
	m := c.Numerics
	if m.Rungs != nil {
		n.rungs = *m.Rungs
	}
	if m.Order != nil {
		n.order = *m.Order
	}
	if m.Courant != nil {
		n.courant = *m.Courant
	}
	if m.KernelMoments != nil {
		n.moments = *m.KernelMoments
	}
	if m.KernelWidth != nil {
		n.cells = *m.KernelWidth
	}
	if m.Angular != nil {
		n.angular = *m.Angular
	}
	if c.Span.Until != nil {
		n.until = *c.Span.Until
	}
	up := math.Pow(certify.Ratio, float64(n.rungs-1))
	n.coarsest = math.Min(finest/up, kerrCoarsest)
	n.maxRung = n.rungs + 4
	n.domain = coupled.Bound(h, rmin, rmax, n.coarsest)
	if m.Layer != nil {
		l := &n.domain.Layers
		l.Si = l.Ri - *m.Layer*(l.Ri-l.Si)/(l.So-l.Ro)
		l.So = l.Ro + *m.Layer
	}
	if m.Points != nil {
		n.fixed = true
		n.coarsest = (n.domain.Layers.So - n.domain.Layers.Si) / float64(*m.Points-1) / up
	}
	if n.until > 0 {
		n.until += n.domain.Layers.So
	}
	return n
}

// stiffest bounds dt |m| Omega_H: the horizon turns, in the frame of the grid,
// with m times its frequency on top of what the spacing brings (measured: stable
// at 0.94, not at 1.13).
const stiffest = 0.75

// rung returns rung k of azimuthal number m with so many l's.
func (n *kerrNumerics) rung(k, m, angular int) coupled.Rung {
	dx := n.coarsest * math.Pow(certify.Ratio, float64(k))
	make := n.domain.Rung
	if n.plunge {
		make = n.domain.Plunge
	}
	r := make(dx*(1+1e-12), angular)
	r.Order, r.Moments = n.order, n.moments
	r.Kernel = n.cells * r.Dx()
	r.Dt = n.courant * r.Dx()
	if w := math.Abs(float64(m) * r.Layers.Hole.HorizonFrequency()); r.Dt*w > stiffest {
		r.Dt = stiffest / w
	}
	return r
}

// kerrClimb books what the rungs of a case cost; one m is one unit of work.
type kerrClimb struct {
	n     kerrNumerics
	o     Options
	hole  hyperboloidal.Kerr
	meter *meter
	asked float64
	floor float64
	rungs map[int]*result.Rung
	ms    map[int]map[int]bool
}

func newKerrClimb(c *configs.Case, o Options, h hyperboloidal.Kerr) *kerrClimb {
	return &kerrClimb{o: o, hole: h, meter: &meter{tell: o.Progress}, asked: c.Accuracy.Relative, floor: c.Accuracy.Floor,
		rungs: map[int]*result.Rung{}, ms: map[int]map[int]bool{}}
}

// evolve carries one evolution (start makes it) to until, and further while more
// says so, or takes it from the checkpoint.
func (r *kerrClimb) evolve(ctx context.Context, key string, m, k int, g coupled.Rung, until float64, start func() (*coupled.Run, error), more func([]certify.Samples, float64) float64) (*blockRun, error) {
	work := func(t float64) float64 { return t / g.Dt * float64(g.Points*g.Angular) }
	r.meter.expect(work(until))
	b, err := kept(r.o.Keep, key, func() (*blockRun, error) {
		begin := time.Now()
		run, err := start()
		if err != nil {
			return nil, err
		}
		samples := func() []certify.Samples { return kerrSamples(&run.Fields) }
		for gone := 0.0; ; {
			for gone < until {
				next := math.Min(until, gone+256*g.Dt)
				if err := run.Until(ctx, next); err != nil {
					return nil, err
				}
				r.meter.did(work(next - gone))
				gone = next
			}
			if more == nil {
				break
			}
			next := more(samples(), until)
			if next <= until {
				break
			}
			r.meter.expect(work(next - until))
			until = next
		}
		return &blockRun{Samples: samples(), Until: until, Points: g.Points, Dx: g.Dx(), Dt: g.Dt, Seconds: time.Since(begin).Seconds()}, nil
	})
	if err == nil {
		r.log(m, k, g, b)
	}
	return b, err
}

func kerrSamples(f *coupled.Fields) []certify.Samples {
	out := make([]certify.Samples, len(f.Phi[0]))
	for l := range out {
		out[l].Dt = f.Dt
		for e := range out[l].Psi {
			out[l].Psi[e], out[l].Pi[e] = f.Phi[e][l], f.Pi[e][l]
		}
	}
	return out
}

// log books a run under its rung.
func (r *kerrClimb) log(m, k int, g coupled.Rung, b *blockRun) {
	r.meter.mu.Lock()
	defer r.meter.mu.Unlock()
	e := r.rungs[k]
	if e == nil {
		e = &result.Rung{Points: b.Points, Dx: b.Dx, Dt: b.Dt, Kernel: g.Kernel, Moments: g.Moments, Order: g.Order}
		r.rungs[k], r.ms[k] = e, map[int]bool{}
	}
	e.Angular = max(e.Angular, g.Angular)
	e.Dt = math.Max(e.Dt, b.Dt)
	e.Until = math.Max(e.Until, b.Until)
	e.CoreSeconds += b.Seconds
	r.ms[k][m] = true
}

// rungList writes the rungs that were run into the result, coarsest first, and
// returns their places in it.
func (r *kerrClimb) rungList(res *result.Result) map[int]int {
	index := map[int]int{}
	var ks []int
	for k := range r.rungs {
		ks = append(ks, k)
	}
	sort.Ints(ks)
	for i, k := range ks {
		index[k] = i
		g := *r.rungs[k]
		var ms []int
		for m := range r.ms[k] {
			ms = append(ms, m)
		}
		sort.Ints(ms)
		var names []string
		for _, m := range ms {
			names = append(names, fmt.Sprint(m))
		}
		g.Modes = "m = " + strings.Join(names, ", ")
		res.Rungs = append(res.Rungs, g)
	}
	return index
}

// kerrMs collects the m's of a case (m > 0 or both signs) in ascending order, each
// with the largest l that the case names at it.
func kerrMs(c *configs.Case, signs bool) (ms []int, top map[int]int) {
	top = map[int]int{}
	for _, lm := range c.ModeList() {
		top[lm[1]] = max(top[lm[1]], lm[0])
		if signs && lm[1] > 0 {
			top[-lm[1]] = max(top[-lm[1]], lm[0])
		}
	}
	for m := range top {
		ms = append(ms, m)
	}
	sort.Ints(ms)
	return ms, top
}

// listed says whether the case names a mode by itself.
func listed(c *configs.Case, l, m int) bool {
	if m < 0 {
		m = -m
	}
	if len(c.Waves.Modes) == 0 {
		return true
	}
	for _, lm := range c.Waves.Modes {
		if lm[0] == l && (lm[1] == m || lm[1] == -m) {
			return true
		}
	}
	return false
}

// lowest is the smallest l at m.
func lowest(m int) int { return max(2, m, -m) }

// mostAngular bounds the l's that are carried at one m.
const mostAngular = 30

// ending returns how many of the l's whose parts are given (and beyond them, by
// the fall of the last ones) a sum wants until its last two parts together are
// below asked times the whole.
func ending(parts []float64, asked float64) int {
	sum := 0.0
	for _, p := range parts {
		sum += math.Abs(p)
	}
	n := len(parts)
	for k := 2; k <= n; k++ {
		if math.Abs(parts[k-1])+math.Abs(parts[k-2]) <= asked*sum {
			return k
		}
	}
	if n < 3 || parts[n-3] == 0 {
		return n
	}
	q := math.Sqrt(math.Abs(parts[n-1] / parts[n-3]))
	if !(q < 0.9) {
		return mostAngular
	}
	last := math.Max(math.Abs(parts[n-1]), math.Abs(parts[n-2])) * (1 + q)
	return min(n+int(math.Ceil(math.Log(last/(asked*sum))/-math.Log(q))), mostAngular)
}

// kerrOrder is the order that the bars of kerr.Certify assume.
const kerrOrder = 12

// kerrFlux is a rate with the relative bar of its energy, linearised, as the
// result has it.
func kerrFlux(r kerr.Rate, relative float64) *result.Flux {
	// (1+x)^2 - 1 with 2x = relative
	bar := relative * (1 + relative/4)
	return &result.Flux{
		Energy:          result.Q{Value: r.Energy, Error: math.Abs(r.Energy) * bar},
		AngularMomentum: result.Q{Value: r.AngularMomentum, Error: math.Abs(r.AngularMomentum) * bar},
	}
}
