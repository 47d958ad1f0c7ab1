package compare

import (
	"fmt"
	"math"
	"math/cmplx"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/extract/result"
	"nullmark/extract/table"
	"nullmark/hyperboloidal"
)

// pn55 is the flux at infinity of a test particle on a circular orbit around a
// Schwarzschild hole through 5.5PN, divided by (32/5) v^10: H. Tagoshi and
// M. Sasaki, PTP 92, 745 (1994) and T. Tanaka, H. Tagoshi and M. Sasaki, PTP
// 96, 1087 (1996), as given in M. Sasaki and H. Tagoshi, Living Rev.
// Relativity 6, 6 (2003), eqs 174 to 177.
func pn55(x float64) float64 {
	v := math.Sqrt(x)
	const g, pi = 0.57721566490153286, math.Pi
	ln2, ln3, lv := math.Ln2, math.Log(3), math.Log(v)
	c := []float64{1, 0, -1247. / 336, 4 * pi, -44711. / 9072, -8191. / 672 * pi,
		6643739519./69854400 - 1712./105*g + 16./3*pi*pi - 3424./105*ln2 - 1712./105*lv,
		-16285. / 504 * pi,
		-323105549467./3178375200 + 232597./4410*g - 1369./126*pi*pi + 39931./294*ln2 - 47385./1568*ln3 + 232597./4410*lv,
		265978667519./745113600*pi - 6848./105*pi*g - 13696./105*pi*ln2 - 6848./105*pi*lv,
		-2500861660823683./2831932303200 + 916628467./7858620*g - 424223./6804*pi*pi - 83217611./1122660*ln2 + 47385./196*ln3 + 916628467./7858620*lv,
		8399309750401./101708006400*pi + 177293./1176*pi*g + 8521283./17640*pi*ln2 - 142155./784*pi*ln3 + 177293./1176*pi*lv}
	s := 0.0
	for k := len(c) - 1; k >= 0; k-- {
		s = s*v + c[k]
	}
	return s
}

// circular is the orbit r = 10 with the strain of five modes and the total
// fluxes as computed by a frequency-domain method (Leaver's continued
// fraction, 33 digits and more); what those modes lack stands in Truncation.
func circular() *result.Bundle {
	omega := math.Pow(10, -1.5)
	q := func(x float64) result.Q { return result.Q{Value: x, Error: 1e-9 * x} }
	flux := func(e float64) *result.Flux {
		return &result.Flux{Energy: q(e), AngularMomentum: q(e / omega)}
	}
	b := &result.Bundle{Series: &result.Series{U: grid(0, 600, 0.5), JunkUntil: 100}, Result: &result.Result{
		Orbit: &result.Orbit{Kind: "circular", Numbers: map[string]float64{"omega_phi": omega}},
		Total: &result.Total{Measure: "rate", Infinity: flux(6.150372549041e-5), Horizon: flux(1.259129423e-8)},
	}}
	sum := 0.0
	for _, m := range []struct {
		l, m int
		h    complex128
		e    float64
	}{
		{2, 1, 0.013594004 + 0.068336424i, 1.931609351e-7},
		{2, 2, -0.560320396 + 0.152880419i, 5.368795479e-5},
		{3, 2, -0.016204208 + 0.006225749i, 0},
		{3, 3, -0.059153776 - 0.120190845i, 6.426082756e-6},
		{4, 4, 0.031365476 - 0.022686644i, 9.539600395e-7},
	} {
		s := result.ModeSeries{L: m.l, M: m.m}
		w := float64(m.m) * omega
		for _, u := range b.Series.U {
			s.Wave = append(s.Wave, m.h*cmplx.Exp(complex(0, -w*u)))
			s.WaveErr = append(s.WaveErr, 2e-9*cmplx.Abs(m.h))
		}
		b.Series.Modes = append(b.Series.Modes, s)
		sum += w * w * sq(m.h) / (8 * math.Pi)
		if m.e > 0 {
			b.Result.Modes = append(b.Result.Modes, result.Mode{L: m.l, M: m.m, Measure: "rate", Counts: "both signs of m", Met: true, Infinity: flux(m.e)})
		}
	}
	rest := 6.150372549041e-5 - sum
	b.Result.Total.Truncation = &result.Truncation{Infinity: &result.Flux{Energy: result.Q{Value: rest, Error: 1e-13}, AngularMomentum: result.Q{Value: rest / omega, Error: 1e-13 / omega}}}
	for _, t := range grid(-50, 700, 0.5) {
		b.Series.T, b.Series.R, b.Series.Phi = append(b.Series.T, t), append(b.Series.R, 10), append(b.Series.Phi, omega*t)
	}
	return b
}

