package report

import (
	"encoding/xml"
	"math"
	"strconv"
	"strings"
)

// canvas collects the elements of one picture. Coordinates are pixels of the
// view box, y downwards.
type canvas struct {
	b    strings.Builder
	id   string // prefix of every id inside, unique on the page
	w, h float64
}

// picture width on the page, in pixels of the view box.
const pictureWidth = 760

// newCanvas opens a picture. Title and description are for readers who do not
// see it.
func newCanvas(id string, w, h float64, title, desc string) *canvas {
	c := &canvas{id: id, w: w, h: h}
	c.b.WriteString(`<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ` + px(w) + ` ` + px(h) + `" width="` + px(w) + `" height="` + px(h) +
		`" role="img" aria-labelledby="` + id + `-t ` + id + `-d">`)
	c.b.WriteString(`<title id="` + id + `-t">` + escape(title) + `</title><desc id="` + id + `-d">` + escape(desc) + `</desc>`)
	return c
}

// String closes the picture and returns it.
func (c *canvas) String() string { return c.b.String() + "</svg>" }

// px writes a coordinate with one decimal.
func px(v float64) string {
	s := strconv.FormatFloat(v, 'f', 1, 64)
	s = strings.TrimSuffix(s, ".0")
	if s == "-0" {
		return "0"
	}
	return s
}

// escape makes any text safe between tags and in attributes.
func escape(s string) string {
	var b strings.Builder
	if err := xml.EscapeText(&b, []byte(clean(s))); err != nil {
		panic("report: escaping into memory: " + err.Error())
	}
	return b.String()
}

func (c *canvas) text(x, y float64, class, anchor, s string) {
	c.b.WriteString(`<text x="` + px(x) + `" y="` + px(y) + `" class="` + class + `" text-anchor="` + anchor + `">` + escape(s) + `</text>`)
}

// upright writes text that reads from bottom to top.
func (c *canvas) upright(x, y float64, class, s string) {
	c.b.WriteString(`<text transform="translate(` + px(x) + ` ` + px(y) + `) rotate(-90)" class="` + class + `" text-anchor="middle">` + escape(s) + `</text>`)
}

func (c *canvas) line(x1, y1, x2, y2 float64, class string) {
	c.b.WriteString(`<line x1="` + px(x1) + `" y1="` + px(y1) + `" x2="` + px(x2) + `" y2="` + px(y2) + `" class="` + class + `"/>`)
}

func (c *canvas) circle(x, y, r float64, class string) {
	c.b.WriteString(`<circle cx="` + px(x) + `" cy="` + px(y) + `" r="` + px(r) + `" class="` + class + `"/>`)
}

func (c *canvas) rect(x, y, w, h float64, class string) {
	c.b.WriteString(`<rect x="` + px(x) + `" y="` + px(y) + `" width="` + px(w) + `" height="` + px(h) + `" class="` + class + `"/>`)
}

// path draws what d (an SVG path) says; clip names a clip region or is empty.
func (c *canvas) path(d, class, clip string) {
	if d == "" {
		return
	}
	c.b.WriteString(`<path d="` + d + `" class="` + class + `"`)
	if clip != "" {
		c.b.WriteString(` clip-path="url(#` + clip + `)"`)
	}
	c.b.WriteString(`/>`)
}

// clipRect declares a clip region and returns its id.
func (c *canvas) clipRect(name string, x, y, w, h float64) string {
	id := c.id + "-" + name
	c.b.WriteString(`<clipPath id="` + id + `"><rect x="` + px(x) + `" y="` + px(y) + `" width="` + px(w) + `" height="` + px(h) + `"/></clipPath>`)
	return id
}

// hatch declares the pattern of the start-up region and returns its id. It is
// a pattern and not a tint so that it survives a grey printer.
func (c *canvas) hatch() string {
	id := c.id + "-hatch"
	c.b.WriteString(`<pattern id="` + id + `" width="7" height="7" patternUnits="userSpaceOnUse" patternTransform="rotate(45)"><rect width="7" height="7" class="hatch-ground"/><line x1="0" y1="0" x2="0" y2="7" class="hatch-line"/></pattern>`)
	return id
}

