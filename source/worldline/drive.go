package worldline

import (
	"math"
	"sort"
)

// eulerGamma is Euler's constant.
const eulerGamma = 0.57721566490153286060651209008240243

// Flux is the energy flux dE/dt, in (mu/M)^2, of a circular orbit as a function
// of x = Omega^(2/3), written as its ratio to the quadrupole (32/5) x^5.
type Flux interface {
	// Ratio returns the flux over (32/5) x^5. It must be smooth for all x in
	// (0, 0.3].
	Ratio(x float64) float64
	// Uncertainty is the estimated relative error of the flux that stems
	// from its representation.
	Uncertainty() float64
}

// PostNewtonian is the test-particle flux at infinity through v^11 (H. Tagoshi &
// M. Sasaki, PTP 92, 745 (1994); T. Tanaka, H. Tagoshi, M. Sasaki, PTP 96, 1087
// (1996)) plus the leading flux into the horizon, v^8 (E. Poisson & M. Sasaki,
// PRD 51, 5753 (1995)).
type PostNewtonian struct{}

// Ratio implements Flux.
func (PostNewtonian) Ratio(x float64) float64 {
	v := math.Sqrt(x)
	c, l := series()
	lv := math.Log(v)
	sum := 0.0
	for k := len(c) - 1; k >= 0; k-- {
		sum = sum*v + (c[k] + l[k]*lv)
	}
	return sum
}

// series returns the coefficients of v^k and of v^k ln v.
func series() (c, l [12]float64) {
	const (
		pi  = math.Pi
		pi2 = pi * pi
		g   = eulerGamma
		ln2 = math.Ln2
		ln3 = 1.0986122886681098
	)
	c = [...]float64{
		1,
		0,
		-1247.0 / 336,
		4 * pi,
		-44711.0 / 9072,
		-8191.0 / 672 * pi,
		6643739519.0/69854400 - 1712.0/105*g + 16.0/3*pi2 - 3424.0/105*ln2,
		-16285.0 / 504 * pi,
		-323105549467.0/3178375200 + 232597.0/4410*g - 1369.0/126*pi2 + 39931.0/294*ln2 - 47385.0/1568*ln3 + 1,
		265978667519.0/745113600*pi - 6848.0/105*pi*g - 13696.0/105*pi*ln2,
		-2500861660823683.0/2831932303200 + 916628467.0/7858620*g - 424223.0/6804*pi2 - 83217611.0/1122660*ln2 + 47385.0/196*ln3,
		8399309750401.0/101708006400*pi + 177293.0/1176*pi*g + 8521283.0/17640*pi*ln2 - 142155.0/784*pi*ln3,
	}
	l = [...]float64{
		6: -1712.0 / 105, 8: 232597.0 / 4410, 9: -6848.0 / 105 * pi, 10: 916628467.0 / 7858620, 11: 177293.0 / 1176 * pi,
	}
	return c, l
}

// Uncertainty returns 0: the series is taken as given.
func (PostNewtonian) Uncertainty() float64 { return 0 }

// FluxTable is a flux through points, by rational interpolation without poles
// (M. S. Floater & K. Hormann, Numer. Math. 107, 315 (2007), degree 7) of its
// ratio to the post-Newtonian series in x = 1/r. Beyond the ends the ratio
// saturates smoothly at its value there.
type FluxTable struct {
	x, ratio, weight []float64
	first, last      float64 // range of x
	width            float64 // of the saturation
	err              float64
}

const floaterDegree = 7

// NewFluxTable takes radii (in any order), and the fluxes at infinity and into
// the horizon of the circular orbits there, both signs of m and all l together.
// The table must reach from the start of the inspiral down to r = 6.5 at least;
// rows below 6 (unstable orbits) are used as well.
func NewFluxTable(radius, infinity, horizon []float64) (*FluxTable, error) {
	n := len(radius)
	if len(infinity) != n || len(horizon) != n {
		panic("worldline: NewFluxTable: columns of different lengths")
	}
	var faults TableFaults
	order := make([]int, n)
	for i := range order {
		order[i] = i
		switch {
		case !(radius[i] > 3) || math.IsInf(radius[i], 0):
			faults = append(faults, TableFault{i + 1, "orbit.radius", radius[i], "not the radius of a circular orbit: write radii above 3"})
		case !(infinity[i] > 0) || math.IsInf(infinity[i], 0):
			faults = append(faults, TableFault{i + 1, "energy_infinity", infinity[i], "a flux at infinity must be positive"})
		case math.IsNaN(horizon[i]) || math.Abs(horizon[i]) > infinity[i]:
			faults = append(faults, TableFault{i + 1, "energy_horizon", horizon[i], "a flux into the horizon must be finite and smaller than that at infinity"})
		}
	}
	if n < floaterDegree+3 {
		row, v := n, math.NaN()
		if n > 0 {
			v = radius[n-1]
		}
		faults = append(faults, TableFault{row, "orbit.radius", v, "the table ends here, with too few rows to interpolate: write at least 10 radii"})
	}
	if len(faults) > 0 {
		return nil, faults
	}
	sort.SliceStable(order, func(a, b int) bool { return radius[order[a]] > radius[order[b]] })
	f := &FluxTable{}
	for k, i := range order {
		x := 1 / radius[i]
		if k > 0 && x == f.x[k-1] {
			return nil, TableFaults{{i + 1, "orbit.radius", radius[i], "this radius stands in the table twice: keep one row"}}
		}
		f.x = append(f.x, x)
		f.ratio = append(f.ratio, (infinity[i]+horizon[i])/(6.4*math.Pow(x, 5)*PostNewtonian{}.Ratio(x)))
	}
	f.first, f.last = f.x[0], f.x[n-1]
	if f.last < 1/6.5 {
		i := order[n-1]
		return nil, TableFaults{{i + 1, "orbit.radius", radius[i], "the innermost row is too far out to drive a plunge: add radii down to 6 (6.5 at the least)"}}
	}
	f.width = 0.0003
	f.weight = floater(f.x, floaterDegree)
	// a lower degree tells the interpolation error
	low := floater(f.x, floaterDegree-2)
	for k := range n - 1 {
		x := (f.x[k] + f.x[k+1]) / 2
		a, b := rational(f.x, f.ratio, f.weight, x), rational(f.x, f.ratio, low, x)
		f.err = max(f.err, math.Abs(a-b)/math.Abs(a))
	}
	return f, nil
}