// For a circular geodesic whose force is the 5.5PN flux the residual is
// (measured - 5.5PN), and the instantaneous flux of the strain is the flux.
func TestBalanceOfCircularOrbit(t *testing.T) {
	b := circular()
	x := 0.1
	f := &Force{T: b.Series.T}
	pn := newtonian("energy", x) * pn55(x)
	for range f.T {
		f.EnergyRate = append(f.EnergyRate, -pn)
		f.AngMomRate = append(f.AngMomRate, pn*math.Pow(10, 1.5))
	}
	c := mustCompare(t, Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f})
	bal := c.Balance
	want := pn - 6.150372549041e-5 - 1.259129423e-8
	for _, q := range append([]result.Q{bal.Energy.Average.Residual}, bal.Energy.Residual...) {
		if math.Abs(q.Value-want) > q.Error || q.Error > 1e-11 {
			t.Fatalf("residual %v, want %v", q, want)
		}
	}
	if l := bal.AngMom.Average.Residual; math.Abs(l.Value-want*math.Pow(10, 1.5)) > l.Error {
		t.Errorf("angular momentum: %v", l)
	}
	if bal.Verdict != result.Differs || !strings.Contains(bal.Note, "read as the orbit's own change") {
		t.Errorf("%s %s", bal.Sentence, bal.Note)
	}
	// The right force balances, also when E and L are given instead of rates.
	loss := 6.150372549041e-5 + 1.259129423e-8
	f = &Force{T: f.T}
	for _, s := range f.T {
		f.Energy = append(f.Energy, 0.96-0.25*loss*s)
		f.AngMom = append(f.AngMom, 3.8-0.25*loss*math.Pow(10, 1.5)*s)
	}
	if _, _, err := Compare(Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f}); err == nil || !strings.Contains(err.Error(), "write model.mass_ratio") {
		t.Errorf("constants without a mass ratio: %v", err)
	}
	f.MassRatio = 0.25
	// Differentiating numbers near 1 at half a unit of time costs digits: the
	// averages agree to 1e-10 of the flux, single samples to about 1e-11/1e-5.
	c = mustCompare(t, Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f})
	if a := c.Balance.Energy.Average; math.Abs(a.Residual.Value) > a.Residual.Error {
		t.Errorf("the right losses: %+v", a)
	}
}

// The horizon's share comes from the master functions there, at the advanced
// time of the same emission. On a slowly growing signal the two sides agree
// only if du, dv and dt are told apart.
func TestBalanceAtBothEnds(t *testing.T) {
	b := &result.Bundle{Result: &result.Result{Orbit: &result.Orbit{Kind: "circular"}}, Series: &result.Series{U: grid(0, 400, 0.5), V: grid(0, 460, 0.5), HorizonPrefix: "psi"}}
	path := func(t float64) float64 { return 20 - 0.02*t }
	for _, x := range grid(-30, 500, 0.5) {
		b.Series.T, b.Series.R = append(b.Series.T, x), append(b.Series.R, path(x))
	}
	const w, k = 0.2, 1e-3
	grow := func(x float64) complex128 { return cmplx.Exp(complex(k*x, -w*x)) }
	s := result.ModeSeries{L: 2, M: 2}
	for _, u := range b.Series.U {
		s.Wave, s.WaveErr = append(s.Wave, 0.5*grow(u)), append(s.WaveErr, 1e-10)
	}
	for _, v := range b.Series.V {
		s.Horizon, s.HorizonErr = append(s.Horizon, 0.1*grow(v)), append(s.HorizonErr, 1e-11)
	}
	b.Series.Modes = []result.ModeSeries{s}
	f := &Force{T: b.Series.T}
	for _, x := range f.T {
		r := path(x)
		rs := hyperboloidal.TortoiseAt(r)
		drs := -0.02 * r / (r - 2)
		u, v := x-rs, x+rs
		inf := 0.25 * math.Exp(2*k*u) * (w*w + k*k) / (8 * math.Pi)
		hor := 24 * 0.01 * math.Exp(2*k*v) * (w*w + k*k) / (32 * math.Pi)
		f.EnergyRate = append(f.EnergyRate, inf*(1-drs)+hor*(1+drs))
	}
	c := mustCompare(t, Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f, MasterHorizon: true})
	if c.Balance.Verdict != result.Inside {
		t.Error(c.Balance.Sentence)
	}
	if q := c.Balance.Energy.Residual[10]; q.Error > 1e-9*0+1e-10 {
		t.Errorf("bar of the residual: %v", q)
	}
	for i := range f.EnergyRate {
		f.EnergyRate[i] *= 1 + 1e-6
	}
	c = mustCompare(t, Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f, MasterHorizon: true})
	if c.Balance.Verdict != result.Differs || !strings.Contains(c.Balance.Sentence, "+1.00e-4") {
		t.Error(c.Balance.Sentence)
	}
}

