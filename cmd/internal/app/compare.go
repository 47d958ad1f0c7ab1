package app

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"nullmark/cmd/internal/verify"
	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/extract/compare"
	"nullmark/extract/report"
	"nullmark/extract/result"
	"nullmark/extract/store"
)

// comparing are the flags of compare.
type comparing struct {
	model, with    string
	settle, strict bool
}

func (c *command) compareCommand() *cobra.Command {
	var f comparing
	cmd := &cobra.Command{
		Use:   "compare RESULT_DIR",
		Short: "Set a model's waveform, flux and dynamics (or another result) against a result",
		Long: "compare sets a modeller's files against a result and says mode by mode whether they agree inside\n" +
			"the error bar. What to read stands in the case's section model, or in a file of its own (--model)\n" +
			"that holds the sections model and align. It writes comparison.json, comparison.html and\n" +
			"comparison.csv (the curves) beside the result, or into --out.",
		Args: one("result directory", "nullmark compare RESULT_DIR --model MODEL.yaml"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return c.compare(cmd, args[0], f)
		},
	}
	flags := cmd.Flags()
	c.caseFlags(flags)
	flags.StringVar(&f.model, "model", "", "`file` with the sections model and align (default: those of the case)")
	flags.StringVar(&f.with, "with", "", "compare with another result `directory` instead of a model")
	flags.StringVar(&c.out, "out", "", "`directory` for the comparison (default: the result directory)")
	flags.BoolVar(&f.settle, "settle", false, "where the result cannot tell, run its case again with the accuracy that would, beside it")
	flags.BoolVar(&f.strict, "strict", false, "exit with 1 unless everything agrees inside the error bar")
	return cmd
}

func (c *command) compare(cmd *cobra.Command, dir string, f comparing) error {
	if f.model != "" && f.with != "" {
		return usagef("--model and --with are both given; compare takes one of them")
	}
	bundle, caseYAML, err := readResult(dir)
	if err != nil {
		return err
	}
	// The stored case is resolved: neither environment nor --set change it.
	kase, err := configs.Reader{}.Parse(filepath.Join(dir, "case.yaml"), caseYAML)
	if err != nil {
		return coded(ExitUsage, err)
	}
	against, err := c.against(kase, dir, f)
	if err != nil {
		return err
	}
	found, curves, err := wire.Compare(bundle, kase, *against)
	if err != nil {
		return coded(ExitUsage, err)
	}
	if f.settle && found.Overall.Settles != nil {
		settled, again, err := c.settle(cmd.Context(), dir, kase, *found.Overall.Settles)
		if err != nil {
			return err
		}
		dir, bundle = settled, again
		if found, curves, err = wire.Compare(bundle, kase, *against); err != nil {
			return coded(ExitUsage, err)
		}
	}
	if err := c.writeComparison(cmd, dir, found, curves); err != nil {
		return err
	}
	if f.strict && !agrees(found) {
		return errNotMet
	}
	return nil
}

// readResult reads a result directory and gives its errors their exit codes.
func readResult(dir string) (*result.Bundle, []byte, error) {
	bundle, caseYAML, err := store.Read(dir)
	var not *store.NotResult
	if errors.As(err, &not) {
		return nil, nil, coded(ExitUsage, err)
	}
	return bundle, caseYAML, coded(ExitFiles, err)
}

