package wire

import (
	"context"
	"fmt"
	"math"
	"sort"

	"nullmark/equations/semi"
	"nullmark/extract/certify"
	"nullmark/extract/result"
	"nullmark/grid"
	"nullmark/source"
	"nullmark/source/worldline"
)

// ladder is the state of one mode on its way up the rungs.
type ladder struct {
	blockMode
	rung   int // finest rung asked for
	until  float64
	allow  [2]float64               // relative flux bar that counts as met, by end
	runs   map[int]*certify.Samples // by rung
	points map[int]int
	met    bool
	why    string
	done   bool

	circ *circularMode // of a circular orbit
	mov  *movingMode   // of any other
}

func newLadder(l, m int) *ladder {
	return &ladder{
		blockMode: blockMode{l: l, m: m, parity: source.NewMasterSource(l, m).Parity},
		runs:      map[int]*certify.Samples{}, points: map[int]int{},
	}
}

// kind is what the climb wants to know of a kind of orbit.
type kind interface {
	// force makes the forcing of a block on one rung.
	force(modes []*ladder) func(g grid.Grid, k source.Kernel, dt float64) semi.Forcing
	// firstUntil is where the search for a quiet end of the run begins,
	// lastUntil where it is given up, stride how far a try goes on.
	firstUntil(m *ladder) float64
	lastUntil(m *ladder) float64
	stride(m *ladder) float64
	// quiet says whether what the start-up left is small enough at until.
	quiet(s *certify.Samples, m *ladder, until float64, points int) bool
	// certify sets the bars of a mode from its runs, m.met and m.why, and says
	// whether a finer rung would help.
	certify(m *ladder) (climb bool, err error)
}

// climb is a whole case under way: rounds in which pending modes run on their
// wanted rung with the coarser ones that the bars need.
type climb struct {
	kind
	n       numerics
	o       Options
	meter   *meter
	origin  float64             // coordinate time of the slice 0: worldlines here count from it, results do not
	half    worldline.Worldline // through every second row of a table, or nil
	halved  float64             // what the error of a table is of that one's
	modes   []*ladder
	rungs   map[int]*result.Rung
	members map[int]map[string]bool
	rounds  int // rounds gone so far, over all calls of run
}

func newClimb(n numerics, o Options) *climb {
	return &climb{n: n, o: o, meter: &meter{tell: o.Progress}, rungs: map[int]*result.Rung{}, members: map[int]map[string]bool{}}
}

// run goes round until every mode is done.
func (r *climb) run(ctx context.Context) error {
	for round := 0; ; round++ {
		pending := r.pending()
		if len(pending) == 0 {
			return nil
		}
		r.rounds++
		if err := r.round(ctx, round, pending); err != nil {
			return err
		}
	}
}

// more says to when a block must go on so that every mode is quiet, or its
// present end when they are.
func (r *climb) more(modes []*ladder, points int) func([]certify.Samples, float64) float64 {
	return func(s []certify.Samples, until float64) float64 {
		next := until
		for q, m := range modes {
			if until < r.lastUntil(m) && !r.quiet(&s[q], m, until, points) {
				next = math.Max(next, math.Min(until+r.stride(m), r.lastUntil(m)))
			}
		}
		return next
	}
}

// pending lists the modes that still want a rung, ordered so that blocks are
// filled alike on any machine.
func (r *climb) pending() []*ladder {
	var p []*ladder
	for _, m := range r.modes {
		if !m.done {
			p = append(p, m)
		}
	}
	sort.SliceStable(p, func(i, j int) bool {
		a, b := p[i], p[j]
		if a.rung != b.rung {
			return a.rung < b.rung
		}
		if a.m != b.m {
			return a.m < b.m
		}
		return a.l < b.l
	})
	return p
}

