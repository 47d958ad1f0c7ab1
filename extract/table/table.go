// Package table reads columns of numbers out of files that other people wrote:
// npz, npy and csv. It trusts nothing that a file says about itself. Memory is
// only taken for bytes that have been seen, archives that expand beyond reason
// are refused, pickled objects are refused and never executed, and every fault
// is a *Fault that names the file and the row, line or array.
//
// Numbers come out as float64 or complex128 in the order of their rows,
// whatever byte order, item size or memory order they were stored in.
package table

import (
	"bytes"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"sort"
	"strings"
)

// Column describes one column of a file.
type Column struct {
	Name    string
	Unit    string // as written in a csv heading, "" where none stands
	Len     int
	Complex bool
	Single  bool // stored with 24 binary digits or fewer
}

// source gives the numbers of one column; exactly one of the two results is
// used, as Column.Complex says.
type source interface {
	load(t *Table, c Column) ([]float64, []complex128, error)
}

// Table is an open file. It is safe for one goroutine at a time.
type Table struct {
	file    string
	columns []Column
	sources []source
	index   map[string]int
	odd     map[string]*Fault // names that exist but are no columns, and why
	closer  io.Closer
	notes   []string
	runs    []run // of text: which line a row stands on
}

// run is a stretch of rows on lines that follow each other.
type run struct{ row, line int }

// line is the line of a row of a text file, 0 in other files.
func (t *Table) line(row int) int {
	for i := len(t.runs) - 1; i >= 0; i-- {
		if r := t.runs[i]; r.row <= row {
			return r.line + row - r.row
		}
	}
	return 0
}

// Open opens the file at path, whose kind is decided by its first bytes and
// must agree with its name (.npz, .npy; anything else is text). The numbers of
// npz and npy files are read when asked for; the caller closes the table.
// Errors are *Fault.
func Open(path string) (*Table, error) {
	f, err := os.Open(path)
	if err != nil {
		what := err.Error()
		var pe *os.PathError
		if errors.As(err, &pe) {
			what = pe.Err.Error()
		}
		return nil, fault(path, "", Unreadable, "", "cannot be opened: %s", what)
	}
	info, err := f.Stat()
	if err == nil && !info.Mode().IsRegular() {
		f.Close()
		return nil, fault(path, "", Unreadable, "", "is not a regular file")
	}
	if err != nil {
		f.Close()
		return nil, fault(path, "", Unreadable, "", "cannot be read: %v", err)
	}
	t, err := New(path, f, info.Size())
	if err != nil {
		f.Close()
		return nil, err
	}
	t.closer = f
	return t, nil
}

// New reads a table of size bytes from r; file is the name used in messages
// and to tell what the file claims to be. r must stay readable until the last
// column has been read. Errors are *Fault.
func New(file string, r io.ReaderAt, size int64) (*Table, error) {
	t := &Table{file: file, index: map[string]int{}, odd: map[string]*Fault{}}
	var head [8]byte
	n, err := r.ReadAt(head[:min(8, size)], 0)
	if err != nil && err != io.EOF {
		return nil, fault(file, "", Unreadable, "", "cannot be read: %v", err)
	}
	is := sniff(head[:n])
	says := strings.ToLower(filepath.Ext(file))
	switch {
	case size == 0:
		return nil, fault(file, "", Truncated, "", "is empty")
	case is == "pickle":
		return nil, fault(file, "", Refused, "write plain arrays with numpy.savez",
			"holds a pickled Python object, which is never executed here")
	case is == "hdf5", is == "gzip":
		return nil, fault(file, "", Format, "write it with numpy.savez, numpy.save or as csv", "is a %s file, which is not read here", is)
	case says == ".npz" && is != "npz":
		return nil, fault(file, "", Format, "write it with numpy.savez, or name it for what it is", "is named .npz but holds %s", spoken(is))
	case says == ".npy" && is != "npy":
		return nil, fault(file, "", Format, "write it with numpy.save, or name it for what it is", "is named .npy but holds %s", spoken(is))
	case says != ".npz" && is == "npz", says != ".npy" && is == "npy":
		return nil, fault(file, "", Format, "give it the ending ."+is, "holds %s under a name that does not say so", spoken(is))
	}
	switch is {
	case "npz":
		err = t.openZip(r, size)
	case "npy":
		err = t.openArray(r, size)
	default:
		err = t.readText(io.NewSectionReader(r, 0, size))
	}
	if err != nil {
		return nil, err
	}
	return t, nil
}

func sniff(head []byte) string {
	switch {
	case bytes.HasPrefix(head, []byte("PK\x03\x04")), bytes.HasPrefix(head, []byte("PK\x05\x06")):
		return "npz"
	case bytes.HasPrefix(head, []byte("\x93NUMPY")):
		return "npy"
	case bytes.HasPrefix(head, []byte("\x89HDF")):
		return "hdf5"
	case bytes.HasPrefix(head, []byte("\x1f\x8b")):
		return "gzip"
	case len(head) >= 2 && head[0] == 0x80 && head[1] >= 2 && head[1] <= 5:
		return "pickle"
	}
	return "text"
}

