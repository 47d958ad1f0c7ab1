package totals_test

import (
	"errors"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"nullmark/extract/result"
	"nullmark/extract/signal"
	"nullmark/extract/totals"
)

// hyperbola is the Newtonian quadrupole field of an encounter of semi-latus
// rectum p and eccentricity e >= 1: r h_2m = c d^2/dt^2 of the moments, as
// functions of the true anomaly.
type hyperbola struct{ p, e float64 }

// time since periastron at true anomaly nu, e > 1.
func (h hyperbola) time(nu float64) float64 {
	a := h.p / (h.e*h.e - 1)
	big := 2 * math.Atanh(math.Sqrt((h.e-1)/(h.e+1))*math.Tan(nu/2))
	return math.Pow(a, 1.5) * (h.e*math.Sinh(big) - big)
}

// fields returns Psi and dPsi/du of (2,2) and (2,0): with x = r cos, y = r sin,
// nudot = (1+e cos nu)^2/p^{3/2}, x” = -x/r^3.
func (h hyperbola) fields(nu float64) (psi, rate [2]complex128) {
	r := h.p / (1 + h.e*math.Cos(nu))
	x, y := r*math.Cos(nu), r*math.Sin(nu)
	vx := -math.Sin(nu) / math.Sqrt(h.p)
	vy := (h.e + math.Cos(nu)) / math.Sqrt(h.p)
	r3 := r * r * r
	ax, ay := -x/r3, -y/r3
	rdot := (x*vx + y*vy) / r
	jx := -vx/r3 + 3*x*rdot/(r3*r)
	jy := -vy/r3 + 3*y*rdot/(r3*r)
	// d^2 and d^3 of x_i x_j.
	two := func(a, b, va, vb, aa, ab float64) float64 { return aa*b + 2*va*vb + a*ab }
	three := func(a, b, va, vb, aa, ab, ja, jb float64) float64 { return ja*b + 3*aa*vb + 3*va*ab + a*jb }
	xx2, yy2, xy2 := two(x, x, vx, vx, ax, ax), two(y, y, vy, vy, ay, ay), two(x, y, vx, vy, ax, ay)
	xx3, yy3 := three(x, x, vx, vx, ax, ax, jx, jx), three(y, y, vy, vy, ay, ay, jy, jy)
	xy3 := three(x, y, vx, vy, ax, ay, jx, jy)
	// r h_lm = (1/2) sqrt(24) Psi.
	c22 := math.Sqrt(4*math.Pi/5) / (0.5 * math.Sqrt(24))
	c20 := math.Sqrt(24*math.Pi/5) / 3 / (0.5 * math.Sqrt(24))
	psi[0] = complex(c22*(xx2-yy2), -2*c22*xy2)
	rate[0] = complex(c22*(xx3-yy3), -2*c22*xy3)
	psi[1] = complex(c20*(xx2+yy2), 0)
	rate[1] = complex(c20*(xx3+yy3), 0)
	return psi, rate
}

// loss is the energy and angular momentum of the whole encounter.
//
// Sources: R. O. Hansen, Phys. Rev. D 5, 1021 (1972) and M. Turner, Astrophys.
// J. 216, 610 (1977), hyperbolic encounters (from memory; e = 1 gives the
// parabolic 85 pi/(12 sqrt 2) r_p^{-7/2} and 6 pi/r_p^2).
func (h hyperbola) loss() (energy, angular float64) {
	e, root, ac := h.e, math.Sqrt(h.e*h.e-1), math.Acos(-1/h.e)
	energy = 2. / 15 * math.Pow(h.p, -3.5) * ((96+292*e*e+37*e*e*e*e)*ac + root/3*(602+673*e*e))
	angular = 8. / 5 / (h.p * h.p) * ((8+7*e*e)*ac + root*(13+2*e*e))
	return energy, angular
}

