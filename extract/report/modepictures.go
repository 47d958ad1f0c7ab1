package report

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"nullmark/extract/result"
)

// columns lays the modes out along a horizontal axis, in groups of equal l.
type columns struct {
	modes []result.Mode
	at    []float64 // pixel of each mode
	slot  float64
	edges []float64 // pixels of the borders between groups
	mid   []float64 // middle of each group
	l     []int     // l of each group
}

// layOut sorts the modes by l, then m, and places them between two pixels.
func layOut(all []result.Mode, from, to float64) columns {
	modes := append([]result.Mode(nil), all...)
	sort.SliceStable(modes, func(a, b int) bool {
		if modes[a].L != modes[b].L {
			return modes[a].L < modes[b].L
		}
		return modes[a].M < modes[b].M
	})
	groups := 0
	for i := range modes {
		if i == 0 || modes[i].L != modes[i-1].L {
			groups++
		}
	}
	c := columns{modes: modes}
	// A group takes the room of half a mode more than it holds.
	c.slot = (to - from) / (float64(len(modes)) + 0.5*float64(groups))
	x := from
	for i := 0; i < len(modes); {
		j := i
		x += c.slot * 0.25
		start := x
		for ; j < len(modes) && modes[j].L == modes[i].L; j++ {
			c.at = append(c.at, x+c.slot/2)
			x += c.slot
		}
		c.mid = append(c.mid, (start+x)/2)
		c.l = append(c.l, modes[i].L)
		x += c.slot * 0.25
		c.edges = append(c.edges, x)
		i = j
	}
	return c
}

// draw writes the two rows of names below pixel y and the borders of the
// groups up to pixel top.
func (l columns) draw(c *canvas, left, y, top float64) {
	every := max(1, int(math.Ceil(13/l.slot)))
	for i, m := range l.modes {
		if m.M%every == 0 {
			c.text(l.at[i], y+18, "small", "middle", strconv.Itoa(m.M))
		}
	}
	c.text(left-8, y+18, "tick", "end", "m")
	c.text(left-8, y+35, "tick", "end", "l")
	lastText := -100.0
	for g, edge := range l.edges {
		if g < len(l.edges)-1 {
			c.line(edge, top, edge, y+40, "border")
		}
		if l.mid[g]-lastText >= 16 {
			c.text(l.mid[g], y+35, "tick strong", "middle", strconv.Itoa(l.l[g]))
			lastText = l.mid[g]
		}
	}
}

// fluxPicture draws the energy through both ends mode by mode, with the size
// of each error bar below it.
func fluxPicture(r *result.Result) (picture, bool) {
	type end struct {
		name  string
		of    func(*result.Mode) *result.Flux
		class string
		shape int
		shift float64
	}
	ends := []end{
		{"to null infinity", func(m *result.Mode) *result.Flux { return m.Infinity }, "s0", 0, -0.17},
		{"into the horizon", func(m *result.Mode) *result.Flux { return m.Horizon }, "s1 open", 1, 0.17},
	}
	small, big := math.Inf(1), 0.0
	has := [2]bool{}
	negative, measure := false, ""
	for i := range r.Modes {
		for e, end := range ends {
			f := end.of(&r.Modes[i])
			if f == nil || !write(f.Energy, scientific).Good || f.Energy.Value == 0 {
				continue
			}
			has[e] = true
			measure = r.Modes[i].Measure
			negative = negative || f.Energy.Value < 0
			big = math.Max(big, math.Abs(f.Energy.Value))
			for _, v := range []float64{math.Abs(f.Energy.Value), f.Energy.Error} {
				if v > 0 {
					small = math.Min(small, v)
				}
			}
		}
	}
	if big == 0 {
		return picture{}, false
	}
	const left, right, bottom, top = 78.0, 745.0, 330.0, 44.0
	y := axis{from: bottom, to: top, log: true}
	y.lo, y.hi = logRange(small, big, 34)
	title := "Energy by mode"
	unit := energyUnit(measure)
	c := newCanvas("flux", pictureWidth, bottom+48, title, "Energy in each mode on a logarithmic axis, with the size of each error bar; the values stand in the table of energies.")
	newPanel(c, "frame", axis{from: left, to: right, bare: true}, y, "", "|energy|  ("+unit+")", 9)
	l := layOut(r.Modes, left, right)
	l.draw(c, left, bottom, top)
	mark := math.Max(2, math.Min(4, l.slot*0.2))
	x := left
	for e, end := range ends {
		for i := range l.modes {
			f := end.of(&l.modes[i])
			if f == nil || !write(f.Energy, scientific).Good || f.Energy.Value == 0 {
				continue
			}
			shift := 0.0
			if has[0] && has[1] {
				shift = math.Copysign(math.Min(math.Abs(end.shift)*l.slot, 9), end.shift)
			}
			at, v, bar := l.at[i]+shift, math.Abs(f.Energy.Value), f.Energy.Error
			yv := y.at(v)
			if bar > 0 {
				yb := y.at(bar)
				c.line(at, yv, at, yb, "stem "+end.class)
				w := math.Max(2.2, math.Min(5, l.slot*0.26))
				c.line(at-w, yb, at+w, yb, "foot "+end.class)
				if up := y.at(v + bar); yv-up > 1 {
					c.line(at, y.at(math.Max(v-bar, y.lo)), at, up, "whisker "+end.class)
				}
			}
			shape := end.shape
			if f.Energy.Value < 0 {
				shape = 5
			}
			c.marker(shape, at, yv, mark, end.class)
		}
		if has[e] {
			c.marker(end.shape, x+6, 15, 4, end.class)
			c.text(x+16, 19, "label", "start", end.name)
			x += 170
		}
	}
	x += 6
	c.line(x, 8, x, 24, "stem s0")
	c.line(x-5, 24, x+5, 24, "foot s0")
	c.text(x+12, 19, "label", "start", "size of its error bar")
	if negative {
		c.marker(5, x+160, 15, 4, "open s1")
		c.text(x+170, 19, "label", "start", "negative: a gain")
	}
	return picture{ID: "picture-flux", Title: title, SVG: c.String(),
		Caption: "Marker: the value. Foot of its stem: the size of its error bar, so that the stem’s length in decades is the number of certified digits. Where the bar is large enough to see around the marker it is drawn there as well."}, true
}

