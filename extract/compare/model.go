package compare

import (
	"fmt"
	"sort"

	"nullmark/extract/result"
	"nullmark/extract/table"
)

// InputError is a fault of what the user gave that is not a fault of one file.
type InputError struct{ What, Remedy string }

func (e *InputError) Error() string {
	if e.Remedy == "" {
		return e.What
	}
	return e.What + "; " + e.Remedy
}

// Samples are the raw numbers of one mode.
type Samples struct {
	Z []complex128
	// Err is an absolute error bar of each sample (nil: taken as exact).
	Err []float64
	// Rounded is the relative rounding of the stored numbers beyond double
	// precision, 6e-8 for single precision, else 0.
	Rounded float64
}

// Waveform is a source of modes that share their times. Load may be slow and
// is called once or twice a mode; the result is the caller's to change.
type Waveform interface {
	Times() []float64
	Modes() [][2]int // sorted by l, then m
	Load(l, m int) (Samples, error)
	Notes() []string // what a reader should know, after loading
}

// ModeColumns names the arrays of one mode: a complex one, or real and
// imaginary part.
type ModeColumns struct {
	L, M   int
	Arrays []string
}

// FileWaveform reads a model's modes from an open table.
type FileWaveform struct {
	tab     *table.Table
	times   []float64
	columns []ModeColumns
	single  float64 // rounding of the times
}

// NewFileWaveform checks that every named column is there and has the length
// of the time column; the modes themselves are read when asked for. The table
// must stay open. Faults are *table.Fault.
func NewFileWaveform(tab *table.Table, time string, modes []ModeColumns) (*FileWaveform, error) {
	if len(modes) == 0 {
		return nil, &InputError{What: "model.waveform.modes names no mode", Remedy: `write for example {"2,2": h22}`}
	}
	if err := table.InM(tab, time); err != nil {
		return nil, err
	}
	w := &FileWaveform{tab: tab, columns: append([]ModeColumns(nil), modes...)}
	sort.SliceStable(w.columns, func(i, j int) bool {
		a, b := w.columns[i], w.columns[j]
		return a.L < b.L || a.L == b.L && a.M < b.M
	})
	var err error
	if w.times, err = tab.Increasing(time); err != nil {
		return nil, err
	}
	if c, _ := tab.Lookup(time); c.Single {
		w.single = 6e-8
	}
	for i, m := range w.columns {
		if m.L < 2 || m.M > m.L || m.M < -m.L {
			return nil, &InputError{What: fmt.Sprintf("model.waveform.modes names the mode (%d,%d)", m.L, m.M), Remedy: "write l of 2 or more and m between -l and l"}
		}
		if i > 0 && w.columns[i-1].L == m.L && w.columns[i-1].M == m.M {
			return nil, &InputError{What: fmt.Sprintf("model.waveform.modes names the mode (%d,%d) twice", m.L, m.M)}
		}
		if len(m.Arrays) != 1 && len(m.Arrays) != 2 {
			return nil, &InputError{What: fmt.Sprintf("the mode (%d,%d) of the model has %d arrays", m.L, m.M, len(m.Arrays)), Remedy: "name one complex array, or the real and the imaginary part"}
		}
		for _, name := range m.Arrays {
			c, err := tab.Lookup(name)
			if err != nil {
				return nil, err
			}
			if c.Len != len(w.times) {
				return nil, &table.Fault{File: tab.File(), Array: name, Row: -1, Kind: table.Shape,
					What: fmt.Sprintf("has %d rows where the time column %q has %d", c.Len, time, len(w.times)), Remedy: "give every mode one number a time"}
			}
			if len(m.Arrays) == 2 && c.Complex {
				return nil, &table.Fault{File: tab.File(), Array: name, Row: -1, Kind: table.Shape,
					What: "holds complex numbers where a real or imaginary part is wanted", Remedy: "name it alone"}
			}
			if len(m.Arrays) == 1 && !c.Complex && m.M != 0 {
				return nil, &table.Fault{File: tab.File(), Array: name, Row: -1, Kind: table.Shape,
					What: fmt.Sprintf("holds real numbers where the mode (%d,%d) is complex", m.L, m.M), Remedy: "name a complex array, or [real part, imaginary part]"}
			}
		}
	}
	return w, nil
}

// Times returns the model's times; they must not be changed.
func (w *FileWaveform) Times() []float64 { return w.times }

// Modes implements Waveform.
func (w *FileWaveform) Modes() [][2]int {
	out := make([][2]int, len(w.columns))
	for i, c := range w.columns {
		out[i] = [2]int{c.L, c.M}
	}
	return out
}

// Notes implements Waveform.
func (w *FileWaveform) Notes() []string { return w.tab.Notes() }

// Load implements Waveform.
func (w *FileWaveform) Load(l, m int) (Samples, error) {
	for _, c := range w.columns {
		if c.L != l || c.M != m {
			continue
		}
		var s Samples
		for _, name := range c.Arrays {
			if d, _ := w.tab.Lookup(name); d.Single {
				s.Rounded = 6e-8
			}
		}
		if w.single > 0 {
			s.Rounded = w.single
		}
		var err error
		if len(c.Arrays) == 1 {
			s.Z, err = w.tab.Complex(c.Arrays[0])
			return s, err
		}
		re, err := w.tab.Real(c.Arrays[0])
		if err != nil {
			return s, err
		}
		im, err := w.tab.Real(c.Arrays[1])
		if err != nil {
			return s, err
		}
		s.Z = make([]complex128, len(re))
		for i := range re {
			s.Z[i] = complex(re[i], im[i])
		}
		return s, nil
	}
	panic(fmt.Sprintf("compare: the model has no mode (%d,%d)", l, m))
}

// resultWaveform is another result in the part of the model.
type resultWaveform struct {
	s    *result.Series
	from int
}

// FromResult lets a result stand as the model: its strain with its bars, from
// the end of its start-up on. It needs no Convention.
func FromResult(b *result.Bundle) (Waveform, error) {
	w := &resultWaveform{s: b.Series}
	if b.Series == nil || len(b.Series.U) < 2 || len(b.Series.Modes) == 0 {
		return nil, &InputError{What: "the result holds no waveform", Remedy: "keep it (output.keep: [waveform])"}
	}
	for w.from < len(b.Series.U) && b.Series.U[w.from] < b.Series.JunkUntil {
		w.from++
	}
	if len(b.Series.U)-w.from < 2 {
		return nil, &InputError{What: "the result's waveform is start-up to its end", Remedy: "run it longer (span.until)"}
	}
	return w, nil
}

func (w *resultWaveform) Times() []float64 { return w.s.U[w.from:] }
func (w *resultWaveform) Notes() []string  { return nil }

func (w *resultWaveform) Modes() [][2]int {
	out := make([][2]int, len(w.s.Modes))
	for i, m := range w.s.Modes {
		out[i] = [2]int{m.L, m.M}
	}
	return out
}

func (w *resultWaveform) Load(l, m int) (Samples, error) {
	for i := range w.s.Modes {
		if md := &w.s.Modes[i]; md.L == l && md.M == m {
			s := Samples{Z: append([]complex128(nil), md.Wave[w.from:]...)}
			if md.WaveErr != nil {
				s.Err = append([]float64(nil), md.WaveErr[w.from:]...)
			}
			return s, nil
		}
	}
	panic(fmt.Sprintf("compare: the result has no mode (%d,%d)", l, m))
}
