package report

import (
	"fmt"
	"math"
	"strings"

	"nullmark/extract/result"
)

// Keys of result.Orbit.Numbers that the picture of the orbit draws as circles
// where they are present. Radii in M.
const (
	KeyHorizon   = "horizon_radius"
	KeyLightRing = "light_ring_radius"
	KeyISCO      = "isco_radius"
)

// pathBudget bounds the points of the drawn path.
const pathBudget = 12000

// picture is one figure of the page.
type picture struct {
	ID      string
	Title   string
	SVG     string
	Caption string
}

// orbitPicture draws the particle's path in its plane of coordinates
// (r cos phi, r sin phi). ok is false where there is no path.
func orbitPicture(r *result.Result, s *result.Series) (p picture, ok bool) {
	if s == nil || r.Orbit == nil {
		return p, false
	}
	n := min(len(s.R), len(s.Phi))
	reach, near := 0.0, math.Inf(1)
	for _, v := range s.R[:n] {
		if finite(v) {
			reach, near = math.Max(reach, v), math.Min(near, v)
		}
	}
	if n < 2 || !(reach > 0) {
		return p, false
	}
	half, zoomed := 1.12*reach, false
	if most := math.Max(30, 4*near); reach > most {
		half, zoomed = most, true
	}

	const side, top, left = 400.0, 12.0, 62.0
	x := axis{lo: -half, hi: half, from: left, to: left + side}
	y := axis{lo: -half, hi: half, from: top + side, to: top}
	desc := fmt.Sprintf("Path of the particle around the hole, between r = %s M and r = %s M.", settingNumber(near), settingNumber(reach))
	c := newCanvas("orbit", pictureWidth, top+side+46, "The orbit in its plane", desc)
	pan := newPanel(c, "frame", x, y, "r cos φ  (M)", "r sin φ  (M)", 6)
	scale := side / (2 * half)

	keyY := top + 22.0
	key := func(draw func(x, y float64), text, more string) {
		draw(left+side+46, keyY-4)
		c.text(left+side+74, keyY, "label", "start", text)
		if more != "" {
			keyY += 16
			c.text(left+side+74, keyY, "tick", "start", more)
		}
		keyY += 24
	}
	circle := func(name, class, text string) {
		radius, found := r.Orbit.Numbers[name]
		if !found || !(radius > 0) {
			return
		}
		if radius < half*1.4 {
			// A white line below keeps the circle visible across a dense path.
			c.b.WriteString(`<circle cx="` + px(x.at(0)) + `" cy="` + px(y.at(0)) + `" r="` + px(radius*scale) + `" class="under" clip-path="url(#` + pan.clip + `)"/>`)
			c.b.WriteString(`<circle cx="` + px(x.at(0)) + `" cy="` + px(y.at(0)) + `" r="` + px(radius*scale) + `" class="` + class + `" clip-path="url(#` + pan.clip + `)"/>`)
		}
		key(func(x, y float64) {
			if class == "hole" {
				c.circle(x+5, y, 6, class)
				return
			}
			c.line(x-8, y, x+18, y, class)
		}, text, "r = "+settingNumber(radius)+" M")
	}
	d, cut, first, last := track(x, y, s.R[:n], s.Phi[:n])
	c.path(d, "track", pan.clip)
	circle(KeyISCO, "isco", "innermost stable orbit")
	circle(KeyLightRing, "ring", "light ring")
	circle(KeyHorizon, "hole", "the hole's horizon")
	key(func(x, y float64) { c.line(x-8, y, x+18, y, "track") }, "path of the particle", "")
	ends := []struct {
		i     int
		shape int
		text  string
	}{{first, 0, "where the drawn path begins"}, {last, 1, "where it ends"}}
	for _, e := range ends {
		ex, ey := s.R[e.i]*math.Cos(s.Phi[e.i]), s.R[e.i]*math.Sin(s.Phi[e.i])
		if math.Abs(ex) <= half && math.Abs(ey) <= half {
			c.marker(e.shape, x.at(ex), y.at(ey), 5, "open ink")
		}
		key(func(x, y float64) { c.marker(e.shape, x+5, y, 5, "open ink") }, e.text, "")
	}

	p = picture{ID: "picture-orbit", Title: "The orbit", SVG: c.String()}
	p.Caption = "The particle’s path in the coordinates (r cos φ, r sin φ), in units of the hole’s mass M."
	if zoomed {
		p.Caption += fmt.Sprintf(" The path reaches out to r = %s M; only the inner part is shown.", settingNumber(reach))
	}
	if cut {
		p.Caption += " The path is longer than can be drawn: its last part is shown."
	}
	return p, true
}

// track thins the path: steps shorter than half a pixel and steps that repeat
// an earlier one to the pixel are left out. When what remains is longer than
// the budget, its last part is kept (cut). first and last are the indices of
// the samples at the two ends of what is drawn.
func track(x, y axis, r, phi []float64) (d string, cut bool, first, last int) {
	type step struct{ x0, y0, x1, y1 int }
	type point struct {
		x, y float64
		i    int
		move bool
	}
	seen := make(map[step]bool)
	var pts []point
	px0, py0, have, gap := 0.0, 0.0, false, true
	last = 0
	for i := range r {
		if !finite(r[i]) || !finite(phi[i]) {
			gap = true
			continue
		}
		last = i
		ax, ay := x.at(r[i]*math.Cos(phi[i])), y.at(r[i]*math.Sin(phi[i]))
		if have && !gap && math.Hypot(ax-px0, ay-py0) < 0.5 && i < len(r)-1 {
			continue
		}
		s := step{int(math.Round(px0)), int(math.Round(py0)), int(math.Round(ax)), int(math.Round(ay))}
		if have && !gap && seen[s] {
			px0, py0, gap = ax, ay, false
			if len(pts) > 0 && !pts[len(pts)-1].move {
				pts = append(pts, point{ax, ay, i, true})
			} else if len(pts) > 0 {
				pts[len(pts)-1] = point{ax, ay, i, true}
			}
			continue
		}
		seen[s] = true
		pts = append(pts, point{ax, ay, i, !have || gap})
		px0, py0, have, gap = ax, ay, true, false
	}
	if len(pts) > pathBudget {
		pts, cut = pts[len(pts)-pathBudget:], true
		pts[0].move = true
	}
	if len(pts) > 0 {
		first = pts[0].i
	}
	var b strings.Builder
	for _, p := range pts {
		if p.move {
			b.WriteByte('M')
		} else {
			b.WriteByte('L')
		}
		limit := func(v float64) float64 { return math.Max(-3000, math.Min(3000, v)) }
		b.WriteString(px(limit(p.x)) + " " + px(limit(p.y)))
	}
	return b.String(), cut, first, last
}
