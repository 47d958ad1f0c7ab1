package table

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
)

// The header of an npy file (NumPy enhancement proposal 1): the magic
// "\x93NUMPY", two version bytes, the length of a Python dictionary as uint16
// (version 1) or uint32 (versions 2, 3), then the dictionary with the keys
// descr, fortran_order and shape, padded with blanks and a line feed.

const maxHeader = 1 << 20 // bytes; a header with thousands of fields stays below

// field is one numeric item inside an element of an array.
type field struct {
	name    string // "" for a plain array
	offset  int    // bytes from the start of the element
	kind    byte   // f, c, i, u
	size    int    // bytes
	big     bool
	trouble string // why this field is no column, "" if it is one
}

// layout is what a header says.
type layout struct {
	fields  []field
	item    int // bytes of an element
	shape   []int64
	count   int64 // elements
	fortran bool
	header  int64 // bytes before the data
}

// readLayout reads and checks a header. size is the number of bytes the whole
// array may have, by its container.
func readLayout(file, array string, r io.Reader, size int64) (*layout, error) {
	bad := func(kind Kind, format string, args ...any) error {
		return fault(file, array, kind, "write it again with numpy.save or numpy.savez", format, args...)
	}
	var pre [12]byte
	if _, err := io.ReadFull(r, pre[:10]); err != nil {
		return nil, short10(file, array, err)
	}
	if string(pre[:6]) != "\x93NUMPY" {
		return nil, bad(Format, "does not start like an array (npy)")
	}
	lay := &layout{header: 10}
	var n int64
	switch pre[6] {
	case 1:
		n = int64(binary.LittleEndian.Uint16(pre[8:10]))
	case 2, 3:
		if _, err := io.ReadFull(r, pre[10:12]); err != nil {
			return nil, short10(file, array, err)
		}
		lay.header = 12
		n = int64(binary.LittleEndian.Uint32(pre[8:12]))
	default:
		return nil, bad(Format, "has the unknown npy version %d", pre[6])
	}
	if lay.header+n > size {
		return nil, bad(Truncated, "promises a header of %d bytes where %d are left", n, size-lay.header)
	}
	if n > maxHeader {
		return nil, bad(Refused, "has a header of %d bytes", n)
	}
	text := make([]byte, n)
	if _, err := io.ReadFull(r, text); err != nil {
		return nil, short10(file, array, err)
	}
	lay.header += n
	v, err := parseLiteral(string(text))
	if err != nil {
		return nil, bad(Format, "has a header that cannot be read: %v", err)
	}
	dict, ok := v.(map[string]any)
	if !ok {
		return nil, bad(Format, "has a header that is no dictionary")
	}
	if lay.fortran, ok = dict["fortran_order"].(bool); !ok {
		return nil, bad(Format, "has a header without fortran_order")
	}
	dims, ok := dict["shape"].([]any)
	if !ok || len(dims) > 32 {
		return nil, bad(Format, "has a header without a shape")
	}
	lay.count = 1
	for _, d := range dims {
		k, ok := d.(int64)
		if !ok || k < 0 {
			return nil, bad(Format, "has a shape that is not made of sizes")
		}
		if k > 0 && lay.count > math.MaxInt64/64/k {
			return nil, bad(Truncated, "promises more numbers than a file can hold")
		}
		lay.shape = append(lay.shape, k)
		lay.count *= k
	}
	if err := lay.types(dict["descr"]); err != nil {
		kind, remedy := Format, "write it again with numpy.save or numpy.savez"
		if errors.Is(err, errObject) {
			kind, remedy = Refused, "write arrays of numbers, with allow_pickle=False"
		}
		return nil, fault(file, array, kind, remedy, "%v", err)
	}
	if int64(lay.item) > 0 && lay.count > math.MaxInt64/int64(lay.item) {
		return nil, bad(Truncated, "promises more numbers than a file can hold")
	}
	want, have := lay.count*int64(lay.item), size-lay.header
	switch {
	case want > have:
		return nil, bad(Truncated, "promises %d bytes of numbers and holds %d", want, have)
	case want < have:
		return nil, bad(Format, "holds %d bytes beyond the %d its header describes", have-want, want)
	}
	return lay, nil
}

func short10(file, array string, err error) error {
	if err == io.EOF || err == io.ErrUnexpectedEOF {
		return fault(file, array, Truncated, "write or copy it again", "ends in the middle of its header")
	}
	return fault(file, array, Format, "write or copy it again", "cannot be unpacked: %v", err)
}

var errObject = errors.New("holds Python objects (pickled), which are refused and never executed")

