package compare

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"strconv"

	"nullmark/extract/result"
)

// WriteCurves writes the curves behind a comparison as csv: u, then for each
// mode the differences of phase, amplitude and frequency, each followed by its
// bar. A first line holds the units, behind a #; samples at which the
// reference's bar is too large to say anything have empty cells.
func WriteCurves(w io.Writer, c *result.Curves) error {
	b := bufio.NewWriter(w)
	b.WriteString("# M")
	for _, m := range c.Modes {
		if m.Phase != nil {
			b.WriteString(",rad,rad")
		}
		b.WriteString(",1,1")
		if m.Freq != nil {
			b.WriteString(",rad/M,rad/M")
		}
	}
	b.WriteString("\nu")
	for _, m := range c.Modes {
		p := fmt.Sprintf(",l%dm%d_", m.L, m.M)
		if m.Phase != nil {
			b.WriteString(p + "phase" + p + "phase_bar")
		}
		b.WriteString(p + "amplitude" + p + "amplitude_bar")
		if m.Freq != nil {
			b.WriteString(p + "frequency" + p + "frequency_bar")
		}
	}
	b.WriteByte('\n')
	var buf []byte
	cell := func(x float64) {
		buf = append(buf, ',')
		if !math.IsNaN(x) && !math.IsInf(x, 0) {
			buf = strconv.AppendFloat(buf, x, 'g', -1, 64)
		}
	}
	for i, u := range c.U {
		buf = strconv.AppendFloat(buf[:0], u, 'g', -1, 64)
		for _, m := range c.Modes {
			if m.Phase != nil {
				cell(m.Phase[i])
				cell(m.PhaseBar[i])
			}
			cell(m.Amp[i])
			cell(m.AmpBar[i])
			if m.Freq != nil {
				cell(m.Freq[i])
				cell(m.FreqBar[i])
			}
		}
		buf = append(buf, '\n')
		if _, err := b.Write(buf); err != nil {
			return err
		}
	}
	return b.Flush()
}
