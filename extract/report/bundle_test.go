package report

import (
	"math"
	"math/cmplx"

	"nullmark/extract/result"
)

// circularNumbers are the energy at null infinity, the energy at the horizon
// (both counting m and -m) and the complex strain of a circular orbit at
// r = 10 M on Schwarzschild. Origin: computed for this project in the frequency
// domain (Teukolsky s = -2, horizon Frobenius and large-r asymptotic series),
// typed here rounded; they only make the page realistic, nothing is checked
// against them.
func circularNumbers() [][6]float64 {
	return [][6]float64{
		{2, 1, 1.931609351e-07, 1.226917e-09, 0.0135940041, 0.068336424},
		{2, 2, 5.368795479e-05, 1.130828e-08, -0.560320396, 0.152880419},
		{3, 1, 5.714898913e-10, 3.161362e-12, 0.000849779093, 0.00369337015},
		{3, 2, 4.795916462e-08, 5.762435e-12, -0.0162042083, 0.00622574908},
		{3, 3, 6.426082756e-06, 4.689615e-11, -0.0591537758, -0.120190845},
		{4, 1, 1.457585642e-13, 2.647167e-15, 1.49668405e-05, 5.86455963e-05},
		{4, 2, 5.262245309e-10, 2.685853e-14, -0.00166981196, 0.000719787651},
		{4, 3, 8.778757525e-09, 2.509681e-14, -0.00251209982, -0.00426664625},
		{4, 4, 9.539600395e-07, 2.239545e-13, 0.0313654762, -0.0226866443},
		{5, 1, 2.367637187e-16, 1.259623e-17, 6.37668352e-07, 2.35454886e-06},
		{5, 2, 3.819353237e-13, 2.366809e-17, -4.43247281e-05, 2.08587846e-05},
		{5, 3, 1.829101325e-10, 1.610957e-16, -0.000390401603, -0.000598638485},
		{5, 4, 1.492116275e-09, 1.096793e-16, 0.00117621273, -0.000979966519},
		{5, 5, 1.524154765e-07, 1.111778e-15, 0.00878588089, 0.00871969301},
		{6, 1, 3.59779536e-20, 1.285153e-20, 8.21962406e-09, 2.89251167e-08},
		{6, 2, 1.976368954e-15, 1.337797e-19, -3.15183345e-06, 1.57601975e-06},
		{6, 3, 2.123882748e-13, 1.391854e-19, -1.40767445e-05, -1.98732286e-05},
		{6, 4, 4.663339885e-11, 8.774842e-19, 0.00019913301, -0.000183296524},
		{6, 5, 2.474638695e-10, 4.871658e-19, 0.000376506093, 0.000327140608},
		{6, 6, 2.518213157e-08, 5.611113e-18, -0.00243999558, 0.00340981904},
		{7, 1, 3.291362949e-23, 7.351195e-23, 2.57172203e-10, 8.72394516e-10},
		{7, 2, 9.084150891e-19, 1.365006e-22, -6.68630306e-08, 3.51720838e-08},
		{7, 3, 2.037362751e-15, 8.993118e-22, -1.43695651e-06, -1.90382406e-06},
		{7, 4, 6.99409365e-14, 7.235905e-22, 7.40440944e-06, -7.41873891e-06},
		{7, 5, 1.034098913e-11, 4.618257e-21, 8.03357026e-05, 6.27859144e-05},
		{7, 6, 4.067994809e-11, 2.201131e-21, -8.88955043e-05, 0.000143169657},
		{7, 7, 4.234522671e-09, 2.857013e-20, -0.00131931333, -0.000656775776},
		{8, 1, 3.157712224e-27, 8.040899e-26, 2.59265322e-12, 8.52291696e-12},
		{8, 2, 2.714359109e-21, 8.469639e-25, -3.62155509e-09, 1.98473172e-09},
		{8, 3, 1.617345419e-18, 8.975538e-25, -4.18957378e-08, -5.25473842e-08},
		{8, 4, 1.008519521e-15, 5.222076e-24, 8.57389879e-07, -9.21445253e-07},
		{8, 5, 1.804558413e-14, 3.596414e-24, 3.47141313e-06, 2.46793248e-06},
		{8, 6, 2.127148041e-12, 2.398318e-23, -1.85330753e-05, 3.37868998e-05},
		{8, 7, 6.66826372e-12, 1.009624e-23, -5.3940967e-05, -2.25967211e-05},
		{8, 8, 7.192413192e-10, 1.462301e-22, 0.000158819871, -0.000507170242},
	}
}

