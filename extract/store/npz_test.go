package store

import (
	"bytes"
	"encoding/binary"
	"hash/crc32"
	"io"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"

	"github.com/sbinet/npyio/npz"

	"nullmark/extract/result"
)

// fields reads little-endian numbers off a byte slice.
type fields struct {
	t    *testing.T
	data []byte
	at   int
}

func (f *fields) bytes(n int) []byte {
	f.t.Helper()
	if f.at+n > len(f.data) {
		f.t.Fatalf("the file ends inside a field at byte %d", f.at)
	}
	f.at += n
	return f.data[f.at-n : f.at]
}
func (f *fields) u16() int    { f.t.Helper(); return int(binary.LittleEndian.Uint16(f.bytes(2))) }
func (f *fields) u32() uint32 { f.t.Helper(); return binary.LittleEndian.Uint32(f.bytes(4)) }

func (f *fields) want(what string, got, want int) {
	f.t.Helper()
	if got != want {
		f.t.Fatalf("byte %d: %s is %#x, want %#x", f.at, what, got, want)
	}
}

// The files are read by the definitions of the formats, not by a library: the
// ZIP file format specification (APPNOTE.TXT 6.3, sections 4.3.7, 4.3.12 and
// 4.3.16) and numpy's documentation of the .npy format, version 1.0 (from
// memory, both).
func TestNPZByteByByte(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	b := sample(1)
	mustWrite(t, dir, b, caseA)
	s := b.Series

	type entry struct {
		name, descr, shape string
		data               []float64
	}
	interleave := func(z []complex128) (out []float64) {
		for _, z := range z {
			out = append(out, real(z), imag(z))
		}
		return out
	}
	waves := []entry{{"u", "<f8", "(5000,)", s.U}}
	horizons := []entry{{"v", "<f8", "(77,)", s.V}}
	for i, lm := range []string{"2_1", "2_2", "3_-1", "12_-11"} {
		m := s.Modes[i]
		waves = append(waves, entry{"h_" + lm, "<c16", "(5000,)", interleave(m.Wave)}, entry{"err_" + lm, "<f8", "(5000,)", m.WaveErr})
		if m.Evidence != nil {
			waves = append(waves, entry{"evidence_" + lm, "<f8", "(5000,)", m.Evidence})
		}
		horizons = append(horizons, entry{"psi_" + lm, "<c16", "(77,)", interleave(m.Horizon)}, entry{"err_" + lm, "<f8", "(77,)", m.HorizonErr})
	}
	waves = append(waves, entry{"t_p", "<f8", "(4999,)", s.T}, entry{"r_p", "<f8", "(4999,)", s.R}, entry{"phi_p", "<f8", "(4999,)", s.Phi},
		entry{"junk_until", "<f8", "()", []float64{s.JunkUntil}})

	for file, entries := range map[string][]entry{"waveform.npz": waves, "horizon.npz": horizons} {
		data, err := os.ReadFile(filepath.Join(dir, file))
		if err != nil {
			t.Fatal(err)
		}
		f := &fields{t: t, data: data}
		var offsets []int
		var sums []uint32
		for _, e := range entries {
			offsets = append(offsets, f.at)
			f.want("local header signature", int(f.u32()), 0x04034b50)
			f.want("version needed", f.u16(), 20)
			f.want("flags (no data descriptor)", f.u16(), 0)
			f.want("method (stored)", f.u16(), 0)
			f.want("time", f.u16(), 0)
			f.want("date (1980-01-01)", f.u16(), 0x21)
			sum, packed, plain := f.u32(), int(f.u32()), int(f.u32())
			f.want("length of name", f.u16(), len(e.name)+4)
			f.want("length of extra field", f.u16(), 0)
			if got := string(f.bytes(len(e.name) + 4)); got != e.name+".npy" {
				t.Fatalf("%s: entry %q, want %q", file, got, e.name+".npy")
			}
			start := f.at
			if got := string(f.bytes(8)); got != "\x93NUMPY\x01\x00" {
				t.Fatalf("%s: magic %q", e.name, got)
			}
			n := f.u16()
			f.want("10 + header length modulo 64", (10+n)%64, 0)
			header := string(f.bytes(n))
			dict := "{'descr': '" + e.descr + "', 'fortran_order': False, 'shape': " + e.shape + ", }"
			if header != dict+strings.Repeat(" ", n-1-len(dict))+"\n" || n-len(dict) > 64 {
				t.Fatalf("%s: header %q", e.name, header)
			}
			for i, x := range e.data {
				if got := binary.LittleEndian.Uint64(f.bytes(8)); got != math.Float64bits(x) {
					t.Fatalf("%s: number %d has the bits %#x, want %#x", e.name, i, got, math.Float64bits(x))
				}
			}
			f.want("compressed size", packed, f.at-start)
			f.want("uncompressed size", plain, f.at-start)
			if got := crc32.ChecksumIEEE(data[start:f.at]); got != sum {
				t.Fatalf("%s: checksum %#x, want %#x", e.name, sum, got)
			}
			sums = append(sums, sum)
		}
		central := f.at
		for i, e := range entries {
			f.want("central header signature", int(f.u32()), 0x02014b50)
			f.want("version made by", f.u16(), 20)
			f.want("version needed", f.u16(), 20)
			f.want("flags", f.u16(), 0)
			f.want("method", f.u16(), 0)
			f.want("time", f.u16(), 0)
			f.want("date", f.u16(), 0x21)
			f.want("checksum", int(f.u32()), int(sums[i]))
			f.bytes(8)
			f.want("length of name", f.u16(), len(e.name)+4)
			f.want("length of extra field", f.u16(), 0)
			f.want("length of comment", f.u16(), 0)
			f.bytes(2 + 2 + 4)
			f.want("offset of local header", int(f.u32()), offsets[i])
			f.bytes(len(e.name) + 4)
		}
		size := f.at - central
		f.want("end signature", int(f.u32()), 0x06054b50)
		f.bytes(4)
		f.want("entries on this disk", f.u16(), len(entries))
		f.want("entries", f.u16(), len(entries))
		f.want("size of central directory", int(f.u32()), size)
		f.want("offset of central directory", int(f.u32()), central)
		f.want("length of comment", f.u16(), 0)
		f.want("end of file", f.at, len(data))
	}
}

