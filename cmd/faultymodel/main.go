// Command faultymodel writes an invented model with known faults, so that one
// can see what "nullmark compare" makes of them. Nothing in it stands for any
// real model.
//
//	nullmark run case.yaml --out results/case
//	go run ./cmd/faultymodel results/case invented
//	nullmark compare results/case --model invented/model.yaml
//
// It takes the waveform of a result, spoils it as listed below and writes it
// the way a modeller might: as npz, in the half-normalised master function,
// with the phase e^{+i phi} and from before the end of the start-up on.
// model.yaml says so.
//
// The faults in the model of a circular orbit (or any other without a plunge):
//
//	(2,2)  the phase runs ahead by 2e-4 rad per M
//	(2,1)  the sign belongs to the heavy body's phase
//	(3,3)  the amplitude is 1 % too small
//	force  the horizon's share is left out (circular orbits; also 1 % too
//	       little angular momentum)
//	flux   the coefficient of v^3 is 3 pi instead of 4 pi
//
// and in that of an inspiral:
//
//	(2,2)  the phase runs ahead by 2e-4 rad per M, from 250 M before the time of
//	       the light ring on
//	(2,1)  the sign belongs to the heavy body's phase
//	(3,3)  the amplitude is 1 % too small
//	(4,4)  the merger comes 0.5 M late: times are stretched between 60 and 20 M
//	       before the time of the light ring
//	force  5 % too little energy is lost (the torque is right); the horizon's
//	       share is left out of both
//
// Every other mode is right.
//
// The example that is shipped beside the cases was written by
//
//	nullmark run configs/faulty-inspiral.yaml --out results/faulty-inspiral
//	go run ./cmd/faultymodel results/faulty-inspiral configs/faulty-inspiral
//
// With -right it writes the waveform without faults instead, once in every
// convention that can be read, with a model file for each
// (strain-minus-particle.yaml and so on): all of them agree with the result.
// The curvature is differentiated from the stored samples and integrated again
// by who reads it: through a merger this keeps ten digits with output.every
// 0.125 and six with 0.5, so that there it is the files that differ.
package main

import (
	"archive/zip"
	"bytes"
	"encoding/binary"
	"flag"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"

	"nullmark/extract/compare"
	fluxes "nullmark/extract/flux"
	"nullmark/extract/result"
	"nullmark/extract/store"
	"nullmark/extract/strain"
	"nullmark/hyperboloidal"
)

func main() {
	unspoilt := flag.Bool("right", false, "write no faults, and every convention")
	flag.Parse()
	if flag.NArg() != 2 {
		fmt.Fprintln(os.Stderr, "faultymodel: give a result directory and a directory to write to")
		os.Exit(2)
	}
	do := write
	if *unspoilt {
		do = writeRight
	}
	if err := do(flag.Arg(0), flag.Arg(1)); err != nil {
		fmt.Fprintln(os.Stderr, "faultymodel:", err)
		os.Exit(1)
	}
}

// spoiler is what an invented model makes of a mode: h(at(l, m, u)) times
// factor(l, m, u).
type spoiler struct {
	at     func(l, m int, u float64) float64
	factor func(l, m int, u float64) complex128
}

// right has no faults.
func right() spoiler {
	return spoiler{func(_, _ int, u float64) float64 { return u }, func(int, int, float64) complex128 { return 1 }}
}

// steady are the faults of a model without a plunge.
func steady() spoiler {
	f := right()
	f.factor = func(l, m int, u float64) complex128 {
		switch [2]int{l, m} {
		case [2]int{2, 2}:
			return cmplx.Exp(complex(0, -2e-4*u))
		case [2]int{2, 1}:
			return -1
		case [2]int{3, 3}:
			return 0.99
		}
		return 1
	}
	return f
}