// circular is a bound orbit with everything that such a run has. The bars, the
// start-up and the evidence are invented.
func circular() *result.Bundle {
	const omega, radius = 0.0316227766016838, 10.0
	r := &result.Result{
		Schema: result.Schema,
		Title:  "Circular orbit at r = 10",
		Case:   map[string]any{"title": "Circular orbit at r = 10", "orbit": map[string]any{"kind": "circular", "radius": 10}, "accuracy": map[string]any{"relative": 1e-9}},
		Conventions: map[string]string{
			"strain":        "h = h+ − i hx = (1/r) Σ h_lm(u) −2Y_lm, spherical harmonics",
			"time":          "u = t − r*, r* = r + 2 ln(r/2 − 1)",
			"flux_sign":     "positive leaves the orbit",
			"phase":         "r h e^{i m φp(u)}/μ, φp the particle's own phase",
			"normalisation": "Zerilli–Moncrief and Cunningham–Price–Moncrief master functions",
		},
		Provenance: result.Provenance{Version: "0.1.0", Commit: "0123456789ab", Go: "go1.26", Host: "amd64", Start: "2026-01-02T03:04:05Z", Seconds: 12.3, CoreSeconds: 23.9, PeakMemoryBytes: 91e6, Workers: 2},
		Orbit: &result.Orbit{Kind: "circular", Energy: 0.956182887467515, AngMom: 3.77964473009227,
			Numbers: map[string]float64{"radius": radius, "omega_phi": omega, "period_phi": 2 * math.Pi / omega, KeyHorizon: 2, KeyLightRing: 3, KeyISCO: 6}},
		Total: &result.Total{Measure: "rate",
			Infinity:   &result.Flux{Energy: result.Q{Value: 6.150372549e-5, Error: 4.3e-13}, AngularMomentum: result.Q{Value: 1.944918560e-3, Error: 1.4e-11}},
			Horizon:    &result.Flux{Energy: result.Q{Value: 1.259129423e-8, Error: 2.1e-17}, AngularMomentum: result.Q{Value: 3.98171685e-7, Error: 6.6e-16}},
			Truncation: &result.Truncation{LMax: 8, Infinity: &result.Flux{Energy: result.Q{Value: 1.476e-10, Error: 4.1e-13}, AngularMomentum: result.Q{Value: 4.67e-9, Error: 1.3e-11}}, Horizon: &result.Flux{Energy: result.Q{Value: 7.3e-25, Error: 2e-26}, AngularMomentum: result.Q{Value: 2.3e-23, Error: 6.5e-25}}, Note: "Geometric continuation of the last sums over m; at the horizon it is far below the bar."}},
		Rungs: []result.Rung{
			{Modes: "l = 2 to 4", Points: 241, Dx: 0.4, Dt: 0.2, Kernel: 0.64, Moments: 12, Order: 12, Until: 640, CoreSeconds: 3.1},
			{Modes: "all", Points: 301, Dx: 0.32, Dt: 0.16, Kernel: 0.512, Moments: 12, Order: 12, Until: 700, CoreSeconds: 8.2},
			{Modes: "l = 5 to 8", Points: 376, Dx: 0.256, Dt: 0.128, Kernel: 0.41, Moments: 12, Order: 12, Until: 700, CoreSeconds: 12.6},
		},
		Accuracy: result.Accuracy{Asked: 1e-9, Floor: 1e-14, Met: false, Worst: result.Worst{L: 8, M: 1, What: "energy at the horizon", Relative: 3.2e-8}},
		Warnings: []string{"The horizon number of mode (8,1) is held to the floor of 1e-14 of the largest mode."},
	}
	s := &result.Series{Prefix: "h", HorizonPrefix: "psi", JunkUntil: 210}
	for u := 0.0; u <= 700; u += 0.5 {
		s.U = append(s.U, u)
		s.V = append(s.V, u)
		s.T = append(s.T, u)
		s.R = append(s.R, radius)
		s.Phi = append(s.Phi, omega*u)
	}
	for i, n := range circularNumbers() {
		l, m := int(n[0]), int(n[1])
		rel := 1.3e-10 * (1 + 0.4*math.Sin(3*float64(i)))
		met, why := true, ""
		if l == 8 && m == 1 {
			met, why = false, "round-off floor at the horizon"
		}
		parity := "even"
		if (l+m)%2 == 1 {
			parity = "odd"
		}
		flux := func(e, rel float64) *result.Flux {
			a := e / omega
			return &result.Flux{Energy: result.Q{Value: e, Error: rel * e}, AngularMomentum: result.Q{Value: a, Error: rel * a}}
		}
		z := complex(n[4], n[5])
		size := cmplx.Abs(z)
		r.Modes = append(r.Modes, result.Mode{L: l, M: m, Parity: parity, Measure: "rate", Counts: "both signs of m",
			Infinity: flux(n[2], 2*rel), Horizon: flux(n[3], 9*rel),
			Strain: &result.Complex{Re: result.Q{Value: n[4], Error: rel * size}, Im: result.Q{Value: n[5], Error: rel * size}},
			Met:    met, Why: why, Rung: 1 + l/5,
			Budget: map[string]float64{"discretisation": rel * 0.5, "transient": rel * (0.4 + 0.1*float64(m)), "round-off": 3e-13 * float64(l)}})
		series := result.ModeSeries{L: l, M: m}
		for k, u := range s.U {
			ramp := 0.5 * (1 + math.Erf((u-60)/20))
			junk := 3 * size * math.Exp(-math.Pow((u-70)/18, 2))
			w := z*cmplx.Exp(complex(0, -float64(m)*omega*u))*complex(ramp, 0) + complex(junk*math.Cos(0.4*u), junk*math.Sin(0.37*u))
			series.Wave = append(series.Wave, w)
			series.WaveErr = append(series.WaveErr, size*(rel+3e-4*math.Exp(-u/25)))
			series.Horizon = append(series.Horizon, w*1e-3)
			series.HorizonErr = append(series.HorizonErr, size*rel*1e-3)
			series.Evidence = append(series.Evidence, size*(rel*0.3*(1.1+math.Sin(0.2*u+float64(k%7)))+1e-4*math.Exp(-u/20)))
		}
		s.Modes = append(s.Modes, series)
	}
	return &result.Bundle{Result: r, Series: s}
}

