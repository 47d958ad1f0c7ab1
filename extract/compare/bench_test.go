package compare

import (
	"archive/zip"
	"bufio"
	"encoding/binary"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"testing"

	"nullmark/extract/table"
)

// BenchmarkMillionSamples compares a file of 10^6 samples and ten complex
// modes with a reference of 10^5 samples, which is many. What it is held to is
// 10 core-seconds and 500 MB: see the process's peak with GNU time, for example
//
//	go test -c ./extract/compare && /usr/bin/time -v ./compare.test -test.run xxx -test.bench Million -test.benchtime 1x
func BenchmarkMillionSamples(b *testing.B) {
	modes := [][2]int{{2, 1}, {2, 2}, {3, 1}, {3, 2}, {3, 3}, {4, 1}, {4, 2}, {4, 3}, {4, 4}, {5, 5}}
	const n = 1000000
	path := filepath.Join(b.TempDir(), "million.npz")
	f, err := os.Create(path)
	if err != nil {
		b.Fatal(err)
	}
	z := zip.NewWriter(f)
	member := func(name, kind string, put func(w io.Writer)) {
		w, err := z.CreateHeader(&zip.FileHeader{Name: name + ".npy", Method: zip.Store})
		if err != nil {
			b.Fatal(err)
		}
		h := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': (%d,), }\n", kind, n)
		fmt.Fprintf(w, "\x93NUMPY\x01\x00%c%c%s", len(h)&255, len(h)>>8, h)
		bw := bufio.NewWriterSize(w, 1<<20)
		put(bw)
		bw.Flush()
	}
	times := func(i int) float64 { return 570 * float64(i) / n }
	member("u", "<f8", func(w io.Writer) {
		for i := 0; i < n; i++ {
			binary.Write(w, binary.LittleEndian, times(i))
		}
	})
	var cols []ModeColumns
	for _, lm := range modes {
		name := fmt.Sprintf("h%d%d", lm[0], lm[1])
		cols = append(cols, ModeColumns{lm[0], lm[1], []string{name}})
		member(name, "<c16", func(w io.Writer) {
			for i := 0; i < n; i++ {
				binary.Write(w, binary.LittleEndian, truth(lm[0], lm[1], times(i)))
			}
		})
	}
	z.Close()
	f.Close()
	ref := reference(modes, 1e-9, nil)
	ref.Series.U = grid(0, 560, 560./100000) // an unusually fine reference
	for i := range ref.Series.Modes {
		m := &ref.Series.Modes[i]
		m.Wave = fill(ref.Series.U, m.L, m.M)
		m.WaveErr = make([]float64, len(m.Wave))
		for k := range m.WaveErr {
			m.WaveErr[k] = 1e-9
		}
	}
	b.ResetTimer()
	for i := 0; i < b.N; i++ {
		tab, err := table.Open(path)
		if err != nil {
			b.Fatal(err)
		}
		w, err := NewFileWaveform(tab, "u", cols)
		if err != nil {
			b.Fatal(err)
		}
		c, _, err := Compare(Input{Reference: ref, Model: w})
		if err != nil {
			b.Fatal(err)
		}
		b.Log(c.Overall.Sentence)
		tab.Close()
	}
}
