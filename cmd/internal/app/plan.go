package app

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"text/tabwriter"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"nullmark/cmd/internal/wire"
	"nullmark/extract/result"
)

func (c *command) planCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "plan CASE.yaml",
		Short: "Show the resolved case, the orbit's numbers, the grids chosen and the expected cost; evolve nothing",
		Args:  one("case file", "nullmark plan CASE.yaml"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return c.plan(cmd, args[0])
		},
	}
	c.caseFlags(cmd.Flags())
	return cmd
}

// planSchema names the layout of the machine-readable plan.
const planSchema = "nullmark.plan/1"

// planJSON is the machine-readable plan.
type planJSON struct {
	Schema      string        `json:"schema"`
	Case        string        `json:"case"` // the resolved case as YAML
	Orbit       *result.Orbit `json:"orbit,omitempty"`
	Modes       []plannedMode `json:"modes"`
	Rungs       []result.Rung `json:"rungs"`
	CoreSeconds float64       `json:"core_seconds"`
	MemoryBytes uint64        `json:"memory_bytes"`
	Warnings    []string      `json:"warnings"`
}

type plannedMode struct {
	L      int     `json:"l"`
	M      int     `json:"m"`
	Points int     `json:"points"`
	Dx     float64 `json:"dx"`
	Dt     float64 `json:"dt"`
	Kernel float64 `json:"kernel"`
	Until  float64 `json:"until"`
}

func (c *command) plan(cmd *cobra.Command, path string) error {
	kase, err := c.read(path)
	if err != nil {
		return err
	}
	caseYAML, err := kase.YAML()
	if err != nil {
		return coded(ExitUsage, err)
	}
	p, err := c.engine.Plan(kase)
	if err != nil {
		return err
	}
	warnings := slices.Clone(p.Warnings)
	for _, w := range c.engine.Warnings(kase) {
		if !slices.Contains(warnings, w) {
			warnings = append(warnings, w)
		}
	}
	if c.json {
		doc := planJSON{Schema: planSchema, Case: string(caseYAML), Orbit: p.Orbit, Modes: []plannedMode{}, Rungs: p.Rungs,
			CoreSeconds: p.CoreSeconds, MemoryBytes: p.MemoryBytes, Warnings: warnings}
		for _, m := range p.Modes {
			doc.Modes = append(doc.Modes, plannedMode{m.L, m.M, m.Points, m.Dx, m.Dt, m.Kernel, m.Until})
		}
		encoder := json.NewEncoder(cmd.OutOrStdout())
		encoder.SetIndent("", "  ")
		return encoder.Encode(doc)
	}
	text := planText(string(caseYAML), p, warnings, c.workers)
	_, err = io.WriteString(cmd.OutOrStdout(), text)
	return err
}

// planText words a plan for a reader.
func planText(caseYAML string, p *wire.Plan, warnings []string, workers int) string {
	var b strings.Builder
	b.WriteString("RESOLVED CASE (G = c = M = 1)\n")
	for line := range strings.SplitSeq(strings.TrimRight(caseYAML, "\n"), "\n") {
		b.WriteString("  " + line + "\n")
	}
	table := func(rows func(w io.Writer)) {
		w := tabwriter.NewWriter(&b, 0, 0, 2, ' ', tabwriter.AlignRight)
		rows(w)
		_ = w.Flush() // into memory
	}
	if o := p.Orbit; o != nil {
		b.WriteString("\nORBIT\n")
		fmt.Fprintf(&b, "  kind %s\n", o.Kind)
		fmt.Fprintf(&b, "  %-24s %.12g\n  %-24s %.12g\n", "E (per mu)", o.Energy, "L (per mu M)", o.AngMom)
		for _, key := range sortedKeys(o.Numbers) {
			fmt.Fprintf(&b, "  %-24s %.12g\n", key, o.Numbers[key])
		}
		for _, key := range sortedKeys(o.Markers) {
			fmt.Fprintf(&b, "  %-24s %.12g (time, M)\n", key, o.Markers[key])
		}
	}
	b.WriteString("\nMODES (dx, dt, kernel width and end of the evolution in M)\n")
	table(func(w io.Writer) {
		fmt.Fprintln(w, "  l\tm\tpoints\tdx\tdt\tkernel\tuntil\t")
		for _, m := range p.Modes {
			fmt.Fprintf(w, "  %d\t%d\t%d\t%.4g\t%.4g\t%.4g\t%.5g\t\n", m.L, m.M, m.Points, m.Dx, m.Dt, m.Kernel, m.Until)
		}
	})
	if len(p.Rungs) > 0 {
		b.WriteString("\nRUNGS (each mode runs on neighbouring ones and climbs where its error bar asks for it)\n")
		table(func(w io.Writer) {
			fmt.Fprintln(w, "  modes\tpoints\tdx\tdt\tkernel\tmoments\torder\tuntil\tcore s\t")
			for _, r := range p.Rungs {
				fmt.Fprintf(w, "  %s\t%d\t%.4g\t%.4g\t%.4g\t%d\t%d\t%.5g\t%.2g\t\n",
					r.Modes, r.Points, r.Dx, r.Dt, r.Kernel, r.Moments, r.Order, r.Until, r.CoreSeconds)
			}
		})
	}
	b.WriteString("\nEXPECTED COST\n")
	fmt.Fprintf(&b, "  time    %s of one core, about %s on %d\n", seconds(p.CoreSeconds), seconds(p.CoreSeconds/float64(max(workers, 1))), workers)
	fmt.Fprintf(&b, "  memory  %s\n", size(p.MemoryBytes))
	if len(warnings) > 0 {
		b.WriteString("\nWARNINGS\n")
		for _, w := range warnings {
			b.WriteString("  " + w + "\n")
		}
	}
	return b.String()
}

func sortedKeys(m map[string]float64) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// seconds words an estimate of time.
func seconds(s float64) string {
	if s < 10 {
		return fmt.Sprintf("%.1f s", s)
	}
	return roughly(time.Duration(math.Min(s, 1e9) * float64(time.Second)))
}

// size words an amount of memory.
func size(bytes uint64) string {
	switch b := float64(bytes); {
	case b < 1e6:
		return fmt.Sprintf("%.0f kB", b/1e3)
	case b < 1e9:
		return fmt.Sprintf("%.0f MB", b/1e6)
	default:
		return fmt.Sprintf("%.1f GB", b/1e9)
	}
}

// columns is the width of the terminal that w is, 80 for anything else.
func columns(w io.Writer) int {
	const usual = 80
	f, ok := w.(interface{ Fd() uintptr })
	if !ok {
		return usual
	}
	if width, _, err := term.GetSize(int(f.Fd())); err == nil && width > 0 {
		return width
	}
	return usual
}
