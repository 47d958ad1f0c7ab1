package store

import (
	"archive/zip"
	"bufio"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"

	"github.com/sbinet/npyio/npy"

	"nullmark/extract/result"
)

// Read gives back what Write stored, and the bytes of case.yaml. Series files
// that were not kept leave their part of Series empty (Series is nil when
// neither was kept); modes come in the order of waveform.npz, then those that
// only horizon.npz has. Result.Case is the decoded JSON. The sums are not
// verified, see Check; but what is read must be whole: *NotResult names the file
// that is not. *FileSystem wraps a failure to read.
func Read(dir string) (*result.Bundle, []byte, error) {
	info, err := os.Stat(dir)
	switch {
	case errors.Is(err, os.ErrNotExist):
		return nil, nil, &NotResult{Dir: dir, Reason: "it does not exist", Err: err}
	case err != nil:
		return nil, nil, &FileSystem{Doing: "read", Path: dir, Err: err}
	case !info.IsDir():
		return nil, nil, &NotResult{Dir: dir, Reason: "it is not a directory"}
	}
	caseYAML, err := readWhole(dir, caseFile)
	if err != nil {
		return nil, nil, err
	}
	data, err := readWhole(dir, resultFile)
	if err != nil {
		return nil, nil, err
	}
	r := new(result.Result)
	if err := json.Unmarshal(data, r); err != nil {
		return nil, nil, &NotResult{Dir: dir, Reason: fmt.Sprintf("%s is not what a run writes (%v)", resultFile, err), Err: err}
	}
	if r.Schema != result.Schema {
		return nil, nil, &NotResult{Dir: dir, Reason: fmt.Sprintf("%s has the schema %q, this version reads %q", resultFile, r.Schema, result.Schema)}
	}
	s := new(result.Series)
	wave, err := readNPZ(dir, waveformFile, func(a array) string { return takeWave(s, a) })
	if err != nil {
		return nil, nil, err
	}
	horizon, err := readNPZ(dir, horizonFile, func(a array) string { return takeHorizon(s, a) })
	if err != nil {
		return nil, nil, err
	}
	if !wave && !horizon {
		s = nil
	}
	spectrum, err := readSpectrum(dir)
	if err != nil {
		return nil, nil, err
	}
	return &result.Bundle{Result: r, Series: s, Spectrum: spectrum}, caseYAML, nil
}

func readWhole(dir, name string) ([]byte, error) {
	data, err := os.ReadFile(filepath.Join(dir, name))
	if errors.Is(err, os.ErrNotExist) {
		return nil, &NotResult{Dir: dir, Reason: "it has no " + name, Err: err}
	}
	if err != nil {
		return nil, &FileSystem{Doing: "read " + name + " of", Path: dir, Err: err}
	}
	return data, nil
}

// readNPZ hands every array of dir/name to take, which answers with what is
// wrong with it or "". It reports whether the file is there.
func readNPZ(dir, name string, take func(array) string) (bool, error) {
	f, err := os.Open(filepath.Join(dir, name))
	if errors.Is(err, os.ErrNotExist) {
		return false, nil
	}
	if err != nil {
		return false, &FileSystem{Doing: "read " + name + " of", Path: dir, Err: err}
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return false, &FileSystem{Doing: "read " + name + " of", Path: dir, Err: err}
	}
	if err := scanNPZ(f, info.Size(), take); err != nil {
		return false, &NotResult{Dir: dir, Reason: name + " " + err.Error(), Err: err}
	}
	return true, nil
}

// scanNPZ does the same with a file of the given size.
func scanNPZ(r io.ReaderAt, size int64, take func(array) string) error {
	z, err := zip.NewReader(r, size)
	if err != nil {
		return fmt.Errorf("is damaged: it is no zip archive (%w)", err)
	}
	for _, entry := range z.File {
		// Deflate shrinks at most 1032 times; a larger claim is false.
		if entry.UncompressedSize64/1032 > uint64(size) {
			return fmt.Errorf("is damaged at %s: it cannot hold %d bytes", entry.Name, entry.UncompressedSize64)
		}
		a, err := readArray(entry)
		if err != nil {
			return fmt.Errorf("is damaged at %s: %w", entry.Name, err)
		}
		if fault := take(a); fault != "" {
			return fmt.Errorf("is inconsistent: %s %s", entry.Name, fault)
		}
	}
	return nil
}

// readArray decodes one entry and verifies its checksum.
func readArray(entry *zip.File) (a array, err error) {
	a.name = strings.TrimSuffix(entry.Name, ".npy")
	rc, err := entry.Open()
	if err != nil {
		return a, err
	}
	defer rc.Close()
	in := whole{bufio.NewReaderSize(rc, 4*chunk)}
	// npyio trusts the header, even where it has no newline or a length beyond
	// the file; only headers that writeNPZ can have written are let through.
	start, err := in.Peek(len(npyMagic) + 2)
	if err != nil || string(start) != npyMagic+"\x01\x00" {
		return a, errors.New("no array of format 1.0")
	}
	defer func() {
		if p := recover(); p != nil {
			err = errors.New("malformed array header")
		}
	}()
	r, err := npy.NewReader(in)
	if err != nil {
		return a, err
	}
	h := r.Header.Descr
	switch {
	case len(h.Shape) > 1 || len(h.Shape) == 1 && (h.Shape[0] < 0 || uint64(h.Shape[0]) > entry.UncompressedSize64/8):
		return a, fmt.Errorf("unexpected shape %v", h.Shape)
	case h.Type == "<f8" && len(h.Shape) == 0:
		a.scalar = new(float64)
		err = r.Read(a.scalar)
	case h.Type == "<f8":
		a.reals = make([]float64, h.Shape[0])
		if h.Shape[0] > 0 {
			err = r.Read(&a.reals)
		}
	case h.Type == "<c16" && len(h.Shape) == 1:
		a.complex = make([]complex128, h.Shape[0])
		if h.Shape[0] > 0 {
			err = r.Read(&a.complex)
		}
	default:
		return a, fmt.Errorf("unexpected type %s of shape %v", h.Type, h.Shape)
	}
	if err != nil {
		return a, err
	}
	// The end of the entry is where its checksum is verified.
	if _, err := in.Reader.ReadByte(); err == nil {
		return a, errors.New("more data than its header says")
	} else if err != io.EOF {
		return a, err
	}
	return a, nil
}