// sample returns the two modes at uniform times in [-t, t], with relative errors
// of the given size.
func (h hyperbola) sample(r *rand.Rand, t, dt, err float64) [2]totals.Field {
	n := int(2*t/dt) + 1
	var out [2]totals.Field
	for i, m := range []int{2, 0} {
		blank := func() signal.Series {
			return signal.Series{Start: -t, Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)}
		}
		out[i] = totals.Field{L: 2, M: m, Psi: blank(), Rate: blank()}
	}
	limit := math.Acos(-1 / h.e)
	shift := complex(1+err*(2*r.Float64()-1), 0)
	nu := 0.0
	for k := range n {
		u := -t + float64(k)*dt
		lo, hi := -limit, limit
		for range 200 {
			nu = (lo + hi) / 2
			if h.time(nu) < u {
				lo = nu
			} else {
				hi = nu
			}
			if hi-lo < 1e-16 {
				break
			}
		}
		psi, rate := h.fields(nu)
		for i := range out {
			out[i].Psi.Values[k] = psi[i] * shift
			out[i].Psi.Err[k] = err * cmplx.Abs(psi[i])
			out[i].Rate.Values[k] = rate[i] * shift
			out[i].Rate.Err[k] = err * cmplx.Abs(rate[i])
		}
	}
	return out
}

// TestHyperbolicBurst: energy and angular momentum of the Newtonian encounter,
// for a population of orbits, samplings and errors.
func TestHyperbolicBurst(t *testing.T) {
	r := rand.New(rand.NewPCG(12, 1))
	inside, idle := 0, 0
	const trials = 40
	for range trials {
		h := hyperbola{p: 8 + 8*r.Float64(), e: 1.3 + r.Float64()}
		e := math.Pow(10, -9+6*r.Float64())
		f := h.sample(r, 700, 0.5+r.Float64(), e)
		var sum result.Flux
		for i := range f {
			x, err := totals.Radiated(f[i], totals.Options{})
			if err != nil {
				t.Fatal(err)
			}
			sum.Energy.Value += x.Energy.Value
			sum.Energy.Error += x.Energy.Error
			sum.AngularMomentum.Value += x.AngularMomentum.Value
			sum.AngularMomentum.Error += x.AngularMomentum.Error
		}
		energy, angular := h.loss()
		for _, c := range []struct {
			q    result.Q
			want float64
		}{{sum.Energy, energy}, {sum.AngularMomentum, angular}} {
			miss := math.Abs(c.q.Value - c.want)
			if miss <= c.q.Error {
				inside++
			} else {
				t.Logf("%+v, error %.1e: %g off by %g with bar %g", h, e, c.want, miss, c.q.Error)
			}
			if c.q.Error > 30*miss {
				idle++
			}
		}
	}
	if inside < 2*trials || idle > trials {
		t.Errorf("%d of %d inside, %d bars idle", inside, 2*trials, idle)
	}
}

func TestRadiatedRefusesAnOpenEnd(t *testing.T) {
	f := hyperbola{p: 10, e: 1.5}.sample(rand.New(rand.NewPCG(1, 1)), 300, 1, 1e-9)[0]
	var open *totals.Open
	if _, err := totals.Radiated(f, totals.Options{From: -300, To: 2}); !errors.As(err, &open) || open.U != 2 {
		t.Errorf("cut in the middle of the burst: %v", err)
	}
	cut, err := totals.Radiated(f, totals.Options{From: 0, To: 300, Cut: true})
	if err != nil {
		t.Fatal(err)
	}
	whole, err := totals.Radiated(f, totals.Options{})
	if err != nil {
		t.Fatal(err)
	}
	// The encounter is symmetric about periastron.
	if d := math.Abs(2*cut.Energy.Value - whole.Energy.Value); d > 2*cut.Energy.Error+whole.Energy.Error || d > 1e-4*whole.Energy.Value {
		t.Errorf("half of the burst: %g of %g", cut.Energy.Value, whole.Energy.Value)
	}
	bad := f
	bad.Psi.Start++
	if _, err := totals.Radiated(bad, totals.Options{}); err == nil {
		t.Error("field and derivative at different times were accepted")
	}
}