// plunging are those of an inspiral whose particle passes the light ring at time ring.
func plunging(ring float64) spoiler {
	f := steady()
	f.at = func(l, m int, u float64) float64 {
		if l == 4 && m == 4 {
			x := math.Min(math.Max((u-ring+60)/40, 0), 1)
			return u - 0.5*x*x*x*(10+x*(6*x-15)) // smooth to the second derivative
		}
		return u
	}
	drift := f.factor
	f.factor = func(l, m int, u float64) complex128 {
		if l == 2 && m == 2 {
			return cmplx.Exp(complex(0, -2e-4*math.Max(u-ring+250, 0)))
		}
		return drift(l, m, u)
	}
	return f
}

func write(from, to string) error {
	b, _, err := store.Read(from)
	if err != nil {
		return err
	}
	if err := os.MkdirAll(to, 0o777); err != nil {
		return err
	}
	faults := steady()
	if o := b.Result.Orbit; o != nil && o.Markers["light_ring"] > 0 {
		faults = plunging(o.Markers["light_ring"])
	}
	yaml := "# An invented model with known faults, written by cmd/faultymodel.\nmodel:\n  name: invented model with faults\n" +
		"  quantity: master\n  phase: plus\n"
	u, modes, err := waveform(b.Series, compare.Convention{Quantity: "master", Phase: "plus"}, faults)
	if err != nil {
		return err
	}
	packed, err := npz(u, modes)
	if err != nil {
		return err
	}
	var names []string
	for _, m := range modes {
		names = append(names, fmt.Sprintf("\"%d,%d\": h%d%d", m.l, m.m, m.l, m.m))
	}
	files := map[string]string{"waveform.npz": packed}
	yaml += "  waveform:\n    file: waveform.npz\n    time: u\n    modes: {" + strings.Join(names, ", ") + "}\n"
	forced := true
	switch r := b.Result; {
	case r.Total != nil && r.Total.Measure == "rate" && r.Total.Infinity != nil:
		files["force.csv"] = force(b)
	case r.Orbit != nil && r.Orbit.Kind == "inspiral":
		if files["force.csv"], err = inspiralForce(b.Series); err != nil {
			return err
		}
	default:
		forced = false
	}
	if forced {
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
	for _, quantity := range []string{"strain", "master", "curvature"} {
		for _, phase := range []string{"minus", "plus"} {
			for _, of := range []string{"particle", "heavy-body"} {
				name := quantity + "-" + phase + "-" + of
				u, modes, err := waveform(b.Series, compare.Convention{Quantity: quantity, Phase: phase, PhaseOf: of}, right())
				if err != nil {
					return err
				}
				text, names := csv(u, modes)
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

// column is one mode of a model.
type column struct {
	l, m int
	z    []complex128
}

// waveform spoils the modes with m > 0 and puts them in a convention.
func waveform(s *result.Series, c compare.Convention, f spoiler) (u []float64, modes []column, err error) {
	early := 20.0 // a little early, as models do not know of it
	if c.Quantity == "curvature" {
		early = 0 // a difference must not reach into the start-up
	}
	first := 0
	for first < len(s.U) && s.U[first] < s.JunkUntil-early {
		first++
	}
	u = s.U[first:]
	if len(u) < 10 {
		return nil, nil, fmt.Errorf("the result has %d samples after its start-up, and ten are needed", len(u))
	}
	at := make([]float64, len(u))
	for _, m := range s.Modes {
		if m.M <= 0 {
			continue
		}
		for i := range u {
			at[i] = f.at(m.L, m.M, u[i])
		}
		h := strain.Resample(m.Wave, s.U[0], s.U[1]-s.U[0], at)
		for i := range u {
			h[i] *= f.factor(m.L, m.M, u[i])
		}
		z, err := c.FromStrain(m.L, m.M, u, h)
		if err != nil {
			return nil, nil, err
		}
		modes = append(modes, column{m.L, m.M, z})
	}
	return u, modes, nil
}

// csv writes modes as text and returns the entries of the model file's table.
func csv(u []float64, modes []column) (text string, names []string) {
	var b strings.Builder
	b.WriteString("# M" + strings.Repeat(",1,1", len(modes)) + "\nu")
	for _, m := range modes {
		fmt.Fprintf(&b, ",re%d%d,im%d%d", m.l, m.m, m.l, m.m)
		names = append(names, fmt.Sprintf("\"%d,%d\": [re%d%d, im%d%d]", m.l, m.m, m.l, m.m, m.l, m.m))
	}
	b.WriteByte('\n')
	for i := range u {
		fmt.Fprintf(&b, "%.17g", u[i])
		for _, m := range modes {
			fmt.Fprintf(&b, ",%.17g,%.17g", real(m.z[i]), imag(m.z[i]))
		}
		b.WriteByte('\n')
	}
	return b.String(), names
}

// npz packs the times and modes as numpy.savez_compressed does.
func npz(u []float64, modes []column) (string, error) {
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	add := func(name, kind string, data any) error {
		w, err := z.Create(name + ".npy")
		if err != nil {
			return err
		}
		h := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': (%d,), }", kind, len(u))
		h += strings.Repeat(" ", 63-(10+len(h))%64) + "\n"
		if _, err := fmt.Fprintf(w, "\x93NUMPY\x01\x00%c%c%s", len(h)&255, len(h)>>8, h); err != nil {
			return err
		}
		return binary.Write(w, binary.LittleEndian, data)
	}
	if err := add("u", "<f8", u); err != nil {
		return "", err
	}
	for _, m := range modes {
		if err := add(fmt.Sprintf("h%d%d", m.l, m.m), "<c16", m.z); err != nil {
			return "", err
		}
	}
	err := z.Close()
	return b.String(), err
}

// inspiralForce is what the waves carry to infinity, by l with the tail in l,
// given back to the orbit at t = u + r_*(t): of energy 5 % less.
func inspiralForce(s *result.Series) (string, error) {
	var uOf []float64
	n := 0
	for n < len(s.T) && s.R[n] > 2.5 {
		uOf = append(uOf, s.T[n]-hyperboloidal.TortoiseAt(s.R[n]))
		n++
	}
	step := s.U[1] - s.U[0]
	top := 0
	for _, m := range s.Modes {
		top = max(top, m.L)
	}
	rates := func(k int) (e, l float64) { // at sample k of the series
		eL, lL := make([]float64, top-1), make([]float64, top-1)
		for _, m := range s.Modes {
			w := m.Wave
			d := (45*(w[k+1]-w[k-1]) - 9*(w[k+2]-w[k-2]) + (w[k+3] - w[k-3])) / complex(60*step, 0)
			both := 2.0
			if m.M == 0 {
				both = 1
			}
			eL[m.L-2] += both / (16 * math.Pi) * real(d*cmplx.Conj(d))
			lL[m.L-2] += both / (16 * math.Pi) * float64(m.M) * imag(w[k]*cmplx.Conj(d))
		}
		for _, v := range eL {
			e += v
		}
		for _, v := range lL {
			l += v
		}
		if rest, ok := fluxes.Tail(eL, 0); ok {
			e += rest.Value
		}
		if rest, ok := fluxes.Tail(lL, 0); ok {
			l += rest.Value
		}
		return e, l
	}
	var out strings.Builder
	out.WriteString("# M,1,M\nt,Edot,Ldot\n")
	for i := 2; i+2 < n; i++ {
		k := int(math.Round((uOf[i] - s.U[0]) / step))
		if uOf[i] < s.JunkUntil || k < 4 || k > len(s.U)-5 {
			continue
		}
		e0, l0 := rates(k - 1)
		e1, l1 := rates(k)
		e2, l2 := rates(k + 1)
		x := (uOf[i] - s.U[k]) / step
		dudt := (8*(uOf[i+1]-uOf[i-1]) - (uOf[i+2] - uOf[i-2])) / (12 * (s.T[i+1] - s.T[i]))
		at := func(a, b, c float64) float64 { return b + x*(c-a)/2 + x*x*(a-2*b+c)/2 }
		fmt.Fprintf(&out, "%.17g,%.10g,%.10g\n", s.T[i], -0.95*dudt*at(e0, e1, e2), -dudt*at(l0, l1, l2))
	}
	if strings.Count(out.String(), "\n") < 12 {
		return "", fmt.Errorf("the result holds too little of the inspiral to write a force along it")
	}
	return out.String(), nil
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