// fillRect fills a rectangle with a declared pattern.
func (c *canvas) fillRect(x, y, w, h float64, pattern string) {
	c.b.WriteString(`<rect x="` + px(x) + `" y="` + px(y) + `" width="` + px(w) + `" height="` + px(h) + `" style="fill:url(#` + pattern + `)"/>`)
}

// markers is the number of shapes that marker knows; a series keeps its shape,
// dash and colour through the page.
const markers = 6

// marker draws shape k (taken modulo markers) of radius r around a point.
func (c *canvas) marker(k int, x, y, r float64, class string) {
	class = "mark " + class
	p := func(dx, dy float64) string { return px(x+dx*r) + " " + px(y+dy*r) }
	switch k % markers {
	case 0:
		c.circle(x, y, r, class)
	case 1:
		c.rect(x-0.9*r, y-0.9*r, 1.8*r, 1.8*r, class)
	case 2:
		c.path("M"+p(0, -1.25)+"L"+p(1.15, 0.85)+"L"+p(-1.15, 0.85)+"Z", class, "")
	case 3:
		c.path("M"+p(0, -1.3)+"L"+p(1.3, 0)+"L"+p(0, 1.3)+"L"+p(-1.3, 0)+"Z", class, "")
	case 4:
		c.path("M"+p(-1, -1)+"L"+p(1, 1)+"M"+p(-1, 1)+"L"+p(1, -1), class, "")
	case 5:
		c.path("M"+p(0, 1.25)+"L"+p(1.15, -0.85)+"L"+p(-1.15, -0.85)+"Z", class, "")
	}
}

// axis maps values to pixels, linearly or by their logarithm.
type axis struct {
	lo, hi float64 // range of values; log: both above zero
	from   float64 // pixel of lo
	to     float64 // pixel of hi
	log    bool
	bare   bool // no ticks: the caller names the positions
}

// at returns the pixel of v. On a logarithmic axis values at or below zero sit
// at the end of lo.
func (a axis) at(v float64) float64 {
	if a.log {
		if !(v > a.lo) {
			v = a.lo
		}
		return a.from + (a.to-a.from)*math.Log(v/a.lo)/math.Log(a.hi/a.lo)
	}
	return a.from + (a.to-a.from)*(v-a.lo)/(a.hi-a.lo)
}

type tick struct {
	v     float64
	label string
}

// ticks returns about n round positions inside the range.
func (a axis) ticks(n int) []tick {
	var out []tick
	if a.bare {
		return nil
	}
	if a.log {
		first, last := int(math.Ceil(math.Log10(a.lo)-1e-9)), int(math.Floor(math.Log10(a.hi)+1e-9))
		step := 1
		for _, s := range []int{1, 2, 3, 5, 10, 20, 50} {
			step = s
			if (last-first)/s+1 <= n {
				break
			}
		}
		for e := first; e <= last; e++ {
			if e%step == 0 {
				out = append(out, tick{math.Pow(10, float64(e)), "1e" + strconv.Itoa(e)})
			}
		}
		return out
	}
	raw := (a.hi - a.lo) / float64(n)
	mag := math.Pow(10, math.Floor(math.Log10(raw)))
	step := mag * 10
	for _, s := range []float64{1, 2, 5} {
		if s*mag >= raw*0.999 {
			step = s * mag
			break
		}
	}
	for k := math.Ceil(a.lo/step - 1e-9); k*step <= a.hi+1e-9*step; k++ {
		v := k * step
		if v == 0 {
			v = 0
		}
		out = append(out, tick{v, tidyExponent(strconv.FormatFloat(v, 'g', 6, 64))})
	}
	return out
}

// panel is a rectangular plot with a horizontal and a vertical axis.
type panel struct {
	c    *canvas
	x, y axis
	clip string
}