// round runs the wanted rung of every pending mode, with the coarser ones that
// its bar needs, and certifies.
func (r *climb) round(ctx context.Context, round int, pending []*ladder) error {
	r.meter.stage(fmt.Sprintf("round %d, %d modes", r.rounds, len(pending)))
	var blocks [][]*ladder
	for i := 0; i < len(pending); {
		j := i
		for j < len(pending) && j-i < blockModes && pending[j].rung == pending[i].rung {
			j++
		}
		blocks = append(blocks, pending[i:j])
		i = j
	}
	for _, b := range blocks {
		t := 0.0
		for _, m := range b {
			t = math.Max(t, math.Max(m.until, r.firstUntil(m)))
		}
		for k := b[0].rung; k > b[0].rung-r.n.rungs && (round == 0 || k == b[0].rung); k-- {
			r.expect(k, t)
		}
	}
	return each(ctx, r.o.Workers, len(blocks), func(ctx context.Context, i int) error {
		b := blocks[i]
		k := b[0].rung
		name := fmt.Sprintf("round-%d-block-%d", r.rounds, i)
		until := 0.0
		for _, m := range b {
			if round == 0 {
				until = math.Max(until, r.firstUntil(m))
			} else {
				until = math.Max(until, m.until)
			}
		}
		expected := until
		var more func([]certify.Samples, float64) float64
		if round == 0 && r.n.until == 0 {
			more = r.more(b, r.n.grid(k).N)
		}
		fine, err := r.block(ctx, fmt.Sprintf("%s-rung-%d", name, k), b, k, until, more)
		if err != nil {
			return err
		}
		for q, m := range b {
			m.runs[k], m.points[k] = &fine.Samples[q], fine.Points
			if round == 0 {
				m.until = fine.Until
			}
		}
		if round == 0 {
			for j := k - 1; j > k-r.n.rungs; j-- {
				r.expect(j, fine.Until-expected)
				coarse, err := r.block(ctx, fmt.Sprintf("%s-rung-%d", name, j), b, j, fine.Until, nil)
				if err != nil {
					return err
				}
				for q, m := range b {
					m.runs[j], m.points[j] = &coarse.Samples[q], coarse.Points
				}
			}
		}
		for _, m := range b {
			climb, err := r.certify(m)
			if err != nil {
				return err
			}
			if climb && !m.met && m.rung < r.n.maxRung && r.n.fixedRung < 0 {
				delete(m.runs, m.rung-r.n.rungs+1)
				m.rung++
			} else {
				m.done = true
			}
		}
		return nil
	})
}

// block evolves modes on rung k, or takes the stored samples of an interrupted
// run.
func (r *climb) block(ctx context.Context, key string, modes []*ladder, k int, until float64, more func([]certify.Samples, float64) float64) (*blockRun, error) {
	var list []blockMode
	for _, m := range modes {
		list = append(list, m.blockMode)
	}
	longer := more
	if more != nil {
		longer = func(s []certify.Samples, until float64) float64 {
			next := more(s, until)
			r.expect(k, next-until)
			return next
		}
	}
	b, err := kept(r.o.Keep, key, func() (*blockRun, error) {
		return r.n.evolveBlock(ctx, list, r.force(modes), k, until, longer, r.meter.did)
	})
	if err == nil {
		r.log(k, modes, b)
	}
	return b, err
}

// log books a run under its rung.
func (r *climb) log(k int, modes []*ladder, b *blockRun) {
	r.meter.mu.Lock()
	defer r.meter.mu.Unlock()
	g := r.rungs[k]
	if g == nil {
		g = &result.Rung{Points: b.Points, Dx: b.Dx, Dt: b.Dt, Kernel: r.n.cells * b.Dx, Moments: r.n.moments, Order: r.n.order}
		r.rungs[k], r.members[k] = g, map[string]bool{}
	}
	g.Until = math.Max(g.Until, b.Until)
	g.CoreSeconds += b.Seconds
	for _, m := range modes {
		r.members[k][fmt.Sprintf("(%d,%d)", m.l, m.m)] = true
	}
}

// expect announces the work of one block on rung k.
func (r *climb) expect(k int, until float64) {
	g := r.n.grid(k)
	r.meter.expect(until / (r.n.courant * g.Dx) * float64(g.N))
}

// chunk splits n items into blocks.
func chunk(n int) [][2]int {
	var out [][2]int
	for i := 0; i < n; i += blockModes {
		out = append(out, [2]int{i, min(i+blockModes, n)})
	}
	return out
}
