// Package store writes and reads result directories:
//
//	case.yaml      the resolved case, byte for byte as handed in
//	result.json    result.Result
//	waveform.npz   u, h_l_m, err_l_m, evidence_l_m, t_p, r_p, phi_p, junk_until
//	horizon.npz    v, psi_l_m, err_l_m
//	flux.csv       fluxes by mode and summed
//	spectrum.csv   dE/domega of a burst
//	report.html    a page made elsewhere
//	SHA256SUMS     of the rest, as `sha256sum -c` reads it
//
// A directory is written whole or not at all, and the same numbers give the
// same bytes. A directory has one writer at a time; readers may come at any
// moment.
package store

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"nullmark/extract/result"
)

// Names of the files of a result directory.
const (
	caseFile     = "case.yaml"
	resultFile   = "result.json"
	waveformFile = "waveform.npz"
	horizonFile  = "horizon.npz"
	fluxFile     = "flux.csv"
	spectrumFile = "spectrum.csv"
	reportFile   = "report.html"
	sumsFile     = "SHA256SUMS"
	partialDir   = ".partial"
)

// own lists what may lie in a result directory and goes when it is replaced.
func own(name string) bool {
	switch name {
	case caseFile, resultFile, waveformFile, horizonFile, fluxFile, spectrumFile, reportFile, sumsFile, partialDir,
		"comparison.json", "comparison.html", "comparison.csv":
		return true
	}
	return strings.HasPrefix(name, addMark)
}

// Parts says which files accompany case.yaml, result.json and SHA256SUMS.
type Parts struct {
	Waveform bool   // waveform.npz, when the bundle has a series at null infinity
	Horizon  bool   // horizon.npz, when the bundle has a series at the horizon
	Flux     bool   // flux.csv, when the result has fluxes, and spectrum.csv, when the bundle has a spectrum
	Report   []byte // report.html as it stands; nil = none
}

// Ready says before a run whether Write could replace dir: nil when dir is
// absent, empty, holds only the checkpoints of an interrupted run, or holds a
// result of the same case (its case.yaml equals caseYAML byte for byte); with
// force also when it holds another case's result. Otherwise *Exists, or
// *FileSystem when dir cannot be looked at. If an earlier process died while it
// replaced dir, the earlier result is put back; nothing else is changed.
func Ready(dir string, caseYAML []byte, force bool) error {
	_, err := ready(system{}, dir, caseYAML, force)
	return err
}

func ready(d disk, dir string, caseYAML []byte, force bool) (string, error) {
	look := func(err error) error { return &FileSystem{Doing: "look at", Path: dir, Err: err} }
	real, err := resolve(dir)
	if err != nil {
		return "", look(err)
	}
	if err := restore(d, real); err != nil {
		return "", &FileSystem{Doing: "restore the earlier result in", Path: dir, Err: err}
	}
	info, err := os.Stat(real)
	if errors.Is(err, os.ErrNotExist) {
		return real, nil
	}
	if err != nil {
		return "", look(err)
	}
	if !info.IsDir() {
		return "", &Exists{Dir: dir, NotDir: true}
	}
	entries, err := os.ReadDir(real)
	if err != nil {
		return "", look(err)
	}
	exists := &Exists{Dir: dir}
	result := false
	for _, e := range entries {
		if !own(e.Name()) {
			exists.Foreign = append(exists.Foreign, e.Name())
		} else if e.Name() != partialDir {
			result = true
		}
	}
	if len(exists.Foreign) > 0 {
		return "", exists
	}
	if !result || force {
		return real, nil
	}
	stored, err := os.ReadFile(filepath.Join(real, caseFile))
	if err != nil && !errors.Is(err, os.ErrNotExist) {
		return "", look(err)
	}
	if err != nil || !bytes.Equal(stored, caseYAML) {
		return "", exists
	}
	return real, nil
}

// Write stores a finished run as the directory dir, whose missing parents are
// created. The files are written and synced in a hidden directory beside dir,
// which then takes dir's place in one step (two renames where the system knows
// no exchange); checkpoints in dir go with what is replaced. What interrupted
// writes left behind is removed. When Ready would refuse, Write does so with the
// same error.
//
// The bundle is only read, and its arrays are not copied. Every stored mode
// needs samples and error bars as long as its axis, and every number of
// result.json must be finite (infinities inside Case, a decoded YAML tree, are
// written as ".inf"); otherwise *Invalid, and nothing is written. A failed
// operation of the system gives *FileSystem; dir is then what it was before,
// unless the error's Note says that the new result is already in place.
func Write(dir string, b *result.Bundle, caseYAML []byte, parts Parts, force bool) error {
	return write(system{}, dir, b, caseYAML, parts, force)
}

