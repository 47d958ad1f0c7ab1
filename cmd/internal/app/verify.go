package app

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"nullmark/cmd/internal/verify"
	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/extract/result"
)

func (c *command) verifyCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "verify",
		Short: "Check this build against published values",
		Args: func(cmd *cobra.Command, args []string) error {
			if len(args) > 0 {
				return usagef("verify wants no argument, not %q: nullmark verify [--long]", args[0])
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, _ []string) error { return c.verify(cmd) },
	}
	cmd.Flags().StringVar(&c.page, "page", "", "write the table to this `file` as well, as a page for a browser (verify.html)")
	cmd.Flags().BoolVar(&c.long, "long", false, "run the slow checks as well")
	return cmd
}

func (c *command) verify(cmd *cobra.Command) error {
	if c.page != "" {
		if info, err := os.Stat(filepath.Dir(c.page)); err != nil || !info.IsDir() {
			return coded(ExitFiles, fmt.Errorf("--page %s: there is no directory %s to write the page into", c.page, filepath.Dir(c.page)))
		}
	}
	m := newMeter(c.stderr, c.quiet)
	defer m.stop()
	run := func(ctx context.Context, vc verify.Case, i, n int) (*result.Bundle, error) {
		kase, err := c.shipped(vc.Shipped, vc.Changes)
		if err != nil {
			return nil, err
		}
		stage := fmt.Sprintf("case %d of %d", i+1, n)
		m.update(stage, float64(i), float64(n))
		b, err := c.engine.Run(ctx, kase, wire.Options{
			Workers: c.workers,
			Progress: func(p wire.Progress) {
				if p.Total > 0 {
					m.update(stage, float64(i)+min(p.Done/p.Total, 1), float64(n))
				}
			},
		})
		if err == nil && kase.Waves.Equation == configs.Teukolsky && c.engine.CanAsk != nil && c.engine.CanAsk(kase) == nil {
			err = c.engine.SecondOpinion(ctx, kase, b.Result, c.workers)
		}
		return b, err
	}
	outcome, err := verify.Run(cmd.Context(), c.checks, run, c.long)
	m.stop()
	if err != nil {
		return err
	}
	if c.page != "" {
		var page bytes.Buffer
		if err := outcome.Page(&page, version()); err != nil {
			return err
		}
		if err := os.WriteFile(c.page, page.Bytes(), 0o666); err != nil {
			return coded(ExitFiles, fmt.Errorf("the page could not be written: %w", err))
		}
	}
	out := cmd.OutOrStdout()
	if c.json {
		encoder := json.NewEncoder(out)
		encoder.SetIndent("", "  ")
		err = encoder.Encode(outcome)
	} else {
		err = outcome.Table(out, wantsColour(c.stdout))
	}
	if err == nil && !outcome.Passed {
		err = errNotMet
	}
	return err
}

// shipped reads a case that comes with the tool, with some keys changed; the
// environment has no say.
func (c *command) shipped(name string, changes []string) (*configs.Case, error) {
	text, err := configs.ShippedFile(name)
	if err != nil {
		return nil, err
	}
	reader := configs.Reader{Sets: changes, Checks: c.engine.Checks()}
	return reader.Parse(name, text)
}