// types reads the descr entry: a type string, or a list of (name, type) pairs.
func (lay *layout) types(descr any) error {
	switch d := descr.(type) {
	case string:
		f, err := parseType(d)
		if err != nil {
			return err
		}
		lay.fields, lay.item = []field{f}, f.size
		return nil
	case []any:
		for _, e := range d {
			pair, ok := e.([]any)
			if !ok || len(pair) != 2 {
				return errors.New("has a record type with nested or repeated fields, which is not read")
			}
			name, ok1 := pair[0].(string)
			code, ok2 := pair[1].(string)
			if !ok1 || !ok2 {
				return errors.New("has a record type with nested or repeated fields, which is not read")
			}
			f, err := parseType(code)
			if err != nil {
				return err
			}
			f.name, f.offset = name, lay.item
			lay.item += f.size
			if lay.item > 1<<20 {
				return errors.New("has records of more than a megabyte")
			}
			if name != "" { // an unnamed field is padding
				lay.fields = append(lay.fields, f)
			}
		}
		if len(lay.fields) == 0 {
			return errors.New("has a record type without fields")
		}
		return nil
	}
	return errors.New("has a header without a type")
}

// parseType reads "<f8" and its like. Types that take a known number of bytes
// but are no numbers come back with a trouble.
func parseType(s string) (field, error) {
	if strings.ContainsRune(s, 'O') {
		return field{}, errObject
	}
	if len(s) < 3 || !strings.ContainsRune("<>|", rune(s[0])) {
		return field{}, fmt.Errorf("has the type %q, which is not read", s)
	}
	f := field{kind: s[1], big: s[0] == '>'}
	for _, c := range s[2:] {
		if c < '0' || c > '9' || f.size > 1<<16 {
			return field{}, fmt.Errorf("has the type %q, which is not read", s)
		}
		f.size = f.size*10 + int(c-'0')
	}
	switch code := s[1:]; code {
	case "f8", "f4", "f2", "c16", "c8", "i8", "i4", "i2", "i1", "u8", "u4", "u2", "u1":
		if s[0] == '|' && f.size > 1 {
			return field{}, fmt.Errorf("has the type %q, which says no byte order", s)
		}
	case "f16", "f12", "c32", "c24":
		f.trouble = "holds extended-precision numbers, whose layout depends on the machine"
	default:
		f.trouble = fmt.Sprintf("holds items of type %q, which are no numbers", s)
		if f.kind == 'U' {
			f.size *= 4
		}
	}
	return f, nil
}

// opener starts reading an array from its first byte.
type opener func() (io.ReadCloser, error)

// piece is one column inside an array: element at row r sits at index
// start + r*stride, field f of it.
type piece struct {
	open          opener
	lay           *layout
	start, stride int64
	f             field
}

// pieces registers the columns of one array under the given name.
func (t *Table) pieces(name string, lay *layout, open opener) error {
	var dims []int64
	for _, d := range lay.shape {
		if d != 1 {
			dims = append(dims, d)
		}
	}
	rows, cols := int64(1), int64(1)
	switch {
	case len(lay.shape) == 0 || len(dims) > 2:
		t.odd[name] = fault(t.file, name, Shape, "store one array of one dimension a column",
			"has the shape %s, which is no column", shapeText(lay.shape))
		return nil
	case len(dims) == 1:
		rows = dims[0]
		if len(lay.shape) == 2 && lay.shape[1] == dims[0] && lay.shape[0] == 1 {
			break // one row read as a column
		}
	case len(dims) == 2:
		rows, cols = dims[0], dims[1]
	}
	if rows*cols == 0 {
		t.odd[name] = fault(t.file, name, Shape, "", "is empty")
		return nil
	}
	if cols > 4096 {
		t.odd[name] = fault(t.file, name, Shape, "rows are times, columns are quantities", "has %d columns", cols)
		return nil
	}
	for _, f := range lay.fields {
		base := name
		if f.name != "" {
			base = f.name
			if name != "" {
				base = name + "." + f.name
			}
		}
		if f.trouble != "" {
			t.odd[base] = fault(t.file, base, Refused, "store it as float64 or complex128", "%s", f.trouble)
			continue
		}
		for j := int64(0); j < cols; j++ {
			c := Column{Name: base, Len: int(rows), Complex: f.kind == 'c', Single: f.kind == 'f' && f.size < 8 || f.kind == 'c' && f.size < 16}
			p := piece{open: open, lay: lay, start: j, stride: cols, f: f}
			if lay.fortran {
				p.start, p.stride = j*rows, 1
			}
			switch {
			case cols > 1 && base == "":
				c.Name = fmt.Sprint(j)
			case cols > 1:
				c.Name = fmt.Sprintf("%s[%d]", base, j)
			case base == "":
				c.Name = "0"
			}
			if err := t.add(c, p); err != nil {
				return err
			}
		}
	}
	return nil
}

func shapeText(s []int64) string {
	parts := make([]string, len(s))
	for i, d := range s {
		parts[i] = fmt.Sprint(d)
	}
	return "(" + strings.Join(parts, ", ") + ")"
}