// An item is a file to be written.
type item struct {
	name string
	fill func(io.Writer) error
}

func blob(name string, data []byte) item {
	return item{name, func(w io.Writer) error { _, err := w.Write(data); return err }}
}

// items lists the files of a bundle in the order of writing.
func items(b *result.Bundle, caseYAML []byte, parts Parts) ([]item, error) {
	if b == nil || b.Result == nil {
		panic("store: a bundle without a result")
	}
	r, err := prepare(b.Result)
	if err != nil {
		return nil, err
	}
	// Encoding into nothing finds a Case that JSON cannot hold before any file
	// exists.
	if err := encodeJSON(io.Discard, r); err != nil {
		return nil, &Invalid{File: resultFile, Path: "case", Problem: fmt.Sprintf("cannot be written as JSON (%v)", err)}
	}
	out := []item{
		blob(caseFile, caseYAML),
		{resultFile, func(w io.Writer) error { return encodeJSON(w, r) }},
	}
	series := func(name string, list func(*result.Series) ([]array, error)) error {
		arrays, err := list(b.Series)
		out = append(out, item{name, func(w io.Writer) error { return writeNPZ(w, arrays) }})
		return err
	}
	if parts.Waveform && hasWave(b.Series) {
		if err := series(waveformFile, waveformArrays); err != nil {
			return nil, err
		}
	}
	if parts.Horizon && hasHorizon(b.Series) {
		if err := series(horizonFile, horizonArrays); err != nil {
			return nil, err
		}
	}
	if parts.Flux && hasFlux(r) {
		out = append(out, item{fluxFile, func(w io.Writer) error { return writeFlux(w, r) }})
	}
	if parts.Flux && b.Spectrum != nil {
		if err := checkSpectrum(b.Spectrum); err != nil {
			return nil, err
		}
		out = append(out, item{spectrumFile, func(w io.Writer) error { return writeSpectrum(w, b.Spectrum) }})
	}
	if parts.Report != nil {
		out = append(out, blob(reportFile, parts.Report))
	}
	return out, nil
}

func write(d disk, dir string, b *result.Bundle, caseYAML []byte, parts Parts, force bool) (err error) {
	list, err := items(b, caseYAML, parts)
	if err != nil {
		return err
	}
	real, err := ready(d, dir, caseYAML, force)
	if err != nil {
		return err
	}
	failed := func(doing string, err error) error { return &FileSystem{Doing: doing, Path: dir, Err: err} }

	parent := filepath.Dir(real)
	if err := mkdirDurable(d, parent); err != nil {
		return failed("create the directory that shall hold", err)
	}
	if err := tidy(d, real); err != nil {
		return failed("remove what an interrupted run left beside", err)
	}
	holder, err := d.MkdirTemp(parent, "."+filepath.Base(real)+holderMark)
	if err != nil {
		return failed("write", err)
	}
	defer func() {
		// Whatever went wrong, nothing hidden stays behind; only the sole copy
		// of an earlier result would, and the error says where.
		if err == nil {
			return
		}
		tidyErr := tidy(d, real)
		var fsErr *FileSystem
		if old := filepath.Join(holder, oldName); errors.As(err, &fsErr) && !present(real) && present(old) {
			fsErr.Note = "the earlier result is kept in " + old + " and put back by the next run"
		} else if tidyErr != nil && fsErr != nil && fsErr.Note == "" {
			fsErr.Note = "unfinished files stay in " + holder + " and are removed by the next run"
		}
	}()

	fresh := filepath.Join(holder, newName)
	if err := d.Mkdir(fresh); err != nil {
		return failed("write", err)
	}
	sums, err := writeItems(d, fresh, list)
	if err != nil {
		err.(*FileSystem).Path = dir
		return err
	}
	if err := writeFile(d, filepath.Join(fresh, sumsFile), blob(sumsFile, formatSums(sums)).fill); err != nil {
		return failed("write "+sumsFile+" of", err)
	}
	if err := d.SyncDir(fresh); err != nil {
		return failed("write", err)
	}
	if err := swap(d, holder, real); err != nil {
		fail := &FileSystem{Doing: "move the new result to", Path: dir, Err: err}
		if !present(fresh) || replaced(real, sums) {
			fail.Note = "the new result is in place, but may not outlast a power failure"
		}
		return fail
	}
	if err := d.RemoveAll(holder); err != nil {
		return &FileSystem{Doing: "remove what was replaced by", Path: dir, Err: err, Note: "the new result is in place"}
	}
	return nil
}

