// Command faultymodel writes an invented model with known faults, so that one
// can see what "nullmark compare" makes of them. Nothing in it stands for any
// real model.
//
//	nullmark run case.yaml --out results/case
//	go run ./cmd/faultymodel results/case invented
//	nullmark compare results/case --model invented/model.yaml
//
// It takes the waveform of a result, spoils it as listed below and writes it
// the way a modeller might: as csv, in the half-normalised master function,
// with the phase e^{+i phi} and its own, finer times. model.yaml says so.
//
// The faults:
//
//	(2,2)  the phase runs ahead by 2e-4 rad per M
//	(2,1)  the sign belongs to the heavy body's phase
//	(3,3)  the amplitude is 1 % too small
//	force  the horizon's share is left out (circular orbits; also 1 % too
//	       little angular momentum)
//	flux   the coefficient of v^3 is 3 pi instead of 4 pi
//
// Every other mode is right.
//
// With -right it writes the waveform without faults instead, once in every
// convention that can be read, with a model file for each
// (strain-minus-particle.yaml and so on): all of them agree with the result.
package main

import (
	"flag"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"

	"nullmark/extract/compare"
	"nullmark/extract/result"
	"nullmark/extract/store"
)

func main() {
	right := flag.Bool("right", false, "write no faults, and every convention")
	flag.Parse()
	if flag.NArg() != 2 {
		fmt.Fprintln(os.Stderr, "faultymodel: give a result directory and a directory to write to")
		os.Exit(2)
	}
	do := write
	if *right {
		do = writeRight
	}
	if err := do(flag.Arg(0), flag.Arg(1)); err != nil {
		fmt.Fprintln(os.Stderr, "faultymodel:", err)
		os.Exit(1)
	}
}

// fault is what the invented model makes of r h_lm at u.
func fault(l, m int, u float64, h complex128) complex128 {
	switch {
	case l == 2 && m == 2:
		return h * cmplx.Exp(complex(0, -2e-4*u))
	case l == 2 && m == 1:
		return -h
	case l == 3 && m == 3:
		return h * 0.99
	}
	return h
}

func write(from, to string) error {
	b, _, err := store.Read(from)
	if err != nil {
		return err
	}
	if err := os.MkdirAll(to, 0o777); err != nil {
		return err
	}
	yaml := "# An invented model with known faults, written by cmd/faultymodel.\nmodel:\n  name: invented model with faults\n" +
		"  quantity: master\n  phase: plus\n"
	waveform, names, err := waveform(b.Series, compare.Convention{Quantity: "master", Phase: "plus"}, fault)
	if err != nil {
		return err
	}
	files := map[string]string{"waveform.csv": waveform}
	yaml += "  waveform:\n    file: waveform.csv\n    time: u\n    modes: {" + strings.Join(names, ", ") + "}\n"
	if r := b.Result; r.Total != nil && r.Total.Measure == "rate" && r.Total.Infinity != nil {
		files["force.csv"] = force(b)
		yaml += "  force: {file: force.csv, t: t, energy_rate: Edot, angular_momentum_rate: Ldot}\n"
	}
	if r := b.Result; r.Orbit != nil && r.Orbit.Kind == "circular" {
		files["flux.csv"] = flux()
		yaml += "  flux: {file: flux.csv, x: x, energy: F}\n"
	}
	files["model.yaml"] = yaml
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(to, name), []byte(text), 0o666); err != nil {
			return err
		}
	}
	return nil
}

// writeRight writes the waveform as it is, in every convention.
func writeRight(from, to string) error {
	b, _, err := store.Read(from)
	if err != nil {
		return err
	}
	if err := os.MkdirAll(to, 0o777); err != nil {
		return err
	}
	asItIs := func(_, _ int, _ float64, h complex128) complex128 { return h }
	for _, quantity := range []string{"strain", "master", "curvature"} {
		for _, phase := range []string{"minus", "plus"} {
			for _, of := range []string{"particle", "heavy-body"} {
				name := quantity + "-" + phase + "-" + of
				text, names, err := waveform(b.Series, compare.Convention{Quantity: quantity, Phase: phase, PhaseOf: of}, asItIs)
				if err != nil {
					return err
				}
				yaml := fmt.Sprintf("# An invented model without faults, written by cmd/faultymodel.\nmodel:\n  name: %s\n  quantity: %s\n  phase: %s\n  phase_of: %s\n"+
					"  waveform:\n    file: %s.csv\n    time: u\n    modes: {%s}\n", name, quantity, phase, of, name, strings.Join(names, ", "))
				for file, data := range map[string]string{name + ".csv": text, name + ".yaml": yaml} {
					if err := os.WriteFile(filepath.Join(to, file), []byte(data), 0o666); err != nil {
						return err
					}
				}
			}
		}
	}
	return nil
}

// waveform spoils the modes with m > 0, writes them in a convention and
// returns the file and the entries of the model file's table of modes.
func waveform(s *result.Series, c compare.Convention, spoil func(l, m int, u float64, h complex128) complex128) (text string, names []string, err error) {
	var b strings.Builder
	b.WriteString("# M")
	var columns [][]complex128
	first := 0
	for first < len(s.U) && s.U[first] < s.JunkUntil-20 { // a little early, as models do not know of it
		first++
	}
	u := s.U[first:]
	heads := "\nu"
	for _, m := range s.Modes {
		if m.M <= 0 {
			continue
		}
		h := make([]complex128, len(u))
		for i := range u {
			h[i] = spoil(m.L, m.M, u[i], m.Wave[first+i])
		}
		z, err := c.FromStrain(m.L, m.M, u, h)
		if err != nil {
			return "", nil, err
		}
		columns = append(columns, z)
		b.WriteString(",1,1")
		heads += fmt.Sprintf(",re%d%d,im%d%d", m.L, m.M, m.L, m.M)
		names = append(names, fmt.Sprintf("\"%d,%d\": [re%d%d, im%d%d]", m.L, m.M, m.L, m.M, m.L, m.M))
	}
	b.WriteString(heads + "\n")
	for i := range u {
		fmt.Fprintf(&b, "%.17g", u[i])
		for _, z := range columns {
			fmt.Fprintf(&b, ",%.17g,%.17g", real(z[i]), imag(z[i]))
		}
		b.WriteByte('\n')
	}
	return b.String(), names, nil
}

// force loses the flux at infinity alone, and of angular momentum 1 % less.
func force(b *result.Bundle) string {
	f := b.Result.Total.Infinity
	var out strings.Builder
	out.WriteString("# M,mu/M,mu\nt,Edot,Ldot\n")
	t := b.Series.T
	for i := 0; i < len(t); i++ {
		fmt.Fprintf(&out, "%.17g,%.17g,%.17g\n", t[i], -f.Energy.Value, -0.99*f.AngularMomentum.Value)
	}
	return out.String()
}

// flux is the 2PN energy flux of a test particle with a wrong coefficient.
func flux() string {
	var out strings.Builder
	out.WriteString("x,F\n")
	for x := 0.04; x < 0.17; x += 0.002 {
		f := 1 - 1247./336*x + 3*math.Pi*math.Pow(x, 1.5) - 44711./9072*x*x
		fmt.Fprintf(&out, "%.17g,%.17g\n", x, 6.4*math.Pow(x, 5)*f)
	}
	return out.String()
}
