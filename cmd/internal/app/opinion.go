package app

import (
	"fmt"
	"io"
	"text/tabwriter"

	"nullmark/extract/result"
)

// opinions prints the numbers of two methods beside each other: the sums over l
// where the result has them, and the modes otherwise.
func opinions(out io.Writer, all []result.SecondOpinion) error {
	sums := false
	outside := 0
	for _, o := range all {
		sums = sums || o.L == 0
		if o.InBars > 1 {
			outside++
		}
	}
	w := tabwriter.NewWriter(out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "\nSecond opinion (frequency domain)")
	fmt.Fprintln(w, "number\tthis run\t± bar\tfrequency domain\tdifference\tin bars")
	for _, o := range all {
		if sums && o.L != 0 {
			continue
		}
		name := fmt.Sprintf("m = %d, all l, %s", o.M, o.What)
		if o.L != 0 {
			name = fmt.Sprintf("(%d,%d) %s", o.L, o.M, o.What)
		}
		fmt.Fprintf(w, "%s\t%.13g\t%.1e\t%.13g\t%.1e\t%.2g\n", name, o.Value.Value, o.Value.Error, o.Second.Value, o.Difference, o.InBars)
	}
	if err := w.Flush(); err != nil {
		return err
	}
	_, err := fmt.Fprintf(out, "%d of %d numbers differ by more than one bar; all are in result.json under second_opinion.\n", outside, len(all))
	return err
}
