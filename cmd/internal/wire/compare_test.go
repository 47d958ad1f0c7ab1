package wire

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/compare"
	"nullmark/extract/result"
	"nullmark/extract/table"
)

// published is one mode of a circular orbit.
type published struct {
	L, M           int
	EnergyInfinity float64    `json:"energy_infinity"`
	Strain         [2]float64 `json:"strain"` // of r h_lm e^{i m phi_p(u)}/mu
}

// frequencyDomain reads three modes of the orbit r = 10 from the table that
// verify checks against: computed in the frequency domain (Leaver's continued
// fraction and asymptotic series, 33 digits and more).
func frequencyDomain(t *testing.T) []published {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "verify", "published", "circular_schwarzschild.json"))
	if err != nil {
		t.Fatal(err)
	}
	var tab struct {
		Orbits []struct {
			R0    float64     `json:"r0"`
			Modes []published `json:"modes"`
		} `json:"orbits"`
	}
	if err := json.Unmarshal(data, &tab); err != nil {
		t.Fatal(err)
	}
	var out []published
	for _, o := range tab.Orbits {
		for _, m := range o.Modes {
			if o.R0 == 10 && (m.L == 2 || m.L == 3 && m.M == 3) {
				out = append(out, m)
			}
		}
	}
	if len(out) != 3 {
		t.Fatalf("the table holds %d of the modes (2,1), (2,2), (3,3) at r = 10", len(out))
	}
	return out
}

// TestModelFilesAgainstARun runs an orbit and holds files against it that were
// written from the frequency domain: waveform, flux curve, force and a sweep's
// table; the noise curve is invented.
func TestModelFilesAgainstARun(t *testing.T) {
	dir := t.TempDir()
	write := func(name, text string) {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	omega := math.Pow(10, -1.5)
	var wave, force, flux strings.Builder
	wave.WriteString("# M,1,1,1,1,1,1\nt,re21,im21,re22,im22,re33,im33\n")
	force.WriteString("t,Edot\n")
	loss, modes := 0.0, frequencyDomain(t)
	for _, f := range modes {
		loss += f.EnergyInfinity
	}
	for u := 0.0; u < 1500; u += 0.75 {
		fmt.Fprintf(&wave, "%g", u)
		for _, f := range modes {
			h := complex(f.Strain[0], f.Strain[1]) * cmplx.Exp(complex(0, -float64(f.M)*omega*u))
			fmt.Fprintf(&wave, ",%.17g,%.17g", real(h), imag(h))
		}
		wave.WriteString("\n")
		fmt.Fprintf(&force, "%g,%.12g\n", u, -1.01*loss)
	}
	flux.WriteString("x,F,l2m2_F\n")
	for i := 0; i <= 10; i++ {
		x := 0.05 + 0.01*float64(i)
		p := math.Pow(x/0.1, 5)
		fmt.Fprintf(&flux, "%g,%.12g,%.12g\n", x, 1.02*loss*p, 5.368795479e-5*p)
	}
	write("wave.csv", wave.String())
	write("force.csv", force.String())
	write("flux.csv", flux.String())
	write("noise.csv", "f,asd\n1,1e-22\n30,1e-23\n2000,5e-23\n")
	write("sweep.csv", "orbit.radius,energy_infinity,energy_infinity_error,l2m2_energy_infinity,l2m2_energy_infinity_error\n"+
		"10,6.150372549e-5,1e-13,5.368795479e-5,1e-13\n8,1.97e-4,1e-8,1.6e-4,1e-8\n")
	reader := configs.Reader{Checks: Checks()}
	kase, err := reader.Parse(filepath.Join(dir, "case.yaml"), []byte(`waves: {modes: [[2,1],[2,2],[3,3]]}
orbit: {kind: circular, radius: 10}
accuracy: {relative: 1.0e-7}
model:
  waveform: {file: wave.csv, modes: {"2,1": [re21, im21], "2,2": [re22, im22], "3,3": [re33, im33]}}
  flux: {file: flux.csv, energy: F}
  force: {file: force.csv, energy_rate: Edot}
  noise: {file: noise.csv, frequency: f, density: asd, total_mass: 40}
`))
	if err != nil {
		t.Fatal(err)
	}
	ref, err := Run(context.Background(), kase, Options{Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	c, _, err := Compare(ref, kase, Comparison{Model: kase.Model})
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range c.Modes {
		if m.Verdict != result.Inside {
			t.Errorf("%s", m.Sentence)
		}
	}
	if r := c.Flux.Curves; len(r) != 2 || math.Abs(r[0].Ratio[0].Value-1.02) > 1e-7 || math.Abs(r[1].Ratio[0].Value-1) > 1e-7 || r[1].L != 2 {
		t.Errorf("flux: %+v", r)
	}
	if a := c.Balance.Energy.Average; math.Abs(a.Residual.Value/loss-0.01) > 3e-4 || c.Balance.Verdict != result.Differs {
		t.Errorf("balance: %+v", a) // 0.02 % go into the horizon
	}
	if c.Settings.Noise != "noise.csv" || c.Settings.TotalMass != 40 || c.Overall.Mismatch == nil {
		t.Errorf("noise: %+v", c.Settings)
	}
	kase.Model.Flux.Against = filepath.Join(dir, "sweep.csv")
	if c, _, err = Compare(ref, kase, Comparison{Model: kase.Model}); err != nil {
		t.Fatal(err)
	}
	if r := c.Flux.Curves; len(r) != 2 || len(r[0].X) != 2 || math.Abs(r[1].Ratio[0].Value-1) > 1e-8 {
		t.Errorf("flux against a sweep: %+v", r)
	}
	c, _, err = Compare(ref, kase, Comparison{With: ref, Name: "itself"})
	if err != nil || c.Overall.Verdict != result.Inside || len(c.Numbers) == 0 {
		t.Errorf("a result against itself: %v", err)
	}

	write("bad.csv", "orbit.radius,energy_infinity\n10,1\n")
	kase.Model.Flux.Against = filepath.Join(dir, "bad.csv")
	var fault *table.Fault
	if _, _, err = Compare(ref, kase, Comparison{Model: kase.Model}); !errors.As(err, &fault) || fault.Array != "energy_infinity_error" {
		t.Errorf("a table without bars: %v", err)
	}
	kase.Model.Flux.Against, kase.Model.Flux.Energy = "", ""
	var input *compare.InputError
	if _, _, err = Compare(ref, kase, Comparison{Model: kase.Model}); !errors.As(err, &input) || !strings.Contains(err.Error(), "names no column") {
		t.Errorf("a flux without a column: %v", err)
	}
	kase.Model.Flux, kase.Model.Force.EnergyRate = nil, "Ldot"
	if _, _, err = Compare(ref, kase, Comparison{Model: kase.Model}); !errors.As(err, &fault) || fault.Kind != table.Missing {
		t.Errorf("a force without its column: %v", err)
	}
}
