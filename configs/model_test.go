package configs

import (
	"path/filepath"
	"strings"
	"testing"
)

func TestModelFile(t *testing.T) {
	here, err := filepath.Abs("in")
	if err != nil {
		t.Fatal(err)
	}
	text := "model:\n  name: mine\n  waveform: {file: m.npz, modes: {\"2,2\": h22}}\n  phase: plus\n  per: nu\nalign: {window: [100, 200]}\n"
	m, align, err := Reader{}.ParseModel(filepath.Join("in", "model.yaml"), []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	if m.Name != "mine" || m.Phase != "plus" || m.Quantity != "strain" || m.Per != "nu" || m.Noise != nil ||
		m.Waveform.File != filepath.Join(here, "m.npz") || m.Waveform.Time != "t" || len(m.Waveform.Modes) != 1 {
		t.Errorf("model %+v %+v", m, m.Waveform)
	}
	if !align.Windowed || align.From != 100 || align.To != 200 {
		t.Errorf("align %+v", align)
	}
	r := Reader{Env: []string{"NULLMARK_MODEL_PHASE=minus", "NULLMARK_ORBIT_RADIUS=7"}, Sets: []string{"model.quantity=master"}}
	m, _, err = r.ParseModel("model.yaml", []byte("{model: {flux: {file: f.csv}}}"))
	if err != nil || m.Phase != "minus" || m.Quantity != "master" {
		t.Errorf("%+v, %v", m, err)
	}
	for text, want := range map[string]string{
		"model: {phase: up, waveform: {file: a.npz, modes: {\"2,2\": h}}}": `model.yaml:1: model.phase is up, but must be minus or plus`,
		"model: {flux: {file: f.csv}}\norbit: {kind: circular}\ntitle: x":  "model.yaml:2: orbit does not belong in a model file, which holds model and align\nmodel.yaml:3: title does not",
		"align: none": "model.yaml: model is missing",
		"":            "model.yaml: the file is empty",
		"- a":         "model.yaml:1: the file holds [a]",
		"model: [":    "model.yaml:1: this is not valid YAML",
	} {
		_, _, err := Reader{}.ParseModel("model.yaml", []byte(text))
		if err == nil || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("%q: %v, want %q", text, err, want)
		}
	}
	if _, _, err := (Reader{Sets: []string{"orbit.radius=6"}}).ParseModel("m.yaml", []byte("model: {flux: {file: f.csv}}")); err == nil || !strings.Contains(err.Error(), "orbit.radius=6 sets nothing of a model") {
		t.Errorf("--set of an orbit: %v", err)
	}
	if _, _, err := (Reader{}).ReadModel(filepath.Join(t.TempDir(), "none.yaml")); err == nil || !strings.Contains(err.Error(), "there is no such file") {
		t.Errorf("no file: %v", err)
	}
}
