package store

import (
	"archive/zip"
	"bufio"
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"io"
	"math"
	"strings"
)

// The npz files are written here rather than by npyio, which reads them back:
// its writer leaves the header unaligned, writes eight bytes a call and names
// the entries without ".npy". Entries are stored uncompressed: samples of a
// smooth wave in float64 hardly shrink, and the bytes then depend on nothing
// but the numbers (a compressor's output may change with its version).

const (
	npyAlign  = 64          // the data of a .npy file start at a multiple of this
	dosEpoch  = 1<<5 | 1    // 1980-01-01 as MS-DOS date: year 0, month 1, day 1
	zipReader = 20          // version needed to extract
	chunk     = 1 << 16     // bytes encoded at a time
	npyMagic  = "\x93NUMPY" // then major, minor, uint16 header length
)

// array is a named entry of an npz file: exactly one of the three is set.
type array struct {
	name    string
	reals   []float64
	complex []complex128
	scalar  *float64
}

// header is the .npy header of version 1.0, padded with blanks and a newline
// so that the data start at a multiple of 64 bytes.
func (a *array) header() []byte {
	descr, shape := "<f8", fmt.Sprintf("(%d,)", len(a.reals))
	switch {
	case a.scalar != nil:
		shape = "()"
	case a.complex != nil:
		descr, shape = "<c16", fmt.Sprintf("(%d,)", len(a.complex))
	}
	dict := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': %s, }", descr, shape)
	before := len(npyMagic) + 2 + 2
	total := (before + len(dict) + 1 + npyAlign - 1) / npyAlign * npyAlign
	out := make([]byte, 0, total)
	out = append(out, npyMagic...)
	out = append(out, 1, 0)
	out = binary.LittleEndian.AppendUint16(out, uint16(total-before))
	out = append(out, dict...)
	out = append(out, strings.Repeat(" ", total-len(out)-1)...)
	return append(out, '\n')
}

// size is the number of bytes that encode writes.
func (a *array) size() uint64 {
	n := uint64(len(a.header()))
	switch {
	case a.scalar != nil:
		return n + 8
	case a.complex != nil:
		return n + 16*uint64(len(a.complex))
	}
	return n + 8*uint64(len(a.reals))
}

// encode writes header and data, through one small buffer.
func (a *array) encode(w io.Writer) error {
	if _, err := w.Write(a.header()); err != nil {
		return err
	}
	if a.scalar != nil {
		_, err := w.Write(binary.LittleEndian.AppendUint64(nil, math.Float64bits(*a.scalar)))
		return err
	}
	buf := make([]byte, 0, chunk)
	put := func(x float64) { buf = binary.LittleEndian.AppendUint64(buf, math.Float64bits(x)) }
	flush := func() error {
		_, err := w.Write(buf)
		buf = buf[:0]
		return err
	}
	for _, x := range a.reals {
		if put(x); len(buf) == chunk {
			if err := flush(); err != nil {
				return err
			}
		}
	}
	for _, z := range a.complex {
		put(real(z))
		if put(imag(z)); len(buf) == chunk {
			if err := flush(); err != nil {
				return err
			}
		}
	}
	return flush()
}

// writeNPZ writes the arrays in their order. Each is encoded twice, first for
// its checksum, so that the local headers are complete and no copy is held.
func writeNPZ(w io.Writer, arrays []array) error {
	buffered := bufio.NewWriterSize(w, 4*chunk)
	z := zip.NewWriter(buffered)
	for i := range arrays {
		a := &arrays[i]
		sum := crc32.NewIEEE()
		if err := a.encode(sum); err != nil {
			return err
		}
		entry, err := z.CreateRaw(&zip.FileHeader{
			Name:               a.name + ".npy",
			CreatorVersion:     zipReader,
			ReaderVersion:      zipReader,
			Method:             zip.Store,
			ModifiedDate:       dosEpoch,
			CRC32:              sum.Sum32(),
			CompressedSize64:   a.size(),
			UncompressedSize64: a.size(),
		})
		if err != nil {
			return err
		}
		if err := a.encode(entry); err != nil {
			return err
		}
	}
	if err := z.Close(); err != nil {
		return err
	}
	return buffered.Flush()
}
