// Package app holds the commands: it reads flags and case files, hands a
// resolved case to the engine, stores and shows what comes back, and ends with
// an exit code. It computes nothing.
package app

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime"
	"slices"
	"strings"
	"syscall"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"nullmark/cmd/internal/verify"
	"nullmark/cmd/internal/wire"
	"nullmark/configs"
	"nullmark/extract/result"
)

// An Engine is what the commands need of the numerical side. The main program
// fills it with the functions of package wire.
type Engine struct {
	// Checks gives the physics checks of a case that is being read.
	Checks func() []func(*configs.Case) []configs.Problem
	// Warnings gives what a user should know about a valid case, a sentence each.
	Warnings func(*configs.Case) []string
	// Plan chooses the numerics for a case and evolves nothing.
	Plan func(*configs.Case) (*wire.Plan, error)
	// Run evolves a case. When the context ends it returns an error that wraps
	// the context's; a numerical failure is an *evolve.Failure.
	Run func(context.Context, *configs.Case, wire.Options) (*result.Bundle, error)
	// CanAsk says whether SecondOpinion can be had for a case, by the sentence
	// of its error where not.
	CanAsk func(*configs.Case) error
	// SecondOpinion solves a finished case by another method and stores what
	// that gives in the result.
	SecondOpinion func(ctx context.Context, c *configs.Case, r *result.Result, workers int) error
}

// Run carries out the command line args (without the program's name) and
// returns the exit code. Results go to stdout; progress, warnings and errors go
// to stderr. Interrupt and terminate signals end the command in good order; a
// second one ends it at once.
func Run(ctx context.Context, e Engine, args []string, stdout, stderr io.Writer) int {
	ctx, stop := signal.NotifyContext(ctx, os.Interrupt, syscall.SIGTERM)
	defer stop()
	context.AfterFunc(ctx, stop)

	c := &command{engine: e, stdout: stdout, stderr: stderr, env: os.Environ(), checks: verify.Checks()}
	return c.execute(ctx, args)
}

// command is one invocation: the engine, the streams and the flags.
type command struct {
	engine         Engine
	stdout, stderr io.Writer
	env            []string
	checks         []verify.Check

	out     string
	sets    []string
	workers int
	resume  bool
	force   bool
	quiet   bool
	json    bool
	long    bool
	page    string
	second  bool
}

func (c *command) execute(ctx context.Context, args []string) int {
	out := &watched{w: c.stdout}
	root := c.root()
	root.SetArgs(args)
	root.SetOut(out)
	root.SetErr(c.stderr)
	err := root.ExecuteContext(ctx)
	if err != nil && ctx.Err() != nil && !errors.Is(err, context.Canceled) {
		err = ctx.Err() // what an interruption broke on its way
	}
	if out.err != nil && (err == nil || errors.Is(err, errNotMet) || errors.Is(err, out.err)) {
		err = coded(ExitFiles, fmt.Errorf("cannot write the results to standard output: %w", out.err))
	}
	if err != nil && !errors.Is(err, errNotMet) {
		c.tell(sentence(err))
	}
	return exitCode(err)
}

// tell writes lines to stderr, each under the program's name.
func (c *command) tell(text string) {
	for line := range strings.SplitSeq(strings.TrimRight(text, "\n"), "\n") {
		fmt.Fprintf(c.stderr, "nullmark: %s\n", line)
	}
}

// sentence words an error. An interruption that nobody has worded (by
// interrupted) has no more to say than that.
func sentence(err error) string {
	var worded *codedError
	if errors.Is(err, context.Canceled) && !errors.As(err, &worded) {
		return "interrupted"
	}
	return err.Error()
}

// watched remembers the first failure to write.
type watched struct {
	w   io.Writer
	err error
}

func (w *watched) Write(p []byte) (int, error) {
	n, err := w.w.Write(p)
	if err != nil && w.err == nil {
		w.err = err
	}
	return n, err
}

