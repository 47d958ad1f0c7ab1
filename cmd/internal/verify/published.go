package verify

import (
	_ "embed"
	"encoding/json"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// circularReference is a table of circular orbits on Schwarzschild, computed
// for this project in the frequency domain by a program that shares nothing
// with this one; its origin stands in the file.
//
//go:embed published/circular_schwarzschild.json
var circularReference []byte

// circularOrbit is one orbit of that table. Fluxes count m and -m together.
type circularOrbit struct {
	R0    float64 `json:"r0"`
	Total struct {
		EnergyInfinity float64 `json:"energy_infinity"`
		EnergyHorizon  float64 `json:"energy_horizon"`
	} `json:"total"`
	Modes []circularMode `json:"modes"`
}

// The tables of one eccentric orbit and of a radial fall, of the same making.
//
//go:embed published/eccentric_schwarzschild.json
var eccentricReference []byte

//go:embed published/infall.json
var infallReference []byte

// eccentricOrbit is the orbit of the table. Fluxes are averages per coordinate
// time and count m and -m together; digits are half a unit of the last that is
// printed.
type eccentricOrbit struct {
	P     float64      `json:"p"`
	E     float64      `json:"e"`
	Total eccentricRow `json:"total"`
	Modes []struct {
		L int `json:"l"`
		M int `json:"m"`
		eccentricRow
	} `json:"modes"`
}

type eccentricRow struct {
	EnergyInfinity  json.Number `json:"energy_infinity"`
	AngMomInfinity  json.Number `json:"angular_momentum_infinity"`
	EnergyHorizon   json.Number `json:"energy_horizon"`
	AngMomOfHorizon json.Number `json:"angular_momentum_horizon"`
}

func eccentricTable() eccentricOrbit {
	var table struct {
		Orbits []eccentricOrbit `json:"orbits"`
	}
	if err := json.Unmarshal(eccentricReference, &table); err != nil || len(table.Orbits) != 1 {
		panic(fmt.Sprintf("verify: the embedded table of eccentric orbits: %v", err))
	}
	return table.Orbits[0]
}

func (o eccentricOrbit) mode(l, m int) eccentricRow {
	for _, e := range o.Modes {
		if e.L == l && e.M == m {
			return e.eccentricRow
		}
	}
	panic(fmt.Sprintf("verify: the embedded table of eccentric orbits has no mode (%d,%d)", l, m))
}

// infallEnergy is the energy in l = 2 of the fall from rest at infinity.
func infallEnergy() float64 {
	var table struct {
		PerL []struct {
			L      int     `json:"l"`
			Energy float64 `json:"energy"`
		} `json:"per_l"`
	}
	if err := json.Unmarshal(infallReference, &table); err != nil || len(table.PerL) == 0 || table.PerL[0].L != 2 {
		panic(fmt.Sprintf("verify: the embedded table of the radial fall: %v", err))
	}
	return table.PerL[0].Energy
}

// cited is a printed number with half a unit of its last digit.
func cited(n json.Number) (value, half float64) {
	value, err := n.Float64()
	if err != nil {
		panic(fmt.Sprintf("verify: an embedded table holds %q for a number", n))
	}
	mantissa, exponent, _ := strings.Cut(n.String(), "e")
	_, fraction, _ := strings.Cut(mantissa, ".")
	e, _ := strconv.Atoi(exponent)
	return value, 0.5 * math.Pow(10, float64(e-len(fraction)))
}

type circularMode struct {
	L              int        `json:"l"`
	M              int        `json:"m"`
	EnergyInfinity float64    `json:"energy_infinity"`
	EnergyHorizon  float64    `json:"energy_horizon"`
	Strain         [2]float64 `json:"strain"` // re, im of r h_lm e^{i m phi_p(u)}/mu
}

// referenceOrbit reads the orbit of radius r0 from the table; it panics where
// the table does not have it.
func referenceOrbit(r0 float64) circularOrbit {
	var table struct {
		Orbits []circularOrbit `json:"orbits"`
	}
	if err := json.Unmarshal(circularReference, &table); err != nil {
		panic(fmt.Sprintf("verify: the embedded table of circular orbits: %v", err))
	}
	for _, o := range table.Orbits {
		if o.R0 == r0 {
			return o
		}
	}
	panic(fmt.Sprintf("verify: the embedded table has no circular orbit at %v", r0))
}

func (o circularOrbit) mode(l, m int) circularMode {
	for _, e := range o.Modes {
		if e.L == l && e.M == m {
			return e
		}
	}
	panic(fmt.Sprintf("verify: the embedded table has no mode (%d,%d) at %v", l, m, o.R0))
}

// referenceDigits is the relative accuracy of the embedded table: it gives 15
// digits, all good by its own account.
const referenceDigits = 1e-13

// quadrupole is the leading flux (32/5) v^10 of a circular orbit.
func quadrupole(v float64) float64 { return 32. / 5 * math.Pow(v, 10) }

// Series returns the energy flux at infinity of a test particle on a circular
// orbit around a Schwarzschild hole, divided by (32/5) v^10, through v^11,
// v = r0^(-1/2), and an estimate of what the next even term would add: the
// last even coefficient times its growth over the one before.
//
// H. Tagoshi & M. Sasaki, Prog. Theor. Phys. 92, 745 (1994) through v^8;
// T. Tanaka, H. Tagoshi, M. Sasaki, Prog. Theor. Phys. 96, 1087 (1996) through
// v^11; as printed in M. Sasaki & H. Tagoshi, Living Rev. Relativity 6, 6
// (2003), eqs 174 to 177.
func Series(v float64) (flux, next float64) {
	c := seriesCoefficients(v)
	for k := len(c) - 1; k >= 0; k-- {
		flux = flux*v + c[k]
	}
	return flux, c[10] * c[10] / math.Abs(c[8]) * math.Pow(v, 12)
}

// seriesCoefficients returns the coefficients of v^0 … v^11; those from v^6 on
// contain ln v.
func seriesCoefficients(v float64) [12]float64 {
	const (
		pi    = math.Pi
		gamma = 0.57721566490153286060651209008240243104 // Euler's constant
		ln2   = math.Ln2
		ln3   = 1.0986122886681098 // math.Log(3)
	)
	ln := math.Log(v)
	return [12]float64{
		0: 1,
		2: -1247. / 336,
		3: 4 * pi,
		4: -44711. / 9072,
		5: -8191. / 672 * pi,
		6: 6643739519./69854400 - 1712./105*gamma + 16./3*pi*pi - 3424./105*ln2 - 1712./105*ln,
		7: -16285. / 504 * pi,
		8: -323105549467./3178375200 + 232597./4410*gamma - 1369./126*pi*pi +
			39931./294*ln2 - 47385./1568*ln3 + 232597./4410*ln,
		9: 265978667519./745113600*pi - 6848./105*pi*gamma - 13696./105*pi*ln2 - 6848./105*pi*ln,
		10: -2500861660823683./2831932303200 + 916628467./7858620*gamma - 424223./6804*pi*pi -
			83217611./1122660*ln2 + 47385./196*ln3 + 916628467./7858620*ln,
		11: 8399309750401./101708006400*pi + 177293./1176*pi*gamma + 8521283./17640*pi*ln2 -
			142155./784*pi*ln3 + 177293./1176*pi*ln,
	}
}

// Truncated is Series without its terms beyond v^order (0 to 11).
func Truncated(v float64, order int) float64 {
	c := seriesCoefficients(v)
	sum := 0.0
	for k := order; k >= 0; k-- {
		sum = sum*v + c[k]
	}
	return sum
}
