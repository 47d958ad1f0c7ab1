package app

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync/atomic"

	"github.com/spf13/cobra"

	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/extract/report"
	"nullmark/extract/result"
	"nullmark/extract/store"
)

func (c *command) runCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "run CASE.yaml",
		Short: "Plan, evolve, extract and certify a case; write its result directory",
		Args:  one("case file", "nullmark run CASE.yaml"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return c.run(cmd, args[0])
		},
	}
	c.caseFlags(cmd.Flags())
	cmd.Flags().StringVar(&c.out, "out", "", "result `directory` (default results/<case file name>)")
	cmd.Flags().BoolVar(&c.resume, "resume", false, "take over the finished parts of an interrupted run")
	cmd.Flags().BoolVar(&c.force, "force", false, "replace another case's result in the result directory")
	cmd.Flags().BoolVar(&c.second, "second-opinion", false, "solve a circular orbit in the frequency domain as well and set the numbers beside each other")
	return cmd
}

func (c *command) run(cmd *cobra.Command, path string) error {
	kase, err := c.read(path)
	if err != nil {
		return err
	}
	caseYAML, err := kase.YAML()
	if err != nil {
		return coded(ExitUsage, err)
	}
	if c.second {
		if err := c.engine.CanAsk(kase); err != nil {
			return usagef("--second-opinion: %w", err)
		}
	}
	dir := c.out
	if dir == "" {
		dir = defaultOut(path)
	}
	// What can be refused is refused before hours are spent.
	if err := store.Ready(dir, caseYAML, c.force); err != nil {
		return outFault(err)
	}
	made, err := writable(dir)
	if err != nil {
		return coded(ExitFiles, fmt.Errorf("cannot write results to %s: %w (choose another place with --out)", dir, err))
	}
	defer removeEmpty(made)
	c.warn(c.engine.Warnings(kase))

	kept := &keeper{inner: store.NewKeeper(dir, identity(caseYAML)), resume: c.resume}
	bundle, err := c.evolve(cmd.Context(), kase, kept)
	if err != nil {
		return c.stopped(err, kept)
	}
	if c.second {
		if err := c.engine.SecondOpinion(cmd.Context(), kase, bundle.Result, c.workers); err != nil {
			return c.stopped(err, kept)
		}
	}
	if err := c.store(dir, bundle, kase, caseYAML); err != nil {
		if kept.any.Load() {
			err = fmt.Errorf("%w; finished parts are kept: run again with --resume", err)
		}
		return err
	}
	if err := c.show(cmd, dir, bundle.Result); err != nil {
		return err
	}
	if !bundle.Result.Accuracy.Met {
		return errNotMet
	}
	return nil
}

// evolve runs the engine under a meter.
func (c *command) evolve(ctx context.Context, kase *configs.Case, kept wire.Keeper) (*result.Bundle, error) {
	m := newMeter(c.stderr, c.quiet)
	defer m.stop()
	return c.engine.Run(ctx, kase, wire.Options{
		Workers:  c.workers,
		Keep:     kept,
		Progress: func(p wire.Progress) { m.update(p.Stage, p.Done, p.Total) },
	})
}

// stopped words the end of a run that has no result.
func (c *command) stopped(err error, kept *keeper) error {
	if !errors.Is(err, context.Canceled) {
		return err
	}
	if kept.any.Load() {
		return coded(ExitInterrupted, &interrupted{err, "interrupted; finished parts are kept: run again with --resume"})
	}
	return coded(ExitInterrupted, &interrupted{err, "interrupted before the first part was finished: nothing is kept"})
}

// interrupted words an interruption for the reader.
type interrupted struct {
	err  error
	text string
}

func (e *interrupted) Error() string { return e.text }
func (e *interrupted) Unwrap() error { return e.err }