// orbit is a sum of harmonics m wphi + n wr with a decaying remainder.
func orbit(r *rand.Rand, dt, until, left float64) (f totals.Field, period, energy, angular float64) {
	const wr, wp, m, l = 0.0210558078, 0.0475982489, 2, 2
	n := int(until / dt)
	f = totals.Field{L: l, M: m,
		Psi:  signal.Series{Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)},
		Rate: signal.Series{Dt: dt, Values: make([]complex128, n), Err: make([]float64, n)}}
	const c = 2 * 24 / (64 * math.Pi)
	for h := -4; h <= 6; h++ {
		w := m*wp + float64(h)*wr
		a := cmplx.Rect(math.Exp(-math.Abs(float64(h))), 6*r.Float64())
		energy += c * real(a*cmplx.Conj(a)) * w * w
		angular += c * m * real(a*cmplx.Conj(a)) * w
		for k := range f.Psi.Values {
			v := a * cmplx.Exp(complex(0, -w*f.Psi.Time(k)))
			f.Psi.Values[k] += v
			f.Rate.Values[k] += v * complex(0, -w)
		}
	}
	p := 6 * r.Float64()
	for k := range f.Psi.Values {
		x := 1 + f.Psi.Time(k)/200
		d := cmplx.Rect(left, p+0.05*f.Psi.Time(k))
		f.Psi.Values[k] += d * complex(math.Pow(x, -4), 0)
		f.Rate.Values[k] += d * complex(-4./200*math.Pow(x, -5), 0.05*math.Pow(x, -4))
		f.Psi.Err[k], f.Rate.Err[k] = 1e-15, 1e-15
	}
	return f, 2 * math.Pi / wr, energy, angular
}

// TestAverages: exact means of a two-frequency signal, to round-off without a
// remainder and inside the bars with one.
func TestAverages(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 9))
	f, period, energy, angular := orbit(r, 0.5, 2000, 0)
	a, err := totals.AverageOptions{Period: period}.Mean(f)
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(a.Flux.Energy.Value/energy-1) > 1e-13 || math.Abs(a.Flux.AngularMomentum.Value/angular-1) > 1e-13 {
		t.Errorf("%+v, want %g, %g", a.Flux, energy, angular)
	}
	inside, idle := 0, 0
	const trials = 60
	for range trials {
		left := math.Pow(10, -2+2*r.Float64())
		f, period, energy, angular := orbit(r, 0.5+r.Float64(), 1500+1500*r.Float64(), left)
		a, err := totals.AverageOptions{From: 200, Period: period, Margin: 4}.Mean(f)
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range []struct {
			q    result.Q
			want float64
		}{{a.Flux.Energy, energy}, {a.Flux.AngularMomentum, angular}} {
			miss := math.Abs(c.q.Value - c.want)
			if miss <= c.q.Error {
				inside++
			}
			if c.q.Error > 100*miss {
				idle++
			}
		}
	}
	if inside < 2*trials*95/100 || idle > trials {
		t.Errorf("%d of %d inside, %d bars idle", inside, 2*trials, idle)
	}
	var short *totals.Short
	if _, err := (totals.AverageOptions{From: 1500, Period: period}).Mean(f); !errors.As(err, &short) {
		t.Errorf("less than two periods: %v", err)
	}
}

func TestDisagreement(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 9))
	f, period, _, _ := orbit(r, 0.5, 1500, 0)
	g, _, _, _ := orbit(rand.New(rand.NewPCG(3, 9)), 0.37, 1480, 0)
	for k := range g.Rate.Values {
		g.Rate.Values[k] *= complex(1, 1e-6)
	}
	d, err := totals.Disagreement(f.Rate, g.Rate, totals.Window(1470, period, 2))
	if err != nil || math.Abs(d/1e-6-1) > 1e-3 {
		t.Errorf("D = %g, %v", d, err)
	}
	if _, err := totals.Disagreement(f.Rate, g.Rate, totals.Window(1499, period, 2)); err == nil {
		t.Error("a window beyond the shorter run was accepted")
	}
}
