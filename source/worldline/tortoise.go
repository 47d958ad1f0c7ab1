package worldline

import "math"

// logOfTortoise returns q = ln(y/2), y = r-2, for r_* = r + 2 ln(r/2-1), i.e. the
// root of 2 + 2 e^q + 2 q = r_*, by Newton's method (the left side is convex and
// increasing: from the right of the root it converges monotonically).
func logOfTortoise(rstar float64) float64 {
	c := rstar/2 - 1 // e^q + q
	q := c
	if c > 1 {
		q = math.Log(c)
	}
	for range 60 {
		e := math.Exp(q)
		d := (e + q - c) / (e + 1)
		q -= d
		if math.Abs(d) <= 1e-16*max(1, math.Abs(q)) {
			break
		}
	}
	return q
}