// store writes the result directory with the files that the case keeps.
func (c *command) store(dir string, bundle *result.Bundle, kase *configs.Case, caseYAML []byte) error {
	keeps := func(what string) bool { return slices.Contains(kase.Output.Keep, what) }
	parts := store.Parts{Waveform: keeps("waveform"), Horizon: keeps("horizon"), Flux: keeps("flux")}
	if keeps("report") {
		var page bytes.Buffer
		if err := report.HTML(&page, bundle); err != nil {
			return fmt.Errorf("cannot draw the report: %w", err)
		}
		parts.Report = page.Bytes()
	}
	if err := store.Write(dir, bundle, caseYAML, parts, c.force); err != nil {
		return outFault(err)
	}
	return nil
}

// show ends a run on stdout: the stored result.json as it is, or a short table
// and where the files are.
func (c *command) show(cmd *cobra.Command, dir string, r *result.Result) error {
	out := cmd.OutOrStdout()
	if c.json {
		text, err := os.ReadFile(filepath.Join(dir, "result.json"))
		if err != nil {
			return err
		}
		_, err = out.Write(text)
		return err
	}
	if err := report.Terminal(out, r, columns(c.stdout), wantsColour(c.stdout)); err != nil {
		return err
	}
	if c.second {
		if err := opinions(out, r.SecondOpinion); err != nil {
			return err
		}
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return err
	}
	var names []string
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), ".") {
			names = append(names, e.Name())
		}
	}
	_, err = fmt.Fprintf(out, "\nWritten to %s: %s\n", dir, strings.Join(names, ", "))
	return err
}

// defaultOut is results/<case file name without its ending>.
func defaultOut(path string) string {
	base := filepath.Base(path)
	return filepath.Join("results", strings.TrimSuffix(base, filepath.Ext(base)))
}

// writable makes sure that a result directory can appear at dir, by making its
// missing parents, which it returns from the innermost outwards, and a
// directory where it will be made.
func writable(dir string) (made []string, err error) {
	parent := filepath.Dir(filepath.Clean(dir))
	for p := parent; ; p = filepath.Dir(p) {
		if _, err := os.Stat(p); !errors.Is(err, os.ErrNotExist) || p == filepath.Dir(p) {
			break
		}
		made = append(made, p)
	}
	defer func() {
		if err != nil {
			removeEmpty(made)
		}
	}()
	if err := os.MkdirAll(parent, 0o777); err != nil {
		return made, err
	}
	probe, err := os.MkdirTemp(parent, ".nullmark-probe-*")
	if err != nil {
		return made, err
	}
	return made, os.Remove(probe)
}

// removeEmpty takes those of the directories away in which nothing has come to
// lie; the others refuse.
func removeEmpty(dirs []string) {
	for _, d := range dirs {
		if os.Remove(d) != nil {
			return
		}
	}
}

// outFault gives an error of the store its exit code: refusing to replace
// something is an answer to wrong usage, the rest is the file system's.
func outFault(err error) error {
	var exists *store.Exists
	var invalid *store.Invalid
	switch {
	case errors.As(err, &exists):
		return coded(ExitUsage, err)
	case errors.As(err, &invalid):
		return coded(ExitNumerical, err)
	}
	return coded(ExitFiles, err)
}

// identity is what finished parts belong to: one case and one build.
func identity(caseYAML []byte) []byte {
	return slices.Concat(caseYAML, []byte("\n# "+version()+"\n"))
}

// keeper gives out parts only to a run that resumes, and remembers whether
// there is anything to resume from.
type keeper struct {
	inner  wire.Keeper
	resume bool
	any    atomic.Bool
}

func (k *keeper) Load(key string) ([]byte, bool) {
	if !k.resume {
		return nil, false
	}
	data, ok := k.inner.Load(key)
	if ok {
		k.any.Store(true)
	}
	return data, ok
}

func (k *keeper) Save(key string, data []byte) error {
	err := k.inner.Save(key, data)
	if err == nil {
		k.any.Store(true)
	}
	return err
}
