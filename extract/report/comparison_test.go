package report

import (
	"bytes"
	"errors"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nullmark/extract/compare"
	"nullmark/extract/result"
	"nullmark/hyperboloidal"
)

// faulty is an invented model: the plunge with a drifting phase, a (2,1) mode
// that is too loud and a (3,3) mode that is right, a flux curve and a force.
type faulty struct{ b *result.Bundle }

func (f faulty) Times() []float64 { return f.b.Series.U }
func (f faulty) Notes() []string {
	return []string{"model.npz: an invented remark with <angles> & signs"}
}
func (f faulty) Modes() [][2]int { return [][2]int{{2, 0}, {2, 1}, {2, 2}, {3, 3}} }
func (f faulty) Load(l, m int) (compare.Samples, error) {
	for _, s := range f.b.Series.Modes {
		if s.L != l || s.M != m {
			continue
		}
		z := append([]complex128(nil), s.Wave...)
		for i, u := range f.b.Series.U {
			switch {
			case l == 2 && m == 2:
				z[i] *= cmplx.Exp(complex(0, -2e-6*u-1e-3/(1+math.Exp((1900-u)/20))))
			case l == 2:
				z[i] *= 1 + 3e-4
			}
		}
		return compare.Samples{Z: z}, nil
	}
	return compare.Samples{}, errors.New("no such mode")
}

func compared(t *testing.T, name string) (*result.Comparison, *result.Curves) {
	t.Helper()
	ref := plunge()
	in := compare.Input{Title: "invented plunge", Name: "faulty model", Reference: ref, Model: faulty{ref}, Tortoise: hyperboloidal.TortoiseAt}
	switch name {
	case "plunge":
		in.Force = &compare.Force{}
		for i, u := range ref.Series.T {
			if u < 1900 {
				in.Force.T = append(in.Force.T, u)
				in.Force.EnergyRate = append(in.Force.EnergyRate, -1e-3*math.Pow(7/ref.Series.R[i], 5))
			}
		}
	case "circular":
		ref = circular()
		w, err := compare.FromResult(ref)
		if err != nil {
			t.Fatal(err)
		}
		in.Reference, in.Model, in.Numbers = ref, w, ref.Result
		in.Flux = &compare.FluxInput{X: []float64{0.05, 0.08, 0.1, 0.12, 0.15}, Context: []compare.Expansion{{Name: "leading order", Ratio: func(float64) float64 { return 1 }}, {Name: "one more", Ratio: func(x float64) float64 { return 1 - 3.7*x }}}}
		y, z := []float64{}, []float64{}
		for _, x := range in.Flux.X {
			y = append(y, 0.961*6.4*math.Pow(x, 5))
			z = append(z, 0.95*6.4*math.Pow(x, 3.5))
		}
		in.Flux.Columns = []compare.FluxColumn{{Energy: y, AngMom: z}}
		in.Flux.Rows = []compare.FluxRow{}
		for _, x := range []float64{0.06, 0.09, 0.11, 0.14} {
			in.Flux.Rows = append(in.Flux.Rows, compare.FluxRow{X: x, Energy: result.Q{Value: (1 - 3*x*x) * 6.1 * math.Pow(x, 5), Error: 0.02 * math.Pow(x, 5)}})
		}
	}
	c, curves, err := compare.Compare(in)
	if err != nil {
		t.Fatal(err)
	}
	return c, curves
}

func renderComparison(t *testing.T, c *result.Comparison, curves *result.Curves) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := Comparison(&b, c, curves); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func TestComparisonPage(t *testing.T) {
	for name, want := range map[string]string{
		"plunge":   "Mode by mode | Pictures | Peaks | At marked times, and by stage | Balance | Could a detector tell? | How the model was read | Warnings",
		"circular": "Mode by mode | Pictures | At marked times, and by stage | Flux | Could a detector tell? | The two results, number by number | How the model was read",
	} {
		t.Run(name, func(t *testing.T) {
			c, curves := compared(t, name)
			page := renderComparison(t, c, curves)
			wellFormed(t, page)
			root := parsePage(t, page)
			accessible(t, root)
			if got := headings(root); got != want {
				t.Errorf("sections %q, want %q", got, want)
			}
			text := root.words()
			for _, s := range append([]string{c.Overall.Sentence}, c.Warnings...) {
				if !strings.Contains(text, strings.Join(strings.Fields(s), " ")) {
					t.Errorf("the page does not say %q", s)
				}
			}
			for _, m := range c.Modes {
				if (m.Verdict != result.Inside || len(c.Modes) <= 6) && !strings.Contains(text, m.Sentence) {
					t.Errorf("the page does not say %q", m.Sentence)
				}
			}
			if !bytes.Equal(page, renderComparison(t, c, curves)) {
				t.Error("the same comparison gives another page")
			}
			if *keep != "" {
				if err := os.WriteFile(filepath.Join(*keep, "comparison-"+name+".html"), page, 0o644); err != nil {
					t.Fatal(err)
				}
			}
		})
	}
}

// Whatever parts are missing, the page stands.
func TestBareComparison(t *testing.T) {
	c := &result.Comparison{Model: "<script>alert(1)</script>", Hints: []string{"<b>"}, Overall: result.Overall{Verdict: result.CannotTell, Sentence: "a \x00 b"}}
	page := renderComparison(t, c, nil)
	wellFormed(t, page)
	accessible(t, parsePage(t, page))
	if Comparison(&bytes.Buffer{}, nil, nil) == nil {
		t.Error("no comparison, and no error")
	}
	if Comparison(full{}, c, nil) == nil {
		t.Error("a full disk goes unnoticed")
	}
}