func spoken(is string) string {
	switch is {
	case "npz":
		return "a zip archive"
	case "npy":
		return "a single array (npy)"
	}
	return "text or something unknown"
}

// Close closes the file behind the table, if there is one.
func (t *Table) Close() error {
	if t.closer == nil {
		return nil
	}
	return t.closer.Close()
}

// File returns the name the table was opened under.
func (t *Table) File() string { return t.file }

// Columns returns the columns in the order of the file. The caller owns the slice.
func (t *Table) Columns() []Column { return append([]Column(nil), t.columns...) }

// Has reports whether there is a column of this name.
func (t *Table) Has(name string) bool { _, ok := t.index[name]; return ok }

// Notes returns what a reader should know about the columns loaded so far,
// one sentence each: single precision, members that were passed over.
func (t *Table) Notes() []string { return append([]string(nil), t.notes...) }

// Lookup returns the description of a column, or a *Fault of kind Missing that
// lists the names there are (or says why this one is no column).
func (t *Table) Lookup(name string) (Column, error) {
	if i, ok := t.index[name]; ok {
		return t.columns[i], nil
	}
	if f, ok := t.odd[name]; ok {
		return Column{}, f
	}
	names := make([]string, 0, len(t.columns))
	for _, c := range t.columns {
		names = append(names, c.Name)
	}
	for n := range t.odd {
		names = append(names, n)
	}
	if len(t.odd) > 0 {
		sort.Strings(names)
	}
	list := strings.Join(names, ", ")
	if len(names) > 24 {
		list = strings.Join(names[:24], ", ") + ", …"
	}
	return Column{}, fault(t.file, name, Missing, "the file holds: "+list, "is not there")
}

// Real returns the numbers of a column, all of them finite. The caller owns
// the slice. A complex column is a *Fault, as is any number that is not finite.
func (t *Table) Real(name string) ([]float64, error) {
	c, err := t.Lookup(name)
	if err != nil {
		return nil, err
	}
	if c.Complex {
		return nil, fault(t.file, name, Shape, "name a real column", "holds complex numbers where real ones are wanted")
	}
	re, _, err := t.sources[t.index[name]].load(t, c)
	if err != nil {
		return nil, err
	}
	for i, x := range re {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return nil, &Fault{File: t.file, Array: name, Row: i, Kind: NotFinite, What: "is not a finite number", Remedy: "leave such rows out"}
		}
	}
	t.single(c)
	return re, nil
}

// Complex returns the numbers of a column as complex numbers, all of them
// finite; a real column gets imaginary parts zero. The caller owns the slice.
func (t *Table) Complex(name string) ([]complex128, error) {
	c, err := t.Lookup(name)
	if err != nil {
		return nil, err
	}
	if !c.Complex {
		re, err := t.Real(name)
		if err != nil {
			return nil, err
		}
		z := make([]complex128, len(re))
		for i, x := range re {
			z[i] = complex(x, 0)
		}
		return z, nil
	}
	_, z, err := t.sources[t.index[name]].load(t, c)
	if err != nil {
		return nil, err
	}
	for i, x := range z {
		if !(math.Abs(real(x)) <= math.MaxFloat64 && math.Abs(imag(x)) <= math.MaxFloat64) {
			return nil, &Fault{File: t.file, Array: name, Row: i, Kind: NotFinite, What: "is not a finite number", Remedy: "leave such rows out"}
		}
	}
	t.single(c)
	return z, nil
}

// Increasing is Real for a time or another abscissa: at least two numbers,
// each above the one before it.
func (t *Table) Increasing(name string) ([]float64, error) {
	x, err := t.Real(name)
	if err != nil {
		return nil, err
	}
	if len(x) < 2 {
		return nil, fault(t.file, name, Shape, "", "has %d row(s), which is too few", len(x))
	}
	for i := 1; i < len(x); i++ {
		if !(x[i] > x[i-1]) {
			f := &Fault{File: t.file, Array: name, Row: i, Line: t.line(i), Kind: Order, Remedy: "sort the rows and drop repeated ones"}
			f.What = "does not increase (" + short(x[i-1]) + " is followed by " + short(x[i]) + ")"
			return nil, f
		}
	}
	return x, nil
}

func (t *Table) single(c Column) {
	if !c.Single {
		return
	}
	note := filepath.Base(t.file) + ": column \"" + c.Name + "\" is stored in single precision (7 digits): differences below that cannot be seen"
	for _, n := range t.notes {
		if n == note {
			return
		}
	}
	t.notes = append(t.notes, note)
}

// add registers a column; a name that is there already is a fault.
func (t *Table) add(c Column, s source) error {
	if _, ok := t.index[c.Name]; ok {
		return fault(t.file, c.Name, Format, "give every column a name of its own", "stands there twice")
	}
	t.index[c.Name] = len(t.columns)
	t.columns = append(t.columns, c)
	t.sources = append(t.sources, s)
	return nil
}