// A driven inspiral balances up to the last stable orbit, with what is not known
// of the time of emission in the bar and the largest l's tail added; a rate per
// mu is noticed.
func TestBalanceOfAnInspiral(t *testing.T) {
	const isco, k, w = 300.0, 2e-4, 0.12
	b := &result.Bundle{Result: &result.Result{Orbit: &result.Orbit{Kind: "inspiral", Markers: map[string]float64{"isco": isco, "light_ring": 380}},
		Total: &result.Total{Measure: "total"}}, Series: &result.Series{U: grid(0, 450, 0.5)}}
	for _, x := range grid(-30, 500, 0.5) {
		b.Series.T, b.Series.R = append(b.Series.T, x), append(b.Series.R, 6)
	}
	// Amplitudes by l fall by ten in power: the sum over all l is 1.111… of l = 2.
	for l := 2; l <= 5; l++ {
		for m := 1; m <= l; m++ {
			s := result.ModeSeries{L: l, M: m}
			a := math.Pow(10, -float64(l-2)/2) / float64(m) / math.Sqrt(float64(l))
			for _, u := range b.Series.U {
				h := complex(a*math.Exp(k*u), 0) * cmplx.Exp(complex(0, -float64(m)*w*u))
				s.Wave, s.WaveErr = append(s.Wave, h), append(s.WaveErr, 1e-12)
			}
			b.Series.Modes = append(b.Series.Modes, s)
		}
	}
	f := &Force{T: b.Series.T, MassRatio: 1e-3}
	r6 := hyperboloidal.TortoiseAt(6)
	for _, x := range f.T {
		e := math.Exp(2*k*(x-r6)) / (8 * math.Pi)
		sum := 0.0
		for l := 2; l <= 5; l++ {
			for m := 1; m <= l; m++ {
				a := math.Pow(10, -float64(l-2)/2) / float64(m) / math.Sqrt(float64(l))
				sum += a * a * (float64(m*m)*w*w + k*k)
			}
		}
		sum += sum / 1.111 * 1e-4 / 0.9
		f.EnergyRate = append(f.EnergyRate, e*sum)
	}
	in := Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f}
	bal := mustCompare(t, in).Balance
	last := bal.Energy.U[len(bal.Energy.U)-1]
	if bal.Verdict != result.Inside || last > isco-r6 || last < isco-r6-1 || !strings.Contains(bal.Note, "last stable orbit") || !strings.Contains(bal.Note, "beyond the largest l") {
		t.Errorf("%s %s to u = %v", bal.Sentence, bal.Note, last)
	}
	// The label's bar is 2 k r_* of the loss.
	q, loss := bal.Energy.Residual[100], bal.Energy.Model[100].Value
	if want := loss * (math.Exp(2*k*r6) - 1); math.Abs(q.Error/want-1) > 0.01 || math.Abs(q.Value) > 1e-6*loss {
		t.Errorf("residual %v, want the bar %v", q, want)
	}
	for i := range f.EnergyRate {
		f.EnergyRate[i] *= 0.95
	}
	if bal = mustCompare(t, in).Balance; bal.Verdict != result.Differs || !strings.Contains(bal.Sentence, "energy by -5") {
		t.Errorf("%s", bal.Sentence)
	}
	for i := range f.EnergyRate {
		f.EnergyRate[i] *= 1e-3 / 0.95
	}
	if bal = mustCompare(t, in).Balance; !strings.Contains(bal.Note, "as if it were per mu") {
		t.Errorf("%s", bal.Note)
	}
}

