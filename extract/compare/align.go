package compare

import (
	"fmt"
	"math"
	"math/cmplx"

	"nullmark/extract/result"
)

// align finds the time and the orbital phase shift that minimise
//
//	sum over modes and samples in the window of |h_ref|^2 (phi_model - phi_ref)^2
//
// by Gauss–Newton steps: a step dT, dPsi changes the phase difference of (l,m)
// by omega_lm dT + m dPsi. The bars are those of the linear map from phase
// differences to shifts, for errors that conspire.
func (w *waves) align(common [][2]int) error {
	win := *w.in.Align
	if !(win[1] > win[0]) {
		return &InputError{What: fmt.Sprintf("align.window is [%v, %v]", win[0], win[1]), Remedy: "write two increasing times u"}
	}
	shift := &result.Shift{Window: win}
	var modes [][2]int
	for _, lm := range common {
		if lm[1] != 0 {
			modes = append(modes, lm)
		}
	}
	if len(modes) == 0 {
		return &InputError{What: "only m = 0 modes are compared, which have no phase to align", Remedy: "write align: none"}
	}
	flat := false
	for round := 0; round < 8; round++ {
		if err := w.window(w.shift[0]); err != nil {
			return err
		}
		a, b := nearest(w.u, win[0]), nearest(w.u, win[1])
		if a < 0 || b < 0 || b-a < 4 {
			return &InputError{What: fmt.Sprintf("align.window [%s, %s] does not lie inside the compared range %s … %s", short(win[0]), short(win[1]), short(w.u[0]), short(w.u[len(w.u)-1])),
				Remedy: "write a window inside it, of five samples or more"}
		}
		var n normal
		for _, lm := range modes {
			p, err := w.pair(lm)
			if err != nil {
				return err
			}
			n.add(p, a, b+1)
		}
		if round == 0 {
			// Whole turns first: phases are known up to 2 pi, so that the
			// orbital phase of one mode has m possible values.
			w.shift[1] = n.start()
			t, _ := n.bars(false)
			flat = n.flat() || t*n.fastest() > 0.1
			if flat {
				w.c.Warnings = append(w.c.Warnings, "In the window of align the frequency hardly changes, so that a time shift cannot be told from a phase shift: only the phase was shifted.")
			}
			continue
		}
		dT, dPsi := n.solve(flat)
		w.shift[0] += dT
		w.shift[1] += dPsi
		shift.Time.Error, shift.Phase.Error = n.bars(flat)
		if math.Abs(dT) < 1e-11*(1+math.Abs(w.u[0])) && math.Abs(dPsi) < 1e-13 {
			break
		}
		if math.Abs(w.shift[0]) > 0.5*(w.times.t[len(w.times.t)-1]-w.times.t[0]) {
			return &InputError{What: "the fit of align runs away: model and reference are too different in its window", Remedy: "choose another window, or write align: none"}
		}
	}
	if err := w.window(w.shift[0]); err != nil {
		return err
	}
	w.shift[1] = math.Remainder(w.shift[1], 2*math.Pi)
	shift.Time.Value, shift.Phase.Value = w.shift[0], w.shift[1]
	w.c.Shift = shift
	return nil
}

// normal holds the normal equations of one step and the rows they came from.
type normal struct {
	aa, ab, bb, ya, yb float64
	w, om, m, bar      []float64
	mids               []middle
}

// middle is the phase difference of one mode in the middle of the window.
type middle struct{ phase, m, weight float64 }

// start returns the orbital phase shift that brings the loudest mode's middle
// to zero and, among its |m| values, leaves the least in the other modes.
func (n *normal) start() float64 {
	if len(n.mids) == 0 {
		return 0
	}
	top := n.mids[0]
	for _, c := range n.mids {
		if c.weight > top.weight {
			top = c
		}
	}
	best, least := 0.0, math.Inf(1)
	for k := 0; k < int(math.Abs(top.m)); k++ {
		psi := (-top.phase + 2*math.Pi*float64(k)) / top.m
		sum := 0.0
		for _, c := range n.mids {
			r := math.Remainder(c.phase+c.m*psi, 2*math.Pi)
			sum += r * r
		}
		if sum < least-1e-9 {
			best, least = psi, sum
		}
	}
	return best
}

// add takes samples a … b-1 of a mode; the mode's own overall whole turns are
// taken out of its phase difference.
func (n *normal) add(p *pair, a, b int) {
	p.u, p.model, p.ref = p.u[a:b], p.model[a:b], p.ref[a:b]
	p.refBar, p.readBar = p.refBar[a:b], p.readBar[a:b]
	p.measure()
	mid := p.curves.Phase[(b-a)/2]
	turns := 0.0
	if !math.IsNaN(mid) {
		turns = 2 * math.Pi * math.Round(mid/(2*math.Pi))
		n.mids = append(n.mids, middle{mid, float64(p.m), p.scale})
	}
	for i := range p.u {
		d := p.curves.Phase[i] - turns
		if math.IsNaN(d) {
			continue
		}
		h := cmplx.Abs(p.ref[i])
		w, om, m := h*h, p.omega[i], float64(p.m)
		n.aa += w * om * om
		n.ab += w * om * m
		n.bb += w * m * m
		n.ya -= w * om * d
		n.yb -= w * m * d
		n.w, n.om, n.m, n.bar = append(n.w, w), append(n.om, om), append(n.m, m), append(n.bar, p.curves.PhaseBar[i])
	}
}

// flat reports whether omega/m is the same everywhere to 1e-5.
func (n *normal) flat() bool {
	return n.aa*n.bb == 0 || n.aa*n.bb-n.ab*n.ab < 1e-10*n.aa*n.bb
}

// fastest is the largest frequency in the window. A time shift whose bar is
// more than a tenth of a radian at that frequency is not known.
func (n *normal) fastest() float64 {
	top := 0.0
	for _, om := range n.om {
		top = math.Max(top, math.Abs(om))
	}
	return top
}

func (n *normal) solve(flat bool) (dT, dPsi float64) {
	if flat {
		if n.bb == 0 {
			return 0, 0
		}
		return 0, n.yb / n.bb
	}
	det := n.aa*n.bb - n.ab*n.ab
	return (n.bb*n.ya - n.ab*n.yb) / det, (n.aa*n.yb - n.ab*n.ya) / det
}

func (n *normal) bars(flat bool) (t, psi float64) {
	det := n.aa*n.bb - n.ab*n.ab
	for i, w := range n.w {
		if flat {
			psi += w * math.Abs(n.m[i]) * n.bar[i] / n.bb
			continue
		}
		t += w * math.Abs(n.bb*n.om[i]-n.ab*n.m[i]) * n.bar[i] / det
		psi += w * math.Abs(n.aa*n.m[i]-n.ab*n.om[i]) * n.bar[i] / det
	}
	return t, psi
}
