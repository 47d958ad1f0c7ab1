// Package verify holds the built-in checks: numbers that were published, or
// computed independently of this tool, beside what the tool finds for them
// now. No expected value here has come from the tool.
//
// A check passes when the distance between the two numbers is covered by the
// tool's own error bar plus what the source claims for its digits. The bar is
// thus checked together with the number: an honest number with a bar that is
// too small fails like a wrong number.
//
// Units are G = c = M = 1 with the particle's mass factored out.
package verify

import (
	"context"
	"fmt"
	"math"
	"strings"
	"time"

	"nullmark/extract/result"
)

// Schema names the layout of the machine-readable outcome.
const Schema = "nullmark.verification/1"

// A Check is one published number and the way to find it with this tool.
type Check struct {
	Group     string  // "equation", "slicing", "source", "extraction", "error bars" or "Kerr"
	Name      string  // what is compared, with its place
	Source    Source  // where Published comes from
	Published float64 // the number there
	Tolerance float64 // absolute: what the source claims for it, at least half a unit of its last digit
	Slow      bool    // runs only when asked for
	// Cases are what has to be run for it.
	Cases []Case
	// Ours finds the same number with its error bar in the results of Cases,
	// which come in the same order and are not to be modified.
	Ours func(r []*result.Result) (result.Q, error)
}

// A Case is one that comes with the tool, by its file's name, with some keys
// changed, written "key.path=value".
type Case struct {
	Shipped string
	Changes []string
}

func (c Case) key() string { return c.Shipped + "\n" + strings.Join(c.Changes, "\n") }

// A Source is where a published number stands.
type Source struct {
	Short string // for a column: "Martel 2004"
	Full  string // author, journal, year, table, and whether read or from memory
}

// A Row is the outcome of one check.
type Row struct {
	Group     string    `json:"group"`
	Name      string    `json:"check"`
	Source    string    `json:"source"`
	Citation  string    `json:"citation"`
	Published float64   `json:"published"`
	Tolerance float64   `json:"tolerance"` // absolute, as the source claims
	Ours      *result.Q `json:"ours"`      // null when it could not be found
	// Deviation is |ours - published| in units of our bar plus the source's
	// tolerance; at most 1 passes. Absent when ours is.
	Deviation *float64 `json:"deviation"`
	Pass      bool     `json:"pass"`
	Failure   string   `json:"failure,omitempty"` // why ours could not be found
	// Seconds is the time this check took. A case that several checks need is
	// run once, for the first of them.
	Seconds float64 `json:"seconds"`
}

// An Outcome is a whole verification.
type Outcome struct {
	Schema  string  `json:"schema"`
	Passed  bool    `json:"passed"`
	Failed  int     `json:"failed"`
	Seconds float64 `json:"seconds"`
	Checks  []Row   `json:"checks"`
}

// A Runner runs a case, the i-th of n, counted from 0, with the second opinion
// where the equation is teukolsky and the orbit circular.
type Runner func(ctx context.Context, c Case, i, n int) (*result.Bundle, error)

// Run runs the checks in their order, the slow ones only when long is set, and
// each distinct case once. The error is not nil only when the context ended: a
// check that cannot be carried out is a row that fails.
func Run(ctx context.Context, checks []Check, run Runner, long bool) (*Outcome, error) {
	var chosen []Check
	lab := lab{run: run, cases: map[string]*caseRun{}}
	for _, c := range checks {
		if c.Slow && !long {
			continue
		}
		chosen = append(chosen, c)
		for _, kase := range c.Cases {
			lab.cases[kase.key()] = &caseRun{}
		}
	}
	out := &Outcome{Schema: Schema, Passed: true, Checks: make([]Row, 0, len(chosen))}
	for _, c := range chosen {
		start := time.Now()
		row := c.carryOut(ctx, &lab)
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		row.Seconds = time.Since(start).Seconds()
		out.Seconds += row.Seconds
		if !row.Pass {
			out.Failed++
			out.Passed = false
		}
		out.Checks = append(out.Checks, row)
	}
	return out, nil
}

// lab runs each distinct case once.
type lab struct {
	run   Runner
	cases map[string]*caseRun
	done  int
}

type caseRun struct {
	done   bool
	result *result.Result
	err    error
}

func (l *lab) result(ctx context.Context, kase Case) (*result.Result, error) {
	c := l.cases[kase.key()]
	if c.done {
		return c.result, c.err
	}
	b, err := l.run(ctx, kase, l.done, len(l.cases))
	l.done++
	c.done = true
	switch {
	case err != nil:
		c.err = err
	case b == nil || b.Result == nil:
		c.err = fmt.Errorf("the run gave no result")
	default:
		c.result = b.Result
	}
	return c.result, c.err
}

// carryOut finds our number and judges it.
func (c Check) carryOut(ctx context.Context, lab *lab) Row {
	row := Row{Group: c.Group, Name: c.Name, Source: c.Source.Short, Citation: c.Source.Full,
		Published: c.Published, Tolerance: c.Tolerance}
	var results []*result.Result
	for _, kase := range c.Cases {
		r, err := lab.result(ctx, kase)
		if err != nil {
			row.Failure = err.Error()
			return row
		}
		results = append(results, r)
	}
	q, err := c.Ours(results)
	switch {
	case err != nil:
		row.Failure = err.Error()
		return row
	case math.IsNaN(q.Value) || math.IsInf(q.Value, 0) || !(q.Error >= 0) || math.IsInf(q.Error, 0):
		row.Failure = fmt.Sprintf("found %v with the bar %v, which is no number with a bar", q.Value, q.Error)
		return row
	}
	row.Ours = &q
	d := math.Abs(q.Value-c.Published) / (q.Error + c.Tolerance)
	if q.Value == c.Published {
		d = 0
	}
	if math.IsInf(d, 0) {
		d = math.MaxFloat64 // no bar on either side, and yet apart: JSON has no infinity
	}
	row.Deviation = &d
	row.Pass = d <= 1
	return row
}