func (c *command) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "nullmark",
		Short: "Waveforms and fluxes of a small mass around a black hole, each number with an error bar",
		Long: "nullmark evolves the perturbation that a small mass raises around a black hole and gives\n" +
			"waveform and fluxes at null infinity and at the horizon, each number with an error bar.\n\n" +
			"Exit codes: 0 done; 1 done, but an asked-for accuracy or check was not met; 2 usage or bad\n" +
			"input; 3 numerical failure; 4 file system; 130 interrupted.",
		Version:       version(),
		SilenceErrors: true,
		SilenceUsage:  true,
	}
	root.Args = func(_ *cobra.Command, args []string) error {
		if len(args) == 0 {
			return nil
		}
		names := visible(root)
		hint := "there are " + strings.Join(names, ", ")
		if near := root.SuggestionsFor(args[0]); len(near) > 0 {
			hint = "did you mean " + near[0] + "? There are " + strings.Join(names, ", ")
		}
		return usagef("there is no command %q (%s)", args[0], hint)
	}
	root.RunE = func(*cobra.Command, []string) error {
		root.SetOut(c.stderr)
		if err := root.Help(); err != nil {
			return err
		}
		return usagef("name a command: %s", strings.Join(visible(root), ", "))
	}
	root.SetVersionTemplate("{{.Name}} {{.Version}}\n")
	root.SuggestionsMinimumDistance = 2
	root.CompletionOptions.HiddenDefaultCmd = true
	root.SetFlagErrorFunc(flagFault)

	all := root.PersistentFlags()
	all.IntVar(&c.workers, "workers", runtime.GOMAXPROCS(0), "`number` of cores to use; changes no number of the result")
	all.BoolVar(&c.quiet, "quiet", false, "no progress and no warnings on stderr")
	all.BoolVar(&c.json, "json", false, "machine-readable summary on stdout")
	root.PersistentPreRunE = func(*cobra.Command, []string) error {
		if c.workers < 1 {
			return usagef("--workers is %d, but must be 1 or more", c.workers)
		}
		return nil
	}

	root.AddCommand(c.runCommand(), c.planCommand(), c.compareCommand(), c.reportCommand(), c.verifyCommand())
	return root
}

// visible names the commands for a hint.
func visible(root *cobra.Command) []string {
	var names []string
	for _, sub := range root.Commands() {
		if sub.IsAvailableCommand() && sub.Name() != "help" {
			names = append(names, sub.Name())
		}
	}
	slices.Sort(names)
	return names
}

// caseFlags are the flags of commands that read a case.
func (c *command) caseFlags(flags *pflag.FlagSet) {
	flags.StringArrayVar(&c.sets, "set", nil, "one key of the case as `key.path=value`, which beats the file and the environment; repeatable")
}

// one wants exactly one argument.
func one(what, example string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) != 1 {
			return usagef("%s wants one %s, not %d: %s", cmd.Name(), what, len(args), example)
		}
		return nil
	}
}

// flagFault words what is wrong with the flags.
func flagFault(cmd *cobra.Command, err error) error {
	where := cmd.CommandPath() + " --help lists the flags"
	var unknown *pflag.NotExistError
	var missing *pflag.ValueRequiredError
	var wrong *pflag.InvalidValueError
	switch {
	case errors.As(err, &unknown):
		name := "--" + unknown.GetSpecifiedName()
		if unknown.GetSpecifiedShortnames() != "" {
			name = "-" + unknown.GetSpecifiedName()
		}
		return usagef("%s has no flag %s (%s)", cmd.CommandPath(), name, where)
	case errors.As(err, &missing):
		return usagef("--%s wants a value (%s)", missing.GetFlag().Name, where)
	case errors.As(err, &wrong):
		kind := map[string]string{"int": "a whole number", "bool": "true or false"}[wrong.GetFlag().Value.Type()]
		if kind == "" {
			kind = "a " + wrong.GetFlag().Value.Type()
		}
		return usagef("--%s is %q, but must be %s", wrong.GetFlag().Name, wrong.GetValue(), kind)
	}
	return usagef("%w (%s)", err, where)
}

// read resolves a case file and tells its warnings.
func (c *command) read(path string) (*configs.Case, error) {
	reader := configs.Reader{Env: c.env, Sets: c.sets, Checks: c.engine.Checks()}
	kase, err := reader.Read(path)
	return kase, coded(ExitUsage, err)
}

// warn tells warnings on stderr.
func (c *command) warn(warnings []string) {
	if c.quiet {
		return
	}
	for _, w := range warnings {
		c.tell("warning: " + w)
	}
}