// replaced says whether the sums in dir are those just written.
func replaced(dir string, sums []sum) bool {
	data, err := os.ReadFile(filepath.Join(dir, sumsFile))
	return err == nil && bytes.Equal(data, formatSums(sums))
}

// writeItems writes files into dir and sums them on the way.
func writeItems(d disk, dir string, list []item) ([]sum, error) {
	var sums []sum
	for _, it := range list {
		h := sha256.New()
		err := writeFile(d, filepath.Join(dir, it.name), func(w io.Writer) error {
			return it.fill(io.MultiWriter(w, h))
		})
		if err != nil {
			return nil, &FileSystem{Doing: "write " + it.name + " of", Path: dir, Err: err}
		}
		sums = append(sums, sum{it.name, hex.EncodeToString(h.Sum(nil))})
	}
	return sums, nil
}

// Add puts files (a report rendered again, a comparison) into the result
// directory dir, replacing those of the same name, and brings SHA256SUMS up to
// date. Each file appears whole; SHA256SUMS is replaced last, so that after a
// failure between the two Check names the file, and adding it again mends it.
// Names must be those of files that are not a run's data; others panic. Errors:
// *NotResult when dir has no SHA256SUMS, *FileSystem.
func Add(dir string, files map[string][]byte) error { return add(system{}, dir, files) }

func add(d disk, dir string, files map[string][]byte) (err error) {
	names := make([]string, 0, len(files))
	for name := range files {
		switch {
		case !plainName(name), slices.Contains([]string{caseFile, resultFile, waveformFile, horizonFile, fluxFile, spectrumFile, sumsFile}, name):
			panic("store: " + name + " cannot be added to a result")
		}
		names = append(names, name)
	}
	slices.Sort(names)
	sums, err := readSums(dir)
	if errors.Is(err, os.ErrNotExist) || errors.Is(err, errMalformedSums) {
		return &NotResult{Dir: dir, Reason: "it has no usable " + sumsFile, Err: err}
	}
	failed := func(doing string, err error) error { return &FileSystem{Doing: doing, Path: dir, Err: err} }
	if err != nil {
		return failed("read "+sumsFile+" of", err)
	}
	if err := tidyAdded(d, dir); err != nil {
		return failed("remove what an interrupted command left in", err)
	}
	holder, err := d.MkdirTemp(dir, addMark)
	if err != nil {
		return failed("add files to", err)
	}
	defer func() {
		if removeErr := d.RemoveAll(holder); removeErr != nil && err == nil {
			err = failed("remove temporary files from", removeErr)
		}
	}()
	var list []item
	for _, name := range names {
		list = append(list, blob(name, files[name]))
	}
	fresh, err := writeItems(d, holder, list)
	if err != nil {
		err.(*FileSystem).Path = dir
		return err
	}
	sums = slices.DeleteFunc(sums, func(s sum) bool { return slices.Contains(names, s.name) })
	sums = append(sums, fresh...)
	if err := writeFile(d, filepath.Join(holder, sumsFile), blob(sumsFile, formatSums(sums)).fill); err != nil {
		return failed("write "+sumsFile+" of", err)
	}
	for _, name := range append(names, sumsFile) {
		if err := d.Rename(filepath.Join(holder, name), filepath.Join(dir, name)); err != nil {
			return failed("put "+name+" into", err)
		}
	}
	if err := d.SyncDir(dir); err != nil {
		return failed("add files to", err)
	}
	return nil
}

// tidyAdded removes the holders of interrupted additions.
func tidyAdded(d disk, dir string) error {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return err
	}
	for _, e := range entries {
		if strings.HasPrefix(e.Name(), addMark) {
			if err := d.RemoveAll(filepath.Join(dir, e.Name())); err != nil {
				return err
			}
		}
	}
	return nil
}
