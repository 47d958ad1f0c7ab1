package table

import (
	"archive/zip"
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
)

var (
	wantT = []float64{0, 0.5, 1, 1.5, 2}
	wantH = []complex128{1 - 0.25i, 2 - 0.5i, 3 - 0.75i, 4 - 1i, 5 - 1.25i}
	wantK = []float64{-2, -1, 0, 1, 2}
)

func open(t *testing.T, name string) *Table {
	t.Helper()
	tab, err := Open(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { tab.Close() })
	return tab
}

func wantReal(t *testing.T, tab *Table, name string, want []float64) {
	t.Helper()
	got, err := tab.Real(name)
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("%s: column %s is %v, want %v", tab.File(), name, got, want)
	}
}

func wantComplex(t *testing.T, tab *Table, name string, want []complex128) {
	t.Helper()
	got, err := tab.Complex(name)
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("%s: column %s is %v, want %v", tab.File(), name, got, want)
	}
}

// The files of this test were written by numpy 1.24 (testdata/make.py).
func TestReadsWhatNumpyWrites(t *testing.T) {
	for _, name := range []string{"plain.npz", "packed.npz", "big.npz", "single.npz"} {
		tab := open(t, name)
		wantReal(t, tab, "t", wantT)
		wantReal(t, tab, "k", wantK)
		wantComplex(t, tab, "h22", wantH)
		if single := name == "single.npz"; single != (len(tab.Notes()) == 2) {
			t.Errorf("%s: notes %q", name, tab.Notes())
		}
	}
	wantReal(t, open(t, "single.npz"), "q", wantT)
	for _, name := range []string{"rows.npy", "fortran.npy", "fortranbig.npy"} {
		tab := open(t, name)
		wantReal(t, tab, "0", wantT)
		wantReal(t, tab, "1", []float64{1, 2, 3, 4, 5})
		wantReal(t, tab, "2", []float64{-0.25, -0.5, -0.75, -1, -1.25})
	}
	tab := open(t, "matrix.npz")
	wantReal(t, tab, "a[0]", wantT)
	wantReal(t, tab, "f[1]", []float64{1, 2, 3, 4, 5})
	wantReal(t, tab, "column", wantT)
	wantReal(t, tab, "row", wantT)
	tab = open(t, "record.npy")
	wantReal(t, tab, "t", wantT)
	wantReal(t, tab, "n", []float64{0, 1, 2, 3, 4})
	wantComplex(t, tab, "h22", wantH)
	for _, name := range []string{"spaces.txt", "units.csv"} {
		tab = open(t, name)
		wantReal(t, tab, "t", wantT)
		wantReal(t, tab, "im22", []float64{-0.25, -0.5, -0.75, -1, -1.25})
	}
	if c, _ := tab.Lookup("re22"); c.Unit != "mu" {
		t.Errorf("unit of re22 is %q", c.Unit)
	}
	wantComplex(t, tab, "t", []complex128{0, 0.5, 1, 1.5, 2})
}

// Each of these must give one sentence that holds every given part.
func TestFaultsOfRealFiles(t *testing.T) {
	for _, c := range []struct {
		file, column string
		kind         Kind
		parts        string
	}{
		{"objects.npz", "bad", Refused, `objects.npz|"bad"|never executed`},
		{"objects.npy", "", Refused, `objects.npy|never executed`},
		{"words.npz", "names", Refused, `"names"|no numbers`},
		{"words.npz", "flags", Refused, `"flags"|no numbers`},
		{"words.npz", "long", Refused, `"long"|extended|float64`},
		{"words.npz", "empty", Shape, `"empty"|is empty`},
		{"nan.npz", "h", NotFinite, `"h"|row 1|not a finite`},
		{"nan.npz", "z", NotFinite, `"z"|row 1`},
		{"wide.npz", "n", Refused, `"n"|row 1|2^53`},
		{"matrix.npz", "cube", Shape, `"cube"|(2, 3, 4)`},
		{"matrix.npz", "scalar", Shape, `"scalar"|()`},
		{"plain.npz", "h33", Missing, `"h33"|h22|is not there`},
		{"plain.npz", "h22", Shape, `"h22"|complex`},
		{"missing.npz", "", Unreadable, `missing.npz|no such file`},
		{".", "", Unreadable, `not a regular file`},
	} {
		tab, err := Open(filepath.Join("testdata", c.file))
		if err == nil {
			defer tab.Close()
			_, err = tab.Real(c.column)
			if c.column == "z" {
				_, err = tab.Complex(c.column)
			}
		}
		check(t, c.file, err, c.kind, c.parts)
	}
	_, err := open(t, "nan.npz").Increasing("back")
	check(t, "nan.npz", err, Order, `"back"|row 2|1 is followed by 1`)
	// An array that is unfit does not spoil the others.
	wantReal(t, open(t, "objects.npz"), "t", wantT)
}

