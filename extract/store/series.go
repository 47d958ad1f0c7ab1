package store

import (
	"fmt"
	"strings"

	"nullmark/extract/result"
)

// key names the arrays of a mode, e.g. h_2_1 or err_2_-1.
func key(prefix string, l, m int) string { return fmt.Sprintf("%s_%d_%d", prefix, l, m) }

const (
	errPrefix      = "err"
	evidencePrefix = "evidence"
	tonesPrefix    = "tones"
	indexPrefix    = "index" // and index_t, index_err
	junkName       = "junk_until"
	defaultWave    = "h"
	defaultHorizon = "psi"
)

// decayKey names the arrays of a local index, e.g. index_t_2_1_radius_10.
func decayKey(part string, d *result.LocalIndex) string {
	return key(indexPrefix+part, d.L, d.M) + "_" + strings.ReplaceAll(d.Where, " ", "_")
}

func or(s, fallback string) string {
	if s == "" {
		return fallback
	}
	return s
}

// collector gathers arrays for one npz file and keeps the first fault.
type collector struct {
	file   string
	arrays []array
	seen   map[string]bool
	fault  error
}

func (c *collector) fail(path, problem string) {
	if c.fault == nil {
		c.fault = &Invalid{File: c.file, Path: path, Problem: problem}
	}
}

func (c *collector) add(a array, n int, axis string) {
	have := len(a.reals)
	if a.complex != nil {
		have = len(a.complex)
	}
	if a.scalar == nil && have != n {
		c.fail(a.name, fmt.Sprintf("has %d samples where %s has %d", have, axis, n))
	}
	if c.seen[a.name] {
		c.fail(a.name, "appears twice")
	}
	c.seen[a.name] = true
	c.arrays = append(c.arrays, a)
}

// waveformArrays lists the arrays of waveform.npz; the slices are those of s.
func waveformArrays(s *result.Series) ([]array, error) {
	c := &collector{file: waveformFile, seen: map[string]bool{}}
	n := len(s.U)
	prefix := or(s.Prefix, defaultWave)
	c.add(array{name: "u", reals: s.U}, n, "u")
	for i := range s.Modes {
		m := &s.Modes[i]
		if m.Wave == nil {
			continue
		}
		c.add(array{name: key(prefix, m.L, m.M), complex: m.Wave}, n, "u")
		c.add(array{name: key(errPrefix, m.L, m.M), reals: m.WaveErr}, n, "u")
		if m.Evidence != nil {
			c.add(array{name: key(evidencePrefix, m.L, m.M), reals: m.Evidence}, n, "u")
		}
		if m.Tones != nil {
			c.add(array{name: key(tonesPrefix, m.L, m.M), complex: m.Tones}, n, "u")
		}
	}
	for i := range s.Decay {
		d := &s.Decay[i]
		at := decayKey("_t", d)
		c.add(array{name: at, reals: d.Times}, len(d.Times), at)
		c.add(array{name: decayKey("", d), reals: d.Index}, len(d.Times), at)
		c.add(array{name: decayKey("_err", d), reals: d.Error}, len(d.Times), at)
	}
	if s.T != nil {
		c.add(array{name: "t_p", reals: s.T}, len(s.T), "t_p")
		c.add(array{name: "r_p", reals: s.R}, len(s.T), "t_p")
		c.add(array{name: "phi_p", reals: s.Phi}, len(s.T), "t_p")
	}
	c.add(array{name: junkName, scalar: &s.JunkUntil}, 1, "")
	return c.arrays, c.fault
}

// horizonArrays lists the arrays of horizon.npz; the slices are those of s.
func horizonArrays(s *result.Series) ([]array, error) {
	c := &collector{file: horizonFile, seen: map[string]bool{}}
	n := len(s.V)
	prefix := or(s.HorizonPrefix, defaultHorizon)
	c.add(array{name: "v", reals: s.V}, n, "v")
	for i := range s.Modes {
		m := &s.Modes[i]
		if m.Horizon == nil {
			continue
		}
		c.add(array{name: key(prefix, m.L, m.M), complex: m.Horizon}, n, "v")
		c.add(array{name: key(errPrefix, m.L, m.M), reals: m.HorizonErr}, n, "v")
	}
	return c.arrays, c.fault
}

// hasWave and hasHorizon say whether there is anything to write.
func hasWave(s *result.Series) bool {
	if s == nil {
		return false
	}
	for i := range s.Modes {
		if s.Modes[i].Wave != nil {
			return true
		}
	}
	return s.U != nil || s.T != nil
}

func hasHorizon(s *result.Series) bool {
	if s == nil {
		return false
	}
	for i := range s.Modes {
		if s.Modes[i].Horizon != nil {
			return true
		}
	}
	return s.V != nil
}
