package worldline

import (
	"math"
	"math/big"
)

// Circular is a circular geodesic, in closed form:
// Omega = r^(-3/2), u^t = (1-3/r)^(-1/2), E = f u^t, L = r^2 Omega u^t.
type Circular struct {
	r, rstar, energy, angular, omega float64
	period                           doubled
	azimuth                          float64
}

// doubled is a number as an unevaluated sum.
type doubled struct{ hi, lo float64 }

func split(x *big.Float) doubled {
	hi, _ := x.Float64()
	lo, _ := new(big.Float).Sub(x, new(big.Float).SetFloat64(hi)).Float64()
	return doubled{hi, lo}
}

// turn is 2 pi to 50 digits.
const turn = "6.2831853071795864769252867665590057683943387987502"

// NewCircular returns the circular orbit of the given radius, at the given
// azimuth (radians) at t = 0. Orbits between 3 and 6 are unstable but exist.
func NewCircular(radius, azimuth float64) (*Circular, error) {
	if !(radius > 3) || math.IsInf(radius, 0) {
		return nil, &Impossible{"radius", radius, "a radius above 3 (at and inside the light ring no circular orbit is timelike; infall goes further in)"}
	}
	if err := finite("azimuth", azimuth); err != nil {
		return nil, err
	}
	r := radius
	ut := 1 / math.Sqrt(1-3/r)
	c := &Circular{r: r, rstar: r + 2*math.Log(r/2-1), azimuth: azimuth, omega: 1 / (r * math.Sqrt(r))}
	c.energy = (1 - 2/r) * ut
	c.angular = math.Sqrt(r) * ut
	const prec = 160
	two, _, _ := big.ParseFloat(turn, 10, prec, big.ToNearestEven)
	root := new(big.Float).SetPrec(prec).SetFloat64(r)
	root.Sqrt(root)
	root.Mul(root, new(big.Float).SetFloat64(r))
	c.period = split(two.Mul(two, root))
	return c, nil
}

func finite(key string, v float64) error {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return &Impossible{key, v, "a finite number"}
	}
	return nil
}

// Kind returns "circular".
func (c *Circular) Kind() string { return "circular" }

// At implements Worldline.
func (c *Circular) At(t float64, s *State) {
	n := math.RoundToEven(t / c.period.hi)
	tau := math.FMA(-n, c.period.hi, t) - n*c.period.lo
	a := c.omega*tau + c.azimuth
	*s = State{T: t, Rstar: c.rstar, R: c.r, Y: c.r - 2, Phase: a, Phi: n*turnHi + a, E: c.energy, L: c.angular}
}

// Span is all times.
func (c *Circular) Span() (t0, t1 float64) { return math.Inf(-1), math.Inf(1) }

// Markers returns nil.
func (c *Circular) Markers() []Marker { return nil }

// Omega returns the orbital frequency.
func (c *Circular) Omega() float64 { return c.omega }

// Numbers implements Worldline.
func (c *Circular) Numbers() []Number {
	n := []Number{
		{"radius", c.r}, {"E", c.energy}, {"L", c.angular},
		{"omega_phi", c.omega}, {"period_phi", c.period.hi},
	}
	if c.r > 6 {
		n = append(n, Number{"omega_r", c.omega * math.Sqrt(1-6/c.r)})
	}
	return n
}

// Drift returns 0.
func (c *Circular) Drift() float64 { return 0 }

// Uncertainty implements Worldline.
func (c *Circular) Uncertainty() (rstar, phi float64) { return 1e-15 * c.r, 1e-15 }
