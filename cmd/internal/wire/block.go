package wire

import (
	"bytes"
	"context"
	"encoding/gob"
	"errors"
	"fmt"
	"math"
	"time"

	"nullmark/equations"
	"nullmark/equations/evolve"
	"nullmark/equations/semi"
	"nullmark/extract/certify"
	"nullmark/extract/sample"
	"nullmark/grid"
	"nullmark/grid/march"
	"nullmark/grid/stencil"
	"nullmark/source"
)

// blockModes is how many complex modes one block carries.
const blockModes = grid.Lanes / 2

// blockMode names one field of a block.
type blockMode struct {
	l, m   int
	parity equations.Parity
}

// blockRun is what one evolution of a block on one rung left behind.
type blockRun struct {
	Samples []certify.Samples // one a mode
	Until   float64
	Points  int
	Dx, Dt  float64
	Seconds float64
}

// evolveBlock evolves up to blockModes modes on rung k. It runs to until, and
// further in steps while more says so (more may be nil). Progress is reported
// in point-steps.
func (n *numerics) evolveBlock(ctx context.Context, modes []blockMode, force func(g grid.Grid, kernel source.Kernel, dt float64) semi.Forcing, k int, until float64, more func(s []certify.Samples, until float64) (next float64), progress func(done float64)) (*blockRun, error) {
	start := time.Now()
	g := n.grid(k)
	geo, err := semi.NewGeometry(n.domain, g, n.order)
	if err != nil {
		return nil, err
	}
	var pots []equations.Potential
	for _, m := range modes {
		p := equations.Master(m.parity, m.l)
		pots = append(pots, p, p)
	}
	dt := n.courant * g.Dx
	sys := semi.NewMaster(geo, pots, force(g, source.NewKernel(n.cells*g.Dx, n.moments), dt))
	stepper := march.NewTaylor(sys, n.taylor, sys.Length())
	rec := sample.NewEnds(len(modes), grid.Lanes, dt, 0)
	run := &evolve.Run{
		Stepper: stepper, State: make([]float64, sys.Length()), Dt: dt,
		Observers: []evolve.Observer{rec}, Limit: 1e8,
		Locate: func(i int) (string, string) {
			half := sys.Length() / 2
			p := geo.Points[i%half/grid.Lanes]
			mode := "an empty lane"
			if q := i % grid.Lanes / 2; q < len(modes) {
				mode = fmt.Sprintf("(%d,%d)", modes[q].l, modes[q].m)
			}
			return fmt.Sprintf("rho = %.6g (r = %.6g)", p.Rho, p.R), mode
		},
	}
	if n.filter > 0 {
		f := stencil.NewFilter(n.filter, n.filterStrength)
		scratch := make([]float64, sys.Length()/2)
		run.AfterStep = func(_ float64, u []float64) {
			f.Apply(u[:len(u)/2], scratch, grid.Lanes)
			f.Apply(u[len(u)/2:], scratch, grid.Lanes)
		}
	}
	for {
		steps := int(math.Ceil(until/dt)) - run.Steps
		rec.Grow(steps + 1)
		for steps > 0 {
			c := min(steps, 256)
			if err := run.Advance(ctx, c); err != nil {
				var fail *evolve.Failure
				if errors.As(err, &fail) && n.courant*sys.SpectralRadius()*g.Dx > stepper.ImaginaryLimit() {
					return nil, fmt.Errorf("numerics.courant %g is beyond the stability limit %.3g of this scheme: %w", n.courant, stepper.ImaginaryLimit()/(sys.SpectralRadius()*g.Dx), err)
				}
				return nil, err
			}
			steps -= c
			progress(float64(c * g.N))
		}
		if more == nil {
			break
		}
		next := more(rec.Modes, until)
		if next <= until {
			break
		}
		until = next
	}
	return &blockRun{Samples: rec.Modes, Until: until, Points: g.N, Dx: g.Dx, Dt: dt, Seconds: time.Since(start).Seconds()}, nil
}

// kept runs compute unless the keeper has its result under the key.
func kept(keep Keeper, key string, compute func() (*blockRun, error)) (*blockRun, error) {
	if keep != nil {
		if data, ok := keep.Load(key); ok {
			var b blockRun
			if gob.NewDecoder(bytes.NewReader(data)).Decode(&b) == nil {
				return &b, nil
			}
		}
	}
	b, err := compute()
	if err != nil || keep == nil {
		return b, err
	}
	var buf bytes.Buffer
	if err := gob.NewEncoder(&buf).Encode(b); err != nil {
		return nil, fmt.Errorf("checkpoint %s: %w", key, err)
	}
	if err := keep.Save(key, buf.Bytes()); err != nil {
		return nil, fmt.Errorf("checkpoint %s: %w", key, err)
	}
	return b, nil
}