// Averages are over whole radial periods, two at least.
func TestWholePeriods(t *testing.T) {
	u := grid(100, 1000, 0.5)
	for period, want := range map[float64]int{0: len(u), 200: 1601, 449: 1797, 500: 0} {
		n, ok := periods(u, &result.Orbit{Kind: "eccentric", Numbers: map[string]float64{"period_r": period}})
		if n != want || ok != (want > 0) {
			t.Errorf("period %v: %d samples, %v; want %d", period, n, ok, want)
		}
	}
	b := circular()
	b.Result.Orbit.Kind, b.Result.Orbit.Numbers["period_r"] = "eccentric", 300
	f := &Force{T: b.Series.T, EnergyRate: make([]float64, len(b.Series.T))}
	_, _, err := Compare(Input{Reference: b, Tortoise: hyperboloidal.TortoiseAt, Force: f})
	if err == nil || !strings.Contains(err.Error(), "less than two radial periods of 300 M") {
		t.Errorf("%v", err)
	}
}

// The 5.5PN curve against a sweep of certified orbits, r = 6 and 10 of the
// frequency-domain method, and a run against itself.
func TestFluxCurve(t *testing.T) {
	var f FluxInput
	for x := 0.05; x < 0.18; x += 0.001 {
		f.X = append(f.X, x)
	}
	total, mode := FluxColumn{}, FluxColumn{L: 2, M: 2}
	for _, x := range f.X {
		total.Energy = append(total.Energy, newtonian("energy", x)*pn55(x))
		mode.Energy = append(mode.Energy, 5.368795479e-5*math.Pow(x/0.1, 5))
	}
	f.Columns = []FluxColumn{total, mode}
	f.Context = []Expansion{{"5.5PN", pn55}}
	q := func(v float64) result.Q { return result.Q{Value: v, Error: 1e-9 * v} }
	f.Rows = []FluxRow{{X: 1. / 6, Energy: q(9.372704107e-4)}, {X: 0.1, Energy: q(6.150372549041e-5)}, {X: 0.02, Energy: q(2e-8)}}
	c := mustCompare(t, Input{Reference: circular(), Flux: &f})
	r := c.Flux.Curves[0].Ratio
	if len(c.Flux.Curves) != 1 || len(r) != 2 {
		t.Fatalf("curves %+v", c.Flux.Curves)
	}
	for i, x := range []float64{1. / 6, 0.1} {
		want := newtonian("energy", x) * pn55(x) / f.Rows[i].Energy.Value
		if math.Abs(r[i].Value-want) > r[i].Error || r[i].Error > 2e-9 {
			t.Errorf("x = %v: ratio %v, want %v", x, r[i], want)
		}
	}
	if c.Flux.Verdict != result.Differs || !strings.Contains(c.Flux.Sentence, "1 certified value lie") && !strings.Contains(c.Flux.Sentence, "outside") {
		t.Error(c.Flux.Sentence)
	}
	if own := c.Flux.Model[0]; len(c.Flux.Model) != 1 || len(own.X) != len(f.X) || math.Abs(own.Newtonian[3].Value-pn55(f.X[3])) > 1e-14 {
		t.Errorf("the model's own curve: %+v", own)
	}
	if g := c.Flux.Context[0]; len(g.Newtonian) != 61 || math.Abs(g.Newtonian[0].Value-pn55(f.X[0])) > 1e-15 {
		t.Errorf("context %+v", g)
	}
	f.Rows = nil
	c = mustCompare(t, Input{Reference: circular(), Flux: &f})
	if len(c.Flux.Curves) != 2 || math.Abs(c.Flux.Curves[1].Ratio[0].Value-1) > 1e-8 {
		t.Errorf("the run itself: %+v", c.Flux.Curves)
	}
}