// newPanel draws frame, grid, ticks and axis titles. The pixel ranges of the
// axes must be set: x.from < x.to, y.from (bottom) > y.to (top).
func newPanel(c *canvas, name string, x, y axis, xTitle, yTitle string, yTicks int) *panel {
	p := &panel{c: c, x: x, y: y}
	for _, t := range y.ticks(yTicks) {
		py := y.at(t.v)
		c.line(x.from, py, x.to, py, "grid")
		c.text(x.from-6, py+4, "tick", "end", t.label)
	}
	for _, t := range x.ticks(8) {
		at := x.at(t.v)
		c.line(at, y.from, at, y.from+4, "axis")
		if xTitle != "" {
			c.text(at, y.from+17, "tick", "middle", t.label)
		}
	}
	if xTitle != "" {
		c.text((x.from+x.to)/2, y.from+34, "name", "middle", xTitle)
	}
	if yTitle != "" {
		c.upright(16, (y.from+y.to)/2, "name", yTitle)
	}
	c.line(x.from, y.from, x.to, y.from, "axis")
	c.line(x.from, y.from, x.from, y.to, "axis")
	p.clip = c.clipRect(name, x.from, y.to, x.to-x.from, y.from-y.to)
	return p
}

// startUp veils and hatches the part of the panel before u = until and says what
// it is. Drawn after the curves, it lets them show through faintly.
func (p *panel) startUp(pattern string, until float64, say bool) {
	end := math.Min(until, p.x.hi)
	if !(end > p.x.lo) {
		return
	}
	w := p.x.at(end) - p.x.from
	p.c.fillRect(p.x.from, p.y.to, w, p.y.from-p.y.to, pattern)
	if say && w > 130 {
		p.c.b.WriteString(`<text x="` + px(p.x.from+7) + `" y="` + px(p.y.to+15) + `" class="note halo" text-anchor="start">start-up, not compared</text>`)
	}
}

// curve draws ys against xs, thinned.
func (p *panel) curve(xs, ys []float64, class string) {
	p.c.path(thinned(p.x, p.y, xs, ys), class, p.clip)
}

// thinned returns the path of a curve with at most four points to a pixel
// column: the first, the lowest, the highest and the last, in order. Values
// that are not finite break the curve; xs must not decrease.
func thinned(x, y axis, xs, ys []float64) string {
	var b strings.Builder
	pen := false
	column, inside := 0, false
	var first, low, high, last, xPen, yPen int
	flush := func() {
		if !inside {
			return
		}
		order := [4]int{first, min(low, high), max(low, high), last}
		previous := -1
		for _, i := range order {
			if i == previous {
				continue
			}
			previous = i
			// Far outside the frame the clip hides the curve; keep coordinates sane.
			py := math.Max(math.Min(y.at(ys[i]), y.from+2000), y.to-2000)
			// Steps are differences of positions in whole tenths of a pixel:
			// short to write, and their errors do not add up.
			xTenth, yTenth := int(math.Round(10*x.at(xs[i]))), int(math.Round(10*py))
			if pen {
				b.WriteString("l" + px(float64(xTenth-xPen)/10) + " " + px(float64(yTenth-yPen)/10))
			} else {
				b.WriteString("M" + px(float64(xTenth)/10) + " " + px(float64(yTenth)/10))
				pen = true
			}
			xPen, yPen = xTenth, yTenth
		}
		inside = false
	}
	for i := range min(len(xs), len(ys)) {
		at := x.at(xs[i])
		if !finite(ys[i]) || !finite(at) {
			flush()
			pen = false
			continue
		}
		if at < x.from-1 || at > x.to+1 {
			continue
		}
		k := int(math.Floor(at))
		if !inside || k != column {
			flush()
			column, inside = k, true
			first, low, high, last = i, i, i, i
			continue
		}
		last = i
		if ys[i] < ys[low] {
			low = i
		}
		if ys[i] > ys[high] {
			high = i
		}
	}
	flush()
	return b.String()
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