func check(t *testing.T, name string, err error, kind Kind, parts string) {
	t.Helper()
	var f *Fault
	if !errors.As(err, &f) {
		t.Errorf("%s: got %v, want a *Fault", name, err)
		return
	}
	if f.Kind != kind {
		t.Errorf("%s: kind %q, want %q (%v)", name, f.Kind, kind, err)
	}
	for _, p := range strings.Split(parts, "|") {
		if !strings.Contains(err.Error(), p) {
			t.Errorf("%s: %q does not say %q", name, err, p)
		}
	}
	if strings.Contains(err.Error(), "\n") {
		t.Errorf("%s: %q is more than one line", name, err)
	}
}

// npy builds an array file with any header.
func npy(header string, data []byte) []byte {
	var b bytes.Buffer
	b.WriteString("\x93NUMPY\x01\x00")
	binary.Write(&b, binary.LittleEndian, uint16(len(header)+1))
	b.WriteString(header + "\n")
	b.Write(data)
	return b.Bytes()
}

func npz(name string, member []byte, change func(*zip.FileHeader)) []byte {
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	h := &zip.FileHeader{Name: name + ".npy", Method: zip.Store}
	h.CRC32 = crc32.ChecksumIEEE(member)
	h.CompressedSize64, h.UncompressedSize64 = uint64(len(member)), uint64(len(member))
	if change != nil {
		change(h)
	}
	m, _ := w.CreateRaw(h)
	m.Write(member)
	w.Close()
	return b.Bytes()
}

func doubles(x ...float64) []byte {
	b := new(bytes.Buffer)
	binary.Write(b, binary.LittleEndian, x)
	return b.Bytes()
}

const f8 = "{'descr': '<f8', 'fortran_order': False, 'shape': (%s), }"