// A library that did not write the file reads the same names and numbers.
func TestNPZReadByLibrary(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	b := sample(1)
	mustWrite(t, dir, b, caseA)
	r, err := npz.Open(filepath.Join(dir, "waveform.npz"))
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if keys := r.Keys(); keys[0] != "u.npy" || keys[1] != "h_2_1.npy" || !slices.Contains(keys, "h_12_-11.npy") {
		t.Errorf("keys %v", keys)
	}
	var u []float64
	var h []complex128
	if err := r.Read("u.npy", &u); err != nil || !slices.Equal(u, b.Series.U) {
		t.Errorf("u: %v", err)
	}
	if err := r.Read("h_12_-11.npy", &h); err != nil || !slices.Equal(h, b.Series.Modes[3].Wave) {
		t.Errorf("h_12_-11: %v", err)
	}
}

const numpyScript = `
import sys, numpy
w = numpy.load(sys.argv[1]); h = numpy.load(sys.argv[2])
k = numpy.arange(5000)
def same(name, got, dtype, want):
    assert got.dtype == numpy.dtype(dtype), (name, got.dtype)
    assert got.shape == numpy.shape(want), (name, got.shape)
    assert numpy.array_equal(got, want), name
same("u", w["u"], "<f8", 0.5*k)
same("t_p", w["t_p"], "<f8", 0.25*k[:-1])
same("err_3_-1", w["err_3_-1"], "<f8", numpy.full(5000, 1e-10*3))
assert float(w["junk_until"]) == 123.25
z = w["h_2_2"]
assert z.dtype == numpy.dtype("<c16") and z.shape == (5000,)
assert numpy.abs(z - numpy.exp(-2j*k/50)).max() < 1e-12
assert w["h_12_-11"].dtype == numpy.complex128
same("v", h["v"], "<f8", 0.75*numpy.arange(77))
same("psi_3_-1", h["psi_3_-1"], "<c16", numpy.arange(77) + 2j)
assert sorted(h.files) == sorted(["v"] + [p + "_" + m for p in ("psi", "err") for m in ("2_1", "2_2", "3_-1", "12_-11")]), h.files
print("loaded")
`