// floater returns the weights of the rational interpolant of degree d.
func floater(x []float64, d int) []float64 {
	n := len(x) - 1
	w := make([]float64, n+1)
	for k := range w {
		sum := 0.0
		for i := max(0, k-d); i <= min(k, n-d); i++ {
			prod := 1.0
			for j := i; j <= i+d; j++ {
				if j != k {
					prod /= math.Abs(x[k]-x[j]) * float64(n) / (x[n] - x[0])
				}
			}
			sum += prod
		}
		if (k-d)%2 != 0 {
			sum = -sum
		}
		w[k] = sum
	}
	return w
}

func rational(x, y, w []float64, at float64) float64 {
	var num, den float64
	for k := range x {
		d := at - x[k]
		if d == 0 {
			return y[k]
		}
		c := w[k] / d
		num += c * y[k]
		den += c
	}
	return num / den
}

// Ratio implements Flux.
func (f *FluxTable) Ratio(x float64) float64 {
	at := min(saturate(x, f.last, f.width), f.last)
	// outside the outermost row the torque matters only deep in the plunge,
	// where it is next to nothing: the ratio is held a little beyond that row
	at = -saturate(-at, -0.97*f.first, 0.003*f.first)
	return rational(f.x, f.ratio, f.weight, at) * PostNewtonian{}.Ratio(x)
}

// Range returns the largest and the smallest radius of the table.
func (f *FluxTable) Range() (outer, inner float64) { return 1 / f.first, 1 / f.last }

// Uncertainty implements Flux: the largest relative difference to a rational
// interpolant of a degree lower by two, halfway between rows.
func (f *FluxTable) Uncertainty() float64 { return f.err }

// saturate returns x - w ln(1+e^{(x-end)/w}): x well below end, end well above.
func saturate(x, end, w float64) float64 {
	z := (x - end) / w
	if z > 0 {
		return end - w*math.Log1p(math.Exp(-z))
	}
	return x - w*math.Log1p(math.Exp(z))
}

// Continuation says how the torque of circular orbits is continued through the
// plunge, where no circular orbit goes along with the motion.
type Continuation int

const (
	// FollowFrequency takes the circular flux at the momentary orbital
	// frequency, which peaks at the light ring and falls off behind it.
	FollowFrequency Continuation = iota
	// FreezeAtISCO does the same with x = Omega^(2/3) held, by a smooth
	// saturation, below 1/6 + 0.01, just inside the innermost stable circular
	// orbit.
	FreezeAtISCO
	// SwitchOff is FollowFrequency with the torque taken away smoothly around
	// r = 5 (error function of width 0.25).
	SwitchOff
)

func (c Continuation) String() string {
	switch c {
	case FollowFrequency:
		return "follow-frequency"
	case FreezeAtISCO:
		return "freeze-at-isco"
	case SwitchOff:
		return "switch-off"
	}
	return "unknown"
}

// torque is dL/dt of the particle.
type torque struct {
	nu    float64
	flux  Flux
	after Continuation
}

const (
	freezeAt    = 1.0/6 + 0.01 // r = 5.66 on circular orbits: nothing changes outside r = 6
	freezeWidth = 0.0015
	offRadius   = 5.0
	offWidth    = 0.25
)

func (q *torque) at(r, omega float64) float64 {
	omega = math.Abs(omega)
	x := math.Cbrt(omega * omega)
	if x < 1e-5 {
		return 0 // Omega^(7/3) is below round-off of everything
	}
	switch q.after {
	case FreezeAtISCO:
		x = saturate(x, freezeAt, freezeWidth)
	case SwitchOff:
		z := (offRadius - r) / offWidth
		if z > 6 {
			return 0
		}
		return -q.nu * 6.4 * x * x * x * math.Sqrt(x) * q.flux.Ratio(x) * math.Erfc(z) / 2
	}
	return -q.nu * 6.4 * x * x * x * math.Sqrt(x) * q.flux.Ratio(x)
}