// plunge is an unbound motion with totals, peaks and recoil; every number in
// it is invented.
func plunge() *result.Bundle {
	r := &result.Result{Schema: result.Schema, Title: "Plunge from r = 7", Conventions: map[string]string{"time": "u = t − r*"},
		Orbit: &result.Orbit{Kind: "inspiral", Energy: 0.94, AngMom: 3.45, Numbers: map[string]float64{"mass_ratio": 1e-3, KeyHorizon: 2, KeyLightRing: 3, KeyISCO: 6},
			Markers: map[string]float64{"isco": 1700, "light_ring": 1950, "horizon": 2010, "peak_orbital_frequency": 1951}},
		Total: &result.Total{Measure: "total", Infinity: &result.Flux{Energy: result.Q{Value: 0.4761, Error: 0.0007}, AngularMomentum: result.Q{Value: 3.51, Error: 0.01}},
			Recoil: &result.Recoil{X: result.Q{Value: -0.0212, Error: 3e-4}, Y: result.Q{Value: 0.0391, Error: 3e-4}, Speed: result.Q{Value: 0.0445, Error: 4e-4}}},
		Accuracy: result.Accuracy{Asked: 1e-6, Met: true, Worst: result.Worst{L: 2, M: 1, What: "strain at null infinity", Relative: 8.8e-7}},
	}
	s := &result.Series{Prefix: "h", JunkUntil: 150}
	phi := 0.0
	for t := 0.0; t <= 2200; t += 0.5 {
		s.U = append(s.U, t)
		if t < 2010 {
			rad := 2 + 5*math.Pow(1-t/2010, 0.25)
			phi += 0.5 / math.Pow(rad, 1.5)
			s.T, s.R, s.Phi = append(s.T, t), append(s.R, rad), append(s.Phi, phi)
		}
	}
	for _, n := range [][3]float64{{2, 2, 1.45}, {2, 1, 0.5}, {3, 3, 0.55}, {4, 4, 0.28}, {2, 0, 0.01}} {
		l, m, top := int(n[0]), int(n[1]), n[2]
		q := func(v float64) result.Q { return result.Q{Value: v, Error: 3e-7 * math.Abs(v)} }
		delay := q(-2.8 + float64(l))
		mode := result.Mode{L: l, M: m, Measure: "total", Counts: "both signs of m", Met: true, Rung: 0,
			Infinity: &result.Flux{Energy: q(0.2 * top * top), AngularMomentum: q(1.5 * top * top * float64(m))}}
		if m > 0 {
			mode.Peak = &result.Peak{U: q(1950 + float64(l)), Amplitude: q(top), Frequency: q(0.137 * float64(m)), AmplitudeCurvature: q(-1e-3 * top), FrequencySlope: q(6e-3), Delay: &delay,
				AtLightRing: map[string]result.Q{"amplitude": q(0.99 * top), "frequency": q(0.136 * float64(m))}}
		}
		r.Modes = append(r.Modes, mode)
		series := result.ModeSeries{L: l, M: m}
		ph := 0.0
		for _, u := range s.U {
			rise := math.Pow(0.05+0.95/(1+math.Exp((1930-u)/60)), 0.5)
			if u > 1950 {
				rise = math.Exp(-0.089 * (u - 1950))
			}
			w := 0.055 + 0.083/(1+math.Exp((1930-u)/25))
			ph += 0.5 * w * float64(m)
			series.Wave = append(series.Wave, cmplx.Rect(top*rise, -ph))
			series.WaveErr = append(series.WaveErr, 3e-7*top)
		}
		s.Modes = append(s.Modes, series)
	}
	return &result.Bundle{Result: r, Series: s}
}

