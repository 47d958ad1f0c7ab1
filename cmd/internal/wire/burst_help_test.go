package wire

import (
	"path/filepath"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/source/worldline"
)

func contains(text, part string) bool { return strings.Contains(text, part) }

// refused is what the checks say of a shipped case with one setting changed.
func refused(t *testing.T, file, set string) string {
	t.Helper()
	_, err := configs.Reader{Sets: []string{set}, Checks: Checks()}.Read(filepath.Join("..", "..", "..", "configs", file+".yaml"))
	if err == nil {
		t.Errorf("%s with %s is taken", file, set)
		return ""
	}
	if strings.Count(err.Error(), "\n") > 0 {
		t.Errorf("%s with %s: more than one sentence: %v", file, set, err)
	}
	return err.Error()
}

// peakOmega is the orbital frequency at its marker.
func peakOmega(w worldline.Worldline) float64 {
	var s worldline.State
	for _, k := range w.Markers() {
		if k.Name == worldline.MarkPeakOmega {
			w.At(k.T, &s)
			return s.Omega()
		}
	}
	return 0
}