// The byte test above holds the format in any case; where numpy is installed it
// is asked as well.
func TestNPZLoadsInNumpy(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "r")
	mustWrite(t, dir, sample(1), caseA)
	asked := false
	for _, python := range []string{"python3", "/usr/bin/python3"} {
		if exec.Command(python, "-c", "import numpy").Run() != nil {
			continue
		}
		asked = true
		out, err := exec.Command(python, "-c", numpyScript, filepath.Join(dir, "waveform.npz"), filepath.Join(dir, "horizon.npz")).CombinedOutput()
		if err != nil || strings.TrimSpace(string(out)) != "loaded" {
			t.Errorf("numpy: %v\n%s", err, out)
		}
		break
	}
	if !asked {
		t.Log("no python3 with numpy here: the format was checked by its bytes alone")
	}
}

// Writing streams: what it allocates does not grow with the arrays.
func TestNPZHoldsNoCopies(t *testing.T) {
	const n = 1 << 18 // 8 MB of numbers
	s := &result.Series{U: make([]float64, n), Modes: []result.ModeSeries{{L: 2, M: 2, Wave: make([]complex128, n), WaveErr: make([]float64, n)}}}
	arrays, err := waveformArrays(s)
	if err != nil {
		t.Fatal(err)
	}
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	if err := writeNPZ(io.Discard, arrays); err != nil {
		t.Fatal(err)
	}
	runtime.ReadMemStats(&after)
	// All buffers together were measured at 0.7 MB.
	if got := after.TotalAlloc - before.TotalAlloc; got > 2<<20 {
		t.Errorf("writing 8 MB of numbers allocates %d bytes", got)
	} else {
		t.Logf("%d bytes allocated", got)
	}
}

// Whatever stands in a file, reading it gives an error or an answer: no panic,
// no allocation beyond what the file can hold.
func FuzzReadNPZ(f *testing.F) {
	var good bytes.Buffer
	x := 1.5
	if err := writeNPZ(&good, []array{
		{name: "u", reals: []float64{1, 2}}, {name: "h_2_2", complex: []complex128{1, 2i}}, {name: "junk_until", scalar: &x},
	}); err != nil {
		f.Fatal(err)
	}
	f.Add(good.Bytes())
	for _, swap := range [][2]string{{"(2,)", "(-2,)"}, {"(2,)", "(9,)"}, {"(2,)", "()"}, {"'<f8'", "'<i8'"}, {"\n", " "}, {"'shape'", "'sharp'"}, {"NUMPY\x01", "NUMPY\x02"}} {
		var spoiled bytes.Buffer
		if err := writeSpoiled(&spoiled, good.Bytes(), swap[0], swap[1]); err != nil {
			f.Fatal(err)
		}
		f.Add(spoiled.Bytes())
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		spoiled := !bytes.Equal(data, good.Bytes())
		s := new(result.Series)
		err := scanNPZ(bytes.NewReader(data), int64(len(data)), func(a array) string { return takeWave(s, a) })
		if !spoiled && err != nil {
			t.Errorf("a good file: %v", err)
		}
		for _, m := range s.Modes {
			if len(m.Wave) > 1032*len(data)/16 {
				t.Errorf("%d samples from %d bytes", len(m.Wave), len(data))
			}
		}
	})
}