// spinning is a bound orbit on Kerr: sums over l at each m, a horizon that
// gives energy back, no strain and no series.
func spinning() *result.Bundle {
	flux := func(e float64) *result.Flux {
		return &result.Flux{Energy: result.Q{Value: e, Error: math.Abs(e) * 2e-8}, AngularMomentum: result.Q{Value: 15 * e, Error: math.Abs(e) * 3e-7}}
	}
	return &result.Bundle{Result: &result.Result{Title: "Circular orbit on a spinning hole",
		Modes: []result.Mode{{L: 2, M: 2, Measure: "rate", Counts: "both signs of m", Infinity: flux(4.3e-4), Horizon: flux(-4.1e-6), Met: true},
			{L: 3, M: 3, Measure: "rate", Counts: "both signs of m", Infinity: flux(8.9e-5), Met: true}},
		PerM:     []result.PerM{{M: 1, Infinity: flux(2e-6), Horizon: flux(-1e-7), LConverged: true}, {M: 2, Infinity: flux(4.4e-4), Horizon: flux(-4.1e-6)}},
		Total:    &result.Total{Measure: "rate", Infinity: flux(5.66e-4), Horizon: flux(-4.18e-6)},
		Accuracy: result.Accuracy{Asked: 1e-7, Met: true}}}
}

// pulse is a run without a particle: ringing and decay of the field. The
// frequency is that of the fundamental (2,0) of Schwarzschild; E. W. Leaver,
// Proc. R. Soc. A 402, 285 (1985), rounded; the bars are invented.
func pulse() *result.Bundle {
	r := &result.Result{Title: "A pulse rings the hole",
		Ringing:  []result.Ringing{{L: 2, M: 0, N: 0, Re: result.Q{Value: 0.3736716844, Error: 2e-9}, Im: result.Q{Value: -0.0889623157, Error: 3e-9}, Where: "infinity"}},
		Tail:     []result.Tail{{L: 2, M: 0, Where: "infinity", Exponent: result.Q{Value: 4.002, Error: 0.004}}},
		Accuracy: result.Accuracy{Asked: 1e-8, Met: true}}
	s := &result.Series{Prefix: "psi"}
	mode := result.ModeSeries{L: 2, M: 0}
	for u := 0.0; u < 600; u += 0.25 {
		s.U = append(s.U, u)
		mode.Wave = append(mode.Wave, complex(math.Exp(-0.0889623157*u)*math.Cos(0.3736716844*u)+0.02*math.Pow(u+40, -4), 0))
		mode.WaveErr = append(mode.WaveErr, 1e-12)
		mode.Evidence = append(mode.Evidence, 4e-13*(1.1+math.Sin(u)))
		tone := complex(math.NaN(), math.NaN())
		if u >= 20 {
			tone = complex(math.Exp(-0.0889623157*u)*math.Cos(0.3736716844*u), 0)
		}
		mode.Tones = append(mode.Tones, tone)
	}
	local := result.LocalIndex{L: 2, M: 0, Where: "infinity"}
	for u := 300.0; u < 600; u *= 1.02 {
		local.Times = append(local.Times, u)
		local.Index = append(local.Index, 4*u/(u+40))
		local.Error = append(local.Error, 1e-3*(u/300))
	}
	s.Decay = []result.LocalIndex{local}
	s.Modes = []result.ModeSeries{mode}
	return &result.Bundle{Result: r, Series: s}
}

// kinds are the bundles that every structural test runs over.
func kinds() map[string]*result.Bundle {
	return map[string]*result.Bundle{
		"circular": circular(),
		"plunge":   plunge(),
		"spinning": spinning(),
		"pulse":    pulse(),
		"bare":     {Result: &result.Result{}},
		"empty series": {Result: &result.Result{Title: "Nothing kept", Orbit: &result.Orbit{Kind: "circular"}},
			Series: &result.Series{Modes: []result.ModeSeries{{L: 2, M: 2}}}},
	}
}