func TestHostileBytes(t *testing.T) {
	good := npy(fmt.Sprintf(f8, "2,"), doubles(1, 2))
	if _, err := readAll("good.npy", good); err != nil {
		t.Fatal(err)
	}
	if _, err := readAll("good.npz", npz("t", good, nil)); err != nil {
		t.Fatal(err)
	}
	huge := npy(fmt.Sprintf(f8, "1000000000000,"), doubles(1, 2))
	for _, c := range []struct {
		name  string
		data  []byte
		kind  Kind
		parts string
	}{
		{"empty.npz", nil, Truncated, "is empty"},
		{"short.npy", good[:len(good)-1], Truncated, "promises 16 bytes of numbers and holds 15"},
		{"header.npy", good[:40], Truncated, "header"},
		{"long.npy", append(append([]byte{}, good...), 7), Format, "1 bytes beyond"},
		{"huge.npy", huge, Truncated, "promises 8000000000000 bytes"},
		{"huge.npz", npz("t", huge, nil), Truncated, `"t"|promises 8000000000000 bytes`},
		{"hugeclaim.npz", npz("t", huge, func(h *zip.FileHeader) { h.UncompressedSize64 = uint64(len(huge)) - 16 + 8e12 }), Refused, `"t"`},
		{"overflow.npy", npy(fmt.Sprintf(f8, "4294967296, 4294967296, 4294967296"), nil), Truncated, "more numbers than a file can hold"},
		{"negative.npy", npy(fmt.Sprintf(f8, "-1,"), nil), Format, "not made of sizes"},
		{"nodict.npy", npy("['descr']", nil), Format, "no dictionary"},
		{"code.npy", npy("{'descr': __import__('os'), 'fortran_order': False, 'shape': (1,)}", nil), Format, "cannot be read"},
		{"deep.npy", npy(strings.Repeat("(", 5000), nil), Format, "nested too deeply"},
		{"version.npy", append([]byte("\x93NUMPY\x09\x00"), make([]byte, 50)...), Format, "version 9"},
		{"biglen.npy", []byte("\x93NUMPY\x02\x00\xff\xff\xff\x7f{}"), Truncated, "promises a header of 2147483647 bytes"},
		{"pickle.npz", []byte("\x80\x04\x95\x00\x00\x00cos\nsystem\n"), Refused, "never executed"},
		{"pickle.dat", []byte("\x80\x04\x95\x00\x00\x00cos\nsystem\n"), Refused, "never executed"},
		{"text.npz", []byte("t,h\n1,2\n"), Format, "is named .npz but holds text"},
		{"text.npy", []byte("t,h\n1,2\n"), Format, "is named .npy but holds text"},
		{"zip.csv", npz("t", good, nil), Format, "ending .npz"},
		{"array.csv", good, Format, "ending .npy"},
		{"array.npz", good, Format, "a single array"},
		{"hdf.h5", []byte("\x89HDF\r\n\x1a\nxxxx"), Format, "hdf5"},
		{"cut.npz", npz("t", good, nil)[:60], Truncated, "no complete zip"},
		{"crc.npz", npz("t", good, func(h *zip.FileHeader) { h.CRC32++ }), Format, `"t"|checksum`},
		{"locked.npz", npz("t", good, func(h *zip.FileHeader) { h.Flags |= 1 }), Refused, "encrypted"},
		{"method.npz", npz("t", good, func(h *zip.FileHeader) { h.Method = 12 }), Refused, "unknown method"},
		{"noarray.npz", npz("t", []byte("hello"), nil), Truncated, `"t"|header`},
		{"binary.csv", []byte("a,b\n\x00\x01"), Format, "zero byte"},
		{"cell.csv", []byte("# M,1\nt,h\n1,2\n3,\n"), Cell, `line 4|"h"|is empty`},
		{"first.csv", []byte("t,h\n,2\n"), Cell, `line 2|"t"|is empty`},
		{"word.csv", []byte("t,h\n1,2\n3,four\n"), Cell, `line 3|"h"|four`},
		{"nan.csv", []byte("t,h\n1,2\n3,nan\n"), NotFinite, `line 3|"h"`},
		{"inf.csv", []byte("t,h\n1,2\n-Inf,4\n"), NotFinite, `line 3|"t"`},
		{"range.csv", []byte("t,h\n1,1e999\n"), NotFinite, `line 2|"h"`},
		{"few.csv", []byte("t,a,b\n1,2,3\n4,5\n"), Cell, `line 3|has 2 cells|"b"`},
		{"more.csv", []byte("t,a\n1,2\n4,5,6\n"), Cell, `line 3|has 3 cells`},
		{"names.csv", []byte("t,a,b\n1,2\n"), Shape, `line 1|names 3 columns`},
		{"twice.csv", []byte("t,t\n1,2\n"), Format, `"t"|twice`},
		{"none.csv", []byte("# t, h\n"), Format, "no line of numbers"},
		{"line.csv", bytes.Repeat([]byte("1"), maxLine+10), Format, "longer than"},
	} {
		_, err := readAll(c.name, c.data)
		check(t, c.name, err, c.kind, c.name+"|"+c.parts)
	}
}

// readAll opens and loads every column.
func readAll(name string, data []byte) (*Table, error) {
	tab, err := New(name, bytes.NewReader(data), int64(len(data)))
	if err != nil {
		return nil, err
	}
	for _, c := range tab.Columns() {
		var n int
		if c.Complex {
			z, err := tab.Complex(c.Name)
			if err != nil {
				return tab, err
			}
			n = len(z)
		} else {
			x, err := tab.Real(c.Name)
			if err != nil {
				return tab, err
			}
			n = len(x)
		}
		if n != c.Len {
			return tab, fmt.Errorf("column %q: %d rows read, %d announced", c.Name, n, c.Len)
		}
	}
	for name := range tab.odd {
		return tab, tab.odd[name]
	}
	return tab, nil
}

func TestBombIsRefusedWithoutMemory(t *testing.T) {
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	m, _ := w.Create("t.npy")
	const n = 20 << 20
	m.Write(npy(fmt.Sprintf(f8, fmt.Sprint(n)+","), nil))
	zero := make([]byte, 1<<20)
	for i := 0; i < 8*n; i += len(zero) {
		m.Write(zero)
	}
	w.Close()
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, err := readAll("bomb.npz", b.Bytes())
	runtime.ReadMemStats(&after)
	check(t, "bomb.npz", err, Refused, `"t"|zip bomb`)
	if got := after.TotalAlloc - before.TotalAlloc; got > 1<<20 {
		t.Errorf("refusing the bomb took %d bytes", got)
	}
}