// Two results: the bars of both count, numbers are set against each other.
func TestTwoResults(t *testing.T) {
	a, b := reference(someModes, 1e-8, nil), reference(someModes, 1e-9, nil)
	for i := range a.Series.Modes {
		for k := range a.Series.Modes[i].Wave {
			a.Series.Modes[i].Wave[k] *= 1 + 5e-9
		}
	}
	q := func(v, e float64) result.Q { return result.Q{Value: v, Error: e} }
	a.Result.Modes[0].Infinity = &result.Flux{Energy: q(1, 1e-3), AngularMomentum: q(2, 1e-3)}
	b.Result.Modes[0].Infinity = &result.Flux{Energy: q(1.0015, 1e-3), AngularMomentum: q(2.01, 1e-3)}
	w, err := FromResult(a)
	if err != nil {
		t.Fatal(err)
	}
	c := mustCompare(t, Input{Reference: b, Model: w, Numbers: a.Result})
	if c.Overall.Verdict != result.Inside {
		t.Error(c.Overall.Sentence)
	}
	if len(c.Numbers) != 2 || c.Numbers[0].Verdict != result.Inside || c.Numbers[1].Verdict != result.Differs || math.Abs(c.Numbers[0].Difference.Error-2e-3) > 1e-15 {
		t.Errorf("%+v", c.Numbers)
	}
	// Totals over other stretches of time say nothing about each other.
	for i, r := range []*result.Result{a.Result, b.Result} {
		r.Modes[0].Measure = "total"
		r.Conventions = map[string]string{"totals": fmt.Sprint("from u = ", i)}
	}
	if c = mustCompare(t, Input{Reference: b, Model: w, Numbers: a.Result}); len(c.Numbers) != 0 || !strings.Contains(strings.Join(c.Warnings, " "), "different stretches") {
		t.Errorf("%+v %q", c.Numbers, c.Warnings)
	}
}

func openTable(t *testing.T, name string) *table.Table {
	t.Helper()
	tab, err := table.Open(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { tab.Close() })
	return tab
}

// A circular waveform at r = 10 written by numpy (testdata/make.py), in double
// and in single precision, as complex arrays and as two real ones, against the
// frequency-domain strain.
func TestFileWaveform(t *testing.T) {
	for _, c := range []struct {
		file, time string
		modes      []ModeColumns
		verdict    string
		notes      int
	}{
		{"circular.npz", "u", []ModeColumns{{3, 3, []string{"re33", "im33"}}, {2, 2, []string{"h22"}}}, result.Inside, 0},
		{"circular.csv", "u", []ModeColumns{{2, 2, []string{"re22", "im22"}}}, result.Inside, 0},
		{"single.npz", "u", []ModeColumns{{2, 2, []string{"h22"}}}, result.CannotTell, 2},
	} {
		w, err := NewFileWaveform(openTable(t, c.file), c.time, c.modes)
		if err != nil {
			t.Fatal(err)
		}
		b := circular()
		b.Result.Accuracy = result.Accuracy{Asked: 1e-8, Met: true}
		cmp := mustCompare(t, Input{Reference: b, Model: w})
		if cmp.Overall.Verdict != c.verdict || cmp.Modes[0].L != 2 {
			t.Errorf("%s: %s", c.file, cmp.Overall.Sentence)
		}
		if len(cmp.Warnings)-1 != c.notes { // one warning names the modes left out
			t.Errorf("%s: warnings %q", c.file, cmp.Warnings)
		}
	}
	for _, c := range []struct {
		file, time string
		modes      []ModeColumns
		want       string
	}{
		{"circular.npz", "time", []ModeColumns{{2, 2, []string{"h22"}}}, `circular.npz: column "time": is not there`},
		{"circular.npz", "u", []ModeColumns{{2, 2, []string{"h23"}}}, `column "h23": is not there`},
		{"circular.npz", "u", []ModeColumns{{2, 2, []string{"short"}}}, `column "short": has 3 rows where the time column "u" has`},
		{"circular.npz", "u", []ModeColumns{{2, 2, []string{"re33"}}}, `holds real numbers where the mode (2,2) is complex`},
		{"circular.npz", "u", []ModeColumns{{2, 2, []string{"h22", "re33"}}}, `holds complex numbers where a real or imaginary part`},
		{"circular.npz", "u", []ModeColumns{{1, 1, []string{"h22"}}}, `names the mode (1,1)`},
		{"circular.npz", "u", []ModeColumns{{2, 2, []string{"h22"}}, {2, 2, []string{"h22"}}}, `(2,2) twice`},
		{"circular.npz", "back", []ModeColumns{{2, 2, []string{"h22"}}}, `column "back": row 1: does not increase`},
		{"seconds.csv", "t", []ModeColumns{{2, 2, []string{"re22", "im22"}}}, `is in the unit "s"; write times in units of the hole's mass M`},
		{"circular.npz", "u", nil, `names no mode`},
	} {
		_, err := NewFileWaveform(openTable(t, c.file), c.time, c.modes)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v: %v, want %q", c.modes, err, c.want)
		}
	}
}