// against finds out what to compare with: another result, a model file, or the
// case's own model.
func (c *command) against(kase *configs.Case, dir string, f comparing) (*wire.Comparison, error) {
	w := &wire.Comparison{Align: kase.Align}
	for _, e := range []struct {
		name  string
		order int
	}{{"2PN", 4}, {"3.5PN", 7}, {"5.5PN", 11}} {
		if kase.Hole.Spin == 0 {
			w.Context = append(w.Context, compare.Expansion{Name: e.name, Ratio: func(x float64) float64 { return verify.Truncated(math.Sqrt(x), e.order) }})
		}
	}
	if f.with != "" {
		if len(c.sets) > 0 {
			return nil, usagef("--set changes a model, and --with compares with none")
		}
		other, _, err := readResult(f.with)
		if err != nil {
			return nil, err
		}
		w.With, w.Name = other, "result "+filepath.Base(filepath.Clean(f.with))
		return w, nil
	}
	reader := configs.Reader{Env: c.env, Sets: c.sets}
	var err error
	switch {
	case f.model != "":
		w.Model, w.Align, err = reader.ReadModel(f.model)
	case kase.Model == nil:
		return nil, usagef("the case of %s names no model: give one with --model MODEL.yaml, or another result with --with DIR", dir)
	case len(c.sets) > 0:
		for _, set := range c.sets {
			if !strings.HasPrefix(set, "model.") && !strings.HasPrefix(set, "align") {
				return nil, usagef("--set %s changes nothing of a finished run's model; write model.key=value or align=value", set)
			}
		}
		path := filepath.Join(dir, "case.yaml")
		var again *configs.Case
		if again, err = (configs.Reader{Sets: c.sets}).Read(path); err == nil {
			w.Model, w.Align = again.Model, again.Align
		}
	default:
		w.Model = kase.Model
	}
	if err != nil {
		return nil, coded(ExitUsage, err)
	}
	return w, nil
}

// settle runs the case again with another accuracy and stores the result
// beside the first; it returns the new directory.
func (c *command) settle(ctx context.Context, dir string, kase *configs.Case, accuracy float64) (string, *result.Bundle, error) {
	again := *kase
	again.Accuracy.Relative = accuracy
	caseYAML, err := again.YAML()
	if err != nil {
		return "", nil, coded(ExitUsage, err)
	}
	settled := fmt.Sprintf("%s-%.0e", filepath.Clean(dir), accuracy)
	if err := store.Ready(settled, caseYAML, false); err != nil {
		return "", nil, outFault(err)
	}
	if !c.quiet {
		c.tell(fmt.Sprintf("running the case again with accuracy.relative: %.0e, into %s", accuracy, settled))
	}
	kept := &keeper{inner: store.NewKeeper(settled, identity(caseYAML)), resume: true}
	bundle, err := c.evolve(ctx, &again, kept)
	if err != nil {
		return "", nil, c.stopped(err, kept)
	}
	return settled, bundle, c.store(settled, bundle, &again, caseYAML)
}

// writeComparison writes the files of a comparison and shows it.
func (c *command) writeComparison(cmd *cobra.Command, dir string, found *result.Comparison, curves *result.Curves) error {
	var text, page, csv bytes.Buffer
	encoder := json.NewEncoder(&text)
	encoder.SetIndent("", "  ")
	encoder.SetEscapeHTML(false)
	if err := encoder.Encode(found); err != nil {
		return fmt.Errorf("cannot write comparison.json: %w", err)
	}
	if err := report.Comparison(&page, found, curves); err != nil {
		return fmt.Errorf("cannot draw the comparison: %w", err)
	}
	files := map[string][]byte{"comparison.json": text.Bytes(), "comparison.html": page.Bytes()}
	if len(curves.U) > 0 {
		if err := compare.WriteCurves(&csv, curves); err != nil {
			return fmt.Errorf("cannot write comparison.csv: %w", err)
		}
		files["comparison.csv"] = csv.Bytes()
	}
	into := dir
	if c.out == "" {
		if err := store.Add(dir, files); err != nil {
			return coded(ExitFiles, err)
		}
	} else {
		into = c.out
		if err := os.MkdirAll(into, 0o777); err != nil {
			return coded(ExitFiles, err)
		}
		for name, data := range files {
			if err := os.WriteFile(filepath.Join(into, name), data, 0o666); err != nil {
				return coded(ExitFiles, err)
			}
		}
	}
	out := cmd.OutOrStdout()
	if c.json {
		_, err := out.Write(text.Bytes())
		return err
	}
	if err := report.ComparisonText(out, found); err != nil {
		return err
	}
	_, err := fmt.Fprintf(out, "\nWritten: %s\n", filepath.Join(into, "comparison.html"))
	return err
}

// agrees says whether every verdict is inside the error bar.
func agrees(c *result.Comparison) bool {
	ok := len(c.Modes) == 0 || c.Overall.Verdict == result.Inside
	if c.Flux != nil {
		ok = ok && c.Flux.Verdict == result.Inside
	}
	if c.Balance != nil {
		ok = ok && c.Balance.Verdict == result.Inside
	}
	for _, n := range c.Numbers {
		ok = ok && n.Verdict == result.Inside
	}
	return ok
}
