package store

import (
	"bufio"
	"encoding/csv"
	"fmt"
	"io"
	"strconv"

	"nullmark/extract/result"
)

// Rows of flux.csv.
const (
	rowMode       = "mode"
	rowSum        = "sum"
	rowTruncation = "truncation"
)

// units names what the flux columns hold for a measure.
func units(measure string) string {
	switch measure {
	case "total":
		return "radiated totals, energy in mu^2/M, angular momentum in mu^2"
	case "rate":
		return "averages per coordinate time, energy in (mu/M)^2, angular momentum in mu^2/M"
	}
	return "energy and angular momentum in G = c = M = mu = 1"
}

// hasFlux says whether flux.csv would have a row.
func hasFlux(r *result.Result) bool {
	for i := range r.Modes {
		if r.Modes[i].Infinity != nil || r.Modes[i].Horizon != nil {
			return true
		}
	}
	return r.Total != nil && (r.Total.Infinity != nil || r.Total.Horizon != nil)
}

// measureOf is the measure of the sum, or of the first mode.
func measureOf(r *result.Result) string {
	if r.Total != nil && r.Total.Measure != "" {
		return r.Total.Measure
	}
	if len(r.Modes) > 0 {
		return r.Modes[0].Measure
	}
	return ""
}

// writeFlux writes flux.csv: a line of units, the header, one row a mode, the
// sum, and the estimated tail in l that the sum includes. A flux that was not
// computed is an empty cell. Numbers have 17 significant digits.
func writeFlux(w io.Writer, r *result.Result) error {
	b := bufio.NewWriter(w)
	fmt.Fprintf(b, "# G = c = M = 1; %s; losses of the orbit are positive; errors are absolute; the sum includes the row %s\n",
		units(measureOf(r)), rowTruncation)
	rows := csv.NewWriter(b)
	head := []string{"row", "l", "m", "parity", "measure", "counts"}
	for _, c := range []string{"energy_infinity", "energy_horizon", "angular_momentum_infinity", "angular_momentum_horizon"} {
		head = append(head, c, c+"_error")
	}
	rows.Write(head) // errors stay in rows and are asked for below
	for i := range r.Modes {
		m := &r.Modes[i]
		label := []string{rowMode, strconv.Itoa(m.L), strconv.Itoa(m.M), m.Parity, m.Measure, m.Counts}
		rows.Write(append(label, cells(m.Infinity, m.Horizon)...))
	}
	if t := r.Total; t != nil {
		rows.Write(append([]string{rowSum, "", "", "", t.Measure, ""}, cells(t.Infinity, t.Horizon)...))
		if x := t.Truncation; x != nil {
			rows.Write(append([]string{rowTruncation, "", "", "", t.Measure, ""}, cells(x.Infinity, x.Horizon)...))
		}
	}
	rows.Flush()
	if err := rows.Error(); err != nil {
		return err
	}
	return b.Flush()
}

// cells gives the four fluxes of a row, each followed by its error.
func cells(infinity, horizon *result.Flux) []string {
	out := make([]string, 8)
	for i, f := range []*result.Flux{infinity, horizon} {
		if f == nil {
			continue
		}
		out[2*i], out[2*i+1] = digits(f.Energy.Value), digits(f.Energy.Error)
		out[4+2*i], out[4+2*i+1] = digits(f.AngularMomentum.Value), digits(f.AngularMomentum.Error)
	}
	return out
}

// digits writes x with 17 significant digits, enough to give back x.
func digits(x float64) string { return strconv.FormatFloat(x, 'e', 16, 64) }
