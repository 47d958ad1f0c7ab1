package store

import (
	"bufio"
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
)

// A sum is one line of SHA256SUMS.
type sum struct{ name, hex string }

// formatSums gives SHA256SUMS sorted by name, as `sha256sum -c` reads it.
func formatSums(sums []sum) []byte {
	sorted := slices.SortedFunc(slices.Values(sums), func(a, b sum) int { return strings.Compare(a.name, b.name) })
	var b bytes.Buffer
	for _, s := range sorted {
		fmt.Fprintf(&b, "%s  %s\n", s.hex, s.name)
	}
	return b.Bytes()
}

// readSums reads SHA256SUMS of dir.
func readSums(dir string) ([]sum, error) {
	data, err := os.ReadFile(filepath.Join(dir, sumsFile))
	if err != nil {
		return nil, err
	}
	var sums []sum
	for line := range strings.Lines(string(data)) {
		digest, name, ok := strings.Cut(strings.TrimSuffix(line, "\n"), "  ")
		if _, err := hex.DecodeString(digest); !ok || err != nil || len(digest) != 2*sha256.Size || !plainName(name) {
			return nil, errMalformedSums
		}
		sums = append(sums, sum{name, digest})
	}
	return sums, nil
}

var errMalformedSums = errors.New("is not a list of SHA-256 sums")

// plainName says whether name is one path element and not hidden.
func plainName(name string) bool {
	return name != "" && name[0] != '.' && !strings.ContainsAny(name, "/\\\x00\r\n")
}

// Check compares every file listed in dir's SHA256SUMS with its sum. It returns
// nil when all agree, *Damaged with every file that does not (or with SHA256SUMS
// itself when that is missing, malformed or lists no case.yaml and result.json),
// and *FileSystem when a file cannot be read. Files that are not listed are not
// looked at.
func Check(dir string) error {
	sums, err := readSums(dir)
	switch {
	case errors.Is(err, errMalformedSums):
		return &Damaged{Dir: dir, Files: []Difference{{sumsFile, err.Error()}}}
	case errors.Is(err, os.ErrNotExist):
		return &Damaged{Dir: dir, Files: []Difference{{sumsFile, "is missing"}}}
	case err != nil:
		return &FileSystem{Doing: "read " + sumsFile + " of", Path: dir, Err: err}
	}
	damaged := &Damaged{Dir: dir}
	listed := map[string]bool{}
	for _, s := range sums {
		listed[s.name] = true
		got, err := digestFile(filepath.Join(dir, s.name))
		switch {
		case errors.Is(err, os.ErrNotExist):
			damaged.Files = append(damaged.Files, Difference{s.name, "is missing"})
		case err != nil:
			return &FileSystem{Doing: "read " + s.name + " of", Path: dir, Err: err}
		case got != s.hex:
			damaged.Files = append(damaged.Files, Difference{s.name, "differs from its SHA-256 sum"})
		}
	}
	for _, name := range []string{caseFile, resultFile} {
		if !listed[name] {
			damaged.Files = append(damaged.Files, Difference{name, "is not listed in " + sumsFile})
		}
	}
	if len(damaged.Files) > 0 {
		return damaged
	}
	return nil
}

func digestFile(path string) (string, error) {
	f, err := os.Open(path)
	if err != nil {
		return "", err
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, bufio.NewReaderSize(f, chunk)); err != nil {
		return "", err
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}