// whole is a reader that fills the whole of p or fails. npyio takes a short read
// for a full one, and an end of file for data.
type whole struct{ *bufio.Reader }

func (w whole) Read(p []byte) (int, error) {
	n, err := io.ReadFull(w.Reader, p)
	if err == io.EOF {
		err = io.ErrUnexpectedEOF
	}
	return n, err
}

var decayName = regexp.MustCompile(`^index(|_t|_err)_(\d+)_(-?\d+)_([A-Za-z0-9_.]+)$`)

// takeDecay puts an array of a local index, whose times come first, into s.
func takeDecay(s *result.Series, a array) (fault string, ok bool) {
	part := decayName.FindStringSubmatch(a.name)
	if part == nil || a.reals == nil {
		return "", false
	}
	l, errL := strconv.Atoi(part[2])
	m, errM := strconv.Atoi(part[3])
	if errL != nil || errM != nil {
		return "", false
	}
	where := strings.ReplaceAll(part[4], "_", " ")
	if part[1] == "_t" {
		s.Decay = append(s.Decay, result.LocalIndex{L: l, M: m, Where: where, Times: a.reals})
		return "", true
	}
	n := len(s.Decay) - 1
	if n < 0 || s.Decay[n].L != l || s.Decay[n].M != m || s.Decay[n].Where != where {
		return "comes without its times", true
	}
	if part[1] == "" {
		s.Decay[n].Index = a.reals
	} else {
		s.Decay[n].Error = a.reals
	}
	return lengthFault(a, len(s.Decay[n].Times), decayKey("_t", &s.Decay[n])), true
}

var modeName = regexp.MustCompile(`^([A-Za-z]+)_(\d+)_(-?\d+)$`)

// splitKey undoes key.
func splitKey(name string) (prefix string, l, m int, ok bool) {
	part := modeName.FindStringSubmatch(name)
	if part == nil {
		return "", 0, 0, false
	}
	l, errL := strconv.Atoi(part[2])
	m, errM := strconv.Atoi(part[3])
	return part[1], l, m, errL == nil && errM == nil
}

// modeOf finds the mode (l,m) in s, or appends it.
func modeOf(s *result.Series, l, m int) *result.ModeSeries {
	for i := range s.Modes {
		if s.Modes[i].L == l && s.Modes[i].M == m {
			return &s.Modes[i]
		}
	}
	s.Modes = append(s.Modes, result.ModeSeries{L: l, M: m})
	return &s.Modes[len(s.Modes)-1]
}

func lengthFault(a array, n int, axis string) string {
	if have := len(a.reals) + len(a.complex); have != n {
		return fmt.Sprintf("has %d samples where %s has %d", have, axis, n)
	}
	return ""
}

const unknownArray = "is no array of this file"

// takeWave puts an array of waveform.npz, whose axis comes first, into s.
func takeWave(s *result.Series, a array) string {
	switch {
	case a.name == junkName && a.scalar != nil:
		s.JunkUntil = *a.scalar
		return ""
	case a.scalar != nil:
		return unknownArray
	case a.name == "u" && a.reals != nil:
		s.U = a.reals
		return ""
	case a.name == "t_p" && a.reals != nil:
		s.T = a.reals
		return ""
	case a.name == "r_p" && a.reals != nil:
		s.R = a.reals
		return lengthFault(a, len(s.T), "t_p")
	case a.name == "phi_p" && a.reals != nil:
		s.Phi = a.reals
		return lengthFault(a, len(s.T), "t_p")
	}
	if fault, ok := takeDecay(s, a); ok {
		return fault
	}
	prefix, l, m, ok := splitKey(a.name)
	switch {
	case !ok:
		return unknownArray
	case prefix == errPrefix && a.reals != nil:
		modeOf(s, l, m).WaveErr = a.reals
	case prefix == evidencePrefix && a.reals != nil:
		modeOf(s, l, m).Evidence = a.reals
	case prefix == tonesPrefix && a.complex != nil:
		modeOf(s, l, m).Tones = a.complex
	case a.complex != nil:
		s.Prefix = prefix
		modeOf(s, l, m).Wave = a.complex
	default:
		return unknownArray
	}
	return lengthFault(a, len(s.U), "u")
}

// takeHorizon puts an array of horizon.npz, whose axis comes first, into s.
func takeHorizon(s *result.Series, a array) string {
	if a.name == "v" && a.reals != nil {
		s.V = a.reals
		return ""
	}
	prefix, l, m, ok := splitKey(a.name)
	switch {
	case !ok || a.scalar != nil:
		return unknownArray
	case prefix == errPrefix && a.reals != nil:
		modeOf(s, l, m).HorizonErr = a.reals
	case a.complex != nil:
		s.HorizonPrefix = prefix
		modeOf(s, l, m).Horizon = a.complex
	default:
		return unknownArray
	}
	return lengthFault(a, len(s.V), "v")
}
