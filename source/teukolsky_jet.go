package source

// jet holds a complex function of (x, z) and its derivatives up to second
// order (x in its first variable, t in its second): a truncated bivariate Taylor
// expansion.
type jet struct{ v, x, t, xx, xt, tt complex128 }

func constant(c complex128) jet { return jet{v: c} }

func (a jet) plus(b jet) jet {
	return jet{a.v + b.v, a.x + b.x, a.t + b.t, a.xx + b.xx, a.xt + b.xt, a.tt + b.tt}
}

func (a jet) minus(b jet) jet {
	return jet{a.v - b.v, a.x - b.x, a.t - b.t, a.xx - b.xx, a.xt - b.xt, a.tt - b.tt}
}

func (a jet) scaled(c complex128) jet {
	return jet{c * a.v, c * a.x, c * a.t, c * a.xx, c * a.xt, c * a.tt}
}

func (a jet) times(b jet) jet {
	return jet{
		a.v * b.v,
		a.x*b.v + a.v*b.x,
		a.t*b.v + a.v*b.t,
		a.xx*b.v + 2*a.x*b.x + a.v*b.xx,
		a.xt*b.v + a.x*b.t + a.t*b.x + a.v*b.xt,
		a.tt*b.v + 2*a.t*b.t + a.v*b.tt,
	}
}

// inverse returns 1/a.
func (a jet) inverse() jet {
	i := 1 / a.v
	i2 := i * i
	return jet{
		i,
		-a.x * i2,
		-a.t * i2,
		(2*a.x*a.x*i - a.xx) * i2,
		(2*a.x*a.t*i - a.xt) * i2,
		(2*a.t*a.t*i - a.tt) * i2,
	}
}

// dx and dt differentiate; the result is good to one order less, and its
// second derivatives (unknown) are set to 0.
func (a jet) dx() jet { return jet{v: a.x, x: a.xx, t: a.xt} }
func (a jet) dt() jet { return jet{v: a.t, x: a.xt, t: a.tt} }
