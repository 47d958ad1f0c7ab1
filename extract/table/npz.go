package table

import (
	"archive/zip"
	"fmt"
	"io"
	"path/filepath"
	"strings"
)

// Limits on what an archive may unpack to. A series of zeros compresses a
// thousandfold, so a ratio alone means nothing below maxCalm bytes.
const (
	maxMembers = 4096
	maxCalm    = 64 << 20 // bytes that any member may unpack to
	maxRatio   = 100      // beyond that: at most so many times its packed size
)

// openZip lists the arrays of an npz file and reads their headers.
func (t *Table) openZip(r io.ReaderAt, size int64) error {
	z, err := zip.NewReader(r, size)
	if err != nil {
		return fault(t.file, "", Truncated, "write or copy it again", "is no complete zip archive (%v)", strings.TrimPrefix(err.Error(), "zip: "))
	}
	if len(z.File) > maxMembers {
		return fault(t.file, "", Refused, "", "holds %d arrays, more than %d", len(z.File), maxMembers)
	}
	seen := map[string]bool{}
	for _, f := range z.File {
		name, ok := strings.CutSuffix(f.Name, ".npy")
		if !ok {
			t.notes = append(t.notes, fmt.Sprintf("%s: the member %q is no array and was passed over", filepath.Base(t.file), f.Name))
			continue
		}
		if seen[name] {
			return fault(t.file, name, Format, "give every array a name of its own", "stands there twice")
		}
		seen[name] = true
		if odd := t.member(f, name); odd != nil {
			t.odd[name] = odd
		}
	}
	if len(seen) == 0 {
		return fault(t.file, "", Format, "write it with numpy.savez", "holds no arrays")
	}
	return nil
}

// member registers one array, or says why it cannot be read. That is no fault
// of the file as long as nobody asks for this array.
func (t *Table) member(f *zip.File, name string) *Fault {
	switch {
	case f.Flags&1 != 0:
		return fault(t.file, name, Refused, "write it without a password", "is encrypted")
	case f.Method != zip.Store && f.Method != zip.Deflate:
		return fault(t.file, name, Refused, "write it with numpy.savez or numpy.savez_compressed", "is packed by an unknown method (%d)", f.Method)
	case f.UncompressedSize64 > maxCalm && f.UncompressedSize64/maxRatio > f.CompressedSize64:
		return fault(t.file, name, Refused, "write it with numpy.savez, uncompressed",
			"would unpack from %d to %d bytes, which looks like a trap (zip bomb)", f.CompressedSize64, f.UncompressedSize64)
	case f.UncompressedSize64 > 1<<40:
		return fault(t.file, name, Refused, "", "claims to unpack to %d bytes", f.UncompressedSize64)
	}
	open := func() (io.ReadCloser, error) {
		r, err := f.Open()
		if err != nil {
			return nil, fault(t.file, name, Format, "write or copy it again", "cannot be unpacked: %v", err)
		}
		return r, nil
	}
	r, err := open()
	if err != nil {
		return err.(*Fault)
	}
	defer r.Close()
	lay, err := readLayout(t.file, name, r, int64(f.UncompressedSize64))
	if err == nil {
		err = t.pieces(name, lay, open)
	}
	if err != nil {
		return err.(*Fault)
	}
	return nil
}