// load streams the array and keeps the elements of this column. The result
// grows with what has been read, never ahead of it by more than a factor.
func (p piece) load(t *Table, c Column) ([]float64, []complex128, error) {
	r, err := p.open()
	if err != nil {
		return nil, nil, err
	}
	defer r.Close()
	if _, err := io.CopyN(io.Discard, r, p.lay.header); err != nil {
		return nil, nil, short10(t.file, c.Name, err)
	}
	item := p.lay.item
	per := max(1, (64<<10)/item)
	buf := make([]byte, per*item)
	var re []float64
	var z []complex128
	next := p.start // index of the next wanted element
	row := 0
	for first := int64(0); first < p.lay.count; {
		n := min(int64(per), p.lay.count-first)
		chunk := buf[:int(n)*item]
		if _, err := io.ReadFull(r, chunk); err != nil {
			if err == io.EOF || err == io.ErrUnexpectedEOF {
				err = &Fault{File: t.file, Array: c.Name, Row: row, Kind: Truncated, What: "is where the numbers end too early", Remedy: "write or copy the file again"}
			} else {
				err = fault(t.file, c.Name, Format, "write or copy it again", "cannot be unpacked: %v", err)
			}
			return nil, nil, err
		}
		for row < c.Len && next < first+n {
			b := chunk[int(next-first)*item+p.f.offset:]
			if c.Complex {
				z = append(grow(z, c.Len), p.f.complex(b))
			} else {
				x, exact := p.f.real(b)
				if !exact {
					return nil, nil, &Fault{File: t.file, Array: c.Name, Row: row, Kind: Refused, What: "is an integer above 2^53", Remedy: "store it as float64"}
				}
				re = append(grow(re, c.Len), x)
			}
			row++
			next += p.stride
		}
		first += n
	}
	// Read on to the end, so that a wrong checksum is seen.
	if extra, err := io.Copy(io.Discard, io.LimitReader(r, 1)); err != nil {
		return nil, nil, fault(t.file, c.Name, Format, "write or copy it again", "cannot be unpacked: %v", err)
	} else if extra > 0 {
		return nil, nil, fault(t.file, c.Name, Format, "write it again", "holds bytes beyond what its header describes")
	}
	return re, z, nil
}

// grow makes room for one more element: four times what is there, at most n.
func grow[T any](s []T, n int) []T {
	if len(s) < cap(s) {
		return s
	}
	bigger := make([]T, len(s), min(n, max(1<<14, 4*len(s))))
	copy(bigger, s)
	return bigger
}

func (f field) order() binary.ByteOrder {
	if f.big {
		return binary.BigEndian
	}
	return binary.LittleEndian
}

func (f field) complex(b []byte) complex128 {
	o := f.order()
	if f.size == 16 {
		return complex(math.Float64frombits(o.Uint64(b)), math.Float64frombits(o.Uint64(b[8:])))
	}
	return complex(float64(math.Float32frombits(o.Uint32(b))), float64(math.Float32frombits(o.Uint32(b[4:]))))
}

// real returns the number at b, and whether float64 holds it exactly.
func (f field) real(b []byte) (float64, bool) {
	if f.kind == 'f' && f.size == 8 && !f.big {
		return math.Float64frombits(binary.LittleEndian.Uint64(b)), true
	}
	o := f.order()
	var u uint64
	switch f.size {
	case 1:
		u = uint64(b[0])
	case 2:
		u = uint64(o.Uint16(b))
	case 4:
		u = uint64(o.Uint32(b))
	case 8:
		u = o.Uint64(b)
	}
	switch f.kind {
	case 'f':
		switch f.size {
		case 2:
			return half(uint16(u)), true
		case 4:
			return float64(math.Float32frombits(uint32(u))), true
		}
		return math.Float64frombits(u), true
	case 'i':
		shift := 64 - 8*f.size
		i := int64(u<<shift) >> shift
		return float64(i), i <= 1<<53 && i >= -1<<53
	}
	return float64(u), u <= 1<<53
}

// half widens an IEEE 754 binary16 number.
func half(h uint16) float64 {
	sign := 1.0
	if h>>15 == 1 {
		sign = -1
	}
	e, m := int(h>>10&31), float64(h&1023)
	switch e {
	case 0:
		return sign * math.Ldexp(m, -24)
	case 31:
		if m != 0 {
			return math.NaN()
		}
		return math.Inf(int(sign))
	}
	return sign * math.Ldexp(1024+m, e-25)
}

// openArray lists the columns of a single npy file.
func (t *Table) openArray(r io.ReaderAt, size int64) error {
	lay, err := readLayout(t.file, "", io.NewSectionReader(r, 0, size), size)
	if err != nil {
		return err
	}
	return t.pieces("", lay, func() (io.ReadCloser, error) {
		return io.NopCloser(io.NewSectionReader(r, 0, size)), nil
	})
}