// budgetPicture draws the named parts of each mode's relative error bar
// against the asked accuracy.
func budgetPicture(r *result.Result) (picture, bool) {
	names := budgetNames(r.Modes)
	if len(names) == 0 {
		return picture{}, false
	}
	asked := r.Accuracy.Asked
	small, big := math.Inf(1), 0.0
	for _, m := range r.Modes {
		for _, v := range m.Budget {
			if v > 0 && finite(v) {
				small, big = math.Min(small, v), math.Max(big, v)
			}
		}
	}
	if big == 0 {
		return picture{}, false
	}
	if asked > 0 {
		small, big = math.Min(small, asked), math.Max(big, asked)
	}
	const left, right, bottom, top = 78.0, 745.0, 300.0, 44.0
	y := axis{from: bottom, to: top, log: true}
	y.lo, y.hi = logRange(small, big, 20)
	title := "What the error bars are made of"
	c := newCanvas("budget", pictureWidth, bottom+48, title,
		"Parts of the relative error bar of each mode ("+strings.Join(names, ", ")+") on a logarithmic axis, with a line at the asked accuracy "+askedNumber(asked)+".")
	newPanel(c, "frame", axis{from: left, to: right, bare: true}, y, "", "part of the relative bar", 9)
	l := layOut(r.Modes, left, right)
	l.draw(c, left, bottom, top)
	if asked > 0 {
		at := y.at(asked)
		c.line(left, at, right, at, "asked")
		c.b.WriteString(`<text x="` + px(right-4) + `" y="` + px(at-5) + `" class="label strong halo" text-anchor="end">asked: ` + escape(askedNumber(asked)) + `</text>`)
	}
	size := math.Max(2.2, math.Min(4, l.slot*0.22))
	x := left + 6
	for k, name := range names {
		c.marker(k, x, 15, 4, fmt.Sprintf("s%d", k%markers))
		c.text(x+11, 19, "label", "start", name)
		x += 40 + 6.6*float64(len(name))
		for i, m := range l.modes {
			v, found := m.Budget[name]
			if !found || !(v > 0) || !finite(v) {
				continue
			}
			c.marker(k, l.at[i], y.at(v), size, fmt.Sprintf("s%d", k%markers))
		}
	}
	caption := "Each mode’s relative error bar, of the strain on circular orbits and of the energy otherwise, split into its named parts. Parts of size zero are not drawn."
	if f := r.Accuracy.Floor; f > 0 {
		caption += " Modes below " + askedNumber(f) + " of the largest are held to that size instead of the line."
	}
	return picture{ID: "picture-budget", Title: title, SVG: c.String(), Caption: caption}, true
}

// budgetNames lists the parts that occur, the usual ones first.
func budgetNames(modes []result.Mode) []string {
	seen := map[string]bool{}
	for _, m := range modes {
		for name := range m.Budget {
			seen[name] = true
		}
	}
	var out []string
	for _, name := range []string{"discretisation", "transient", "round-off"} {
		if seen[name] {
			out = append(out, name)
			delete(seen, name)
		}
	}
	var rest []string
	for name := range seen {
		rest = append(rest, name)
	}
	sort.Strings(rest)
	return append(out, rest...)
}