// A header that promises a gigabyte and a container that agrees must not be
// given memory before the bytes are there.
func TestLyingSizesTakeLittleMemory(t *testing.T) {
	lie := npy(fmt.Sprintf(f8, "100000000,"), doubles(1, 2, 3))
	data := npz("t", lie, func(h *zip.FileHeader) {
		h.UncompressedSize64 = uint64(len(lie)) - 24 + 8e8
		h.CompressedSize64 = h.UncompressedSize64
	})
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, err := readAll("lie.npz", data)
	runtime.ReadMemStats(&after)
	if err == nil {
		t.Fatal("a lie was believed")
	}
	if got := after.TotalAlloc - before.TotalAlloc; got > 4<<20 {
		t.Errorf("the lie took %d bytes", got)
	}
}

func TestTextForms(t *testing.T) {
	for name, s := range map[string]string{
		"semicolons": "t;re22;im22\n0;1;-0.25\n0.5;2;-0.5\n",
		"tabs":       "t\tre22\tim22\n0\t1\t-0.25\n0.5\t2\t-0.5\n",
		"blanks":     "# t re22 im22\n 0.0   1.0  -0.25\n 0.5 2 -0.5\n",
		"fortran":    "t re22 im22\n0.0D0 1.0D+00 -2.5d-1\n 5.0D-01 2 -0.5\n",
		"crlf":       "\xef\xbb\xbft,re22,im22\r\n0,1,-0.25\r\n0.5,2,-0.5\r\n",
		"units":      "# made by hand\n# units: M, 1, 1\nt,re22,im22\n0,1,-0.25\n0.5,2,-0.5\n",
		"names":      "# t, re22, im22\n# M, 1, 1\n0,1,-0.25\n0.5,2,-0.5\n",
		"brackets":   "t [M], re22 [1], \"im22 (1)\"\n0,1,-0.25\n# a remark\n\n0.5,2,-0.5\n",
	} {
		tab, err := New("x.csv", strings.NewReader(s), int64(len(s)))
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		wantReal(t, tab, "t", []float64{0, 0.5})
		wantReal(t, tab, "re22", []float64{1, 2})
		wantReal(t, tab, "im22", []float64{-0.25, -0.5})
		if name == "units" || name == "names" || name == "brackets" {
			if c := tab.Columns()[0]; c.Unit != "M" {
				t.Errorf("%s: unit %q", name, c.Unit)
			}
		}
	}
	tab, err := New("x.txt", strings.NewReader("1 2\n3 4\n"), 8)
	if err != nil {
		t.Fatal(err)
	}
	wantReal(t, tab, "1", []float64{2, 4})
}

func TestHalf(t *testing.T) {
	// IEEE 754-2019, binary16: largest, smallest normal, smallest subnormal.
	for h, want := range map[uint16]float64{0x7bff: 65504, 0x0400: math.Ldexp(1, -14), 0x8001: -math.Ldexp(1, -24), 0x3555: 0.333251953125} {
		if got := half(h); got != want {
			t.Errorf("half(%#x) = %v, want %v", h, got, want)
		}
	}
	if !math.IsInf(half(0xfc00), -1) || !math.IsNaN(half(0x7c01)) {
		t.Error("half: infinity or NaN lost")
	}
}

// Whatever the bytes, reading ends with numbers or with a *Fault.
func fuzz(f *testing.F, name string) {
	paths, _ := filepath.Glob(filepath.Join("testdata", "*"+filepath.Ext(name)))
	for _, p := range paths {
		if b, err := os.ReadFile(p); err == nil {
			f.Add(b)
		}
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		_, err := readAll(name, data)
		var fa *Fault
		if err != nil && !errors.As(err, &fa) {
			t.Fatalf("%T: %v", err, err)
		}
	})
}

func FuzzArchive(f *testing.F) { fuzz(f, "x.npz") }
func FuzzArray(f *testing.F)   { fuzz(f, "x.npy") }
func FuzzText(f *testing.F)    { fuzz(f, "x.csv") }

// FuzzMember fuzzes an array inside an archive whose checksum fits.
func FuzzMember(f *testing.F) {
	paths, _ := filepath.Glob(filepath.Join("testdata", "*.npy"))
	for _, p := range paths {
		if b, err := os.ReadFile(p); err == nil {
			f.Add(b)
		}
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		_, err := readAll("x.npz", npz("t", data, nil))
		var fa *Fault
		if err != nil && !errors.As(err, &fa) {
			t.Fatalf("%T: %v", err, err)
		}
	})
}
