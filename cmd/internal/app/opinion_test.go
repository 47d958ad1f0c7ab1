package app

import (
	"context"
	"errors"
	"os"
	"strings"
	"testing"

	"nullmark/configs"
	"nullmark/extract/result"
)

// TestSecondOpinion: the flag sets two numbers beside each other on the terminal
// and in result.json, and is refused before the run where there is none to have.
func TestSecondOpinion(t *testing.T) {
	room(t)
	e := fake(nil)
	var possible error
	e.CanAsk = func(*configs.Case) error { return possible }
	e.SecondOpinion = func(_ context.Context, _ *configs.Case, r *result.Result, _ int) error {
		o := result.SecondOpinion{L: 2, M: 2, What: "energy at infinity", Value: result.Q{Value: 3, Error: 0.5}, Second: result.Q{Value: 1, Error: 0.5}}
		o.Compare()
		r.SecondOpinion = []result.SecondOpinion{o}
		return nil
	}
	got := try(t, e, "run", "case.yaml", "--second-opinion", "--out", "r")
	if got.code != ExitDone || !strings.Contains(got.stdout, "(2,2) energy at infinity") || !strings.Contains(got.stdout, "1 of 1 numbers differ") {
		t.Errorf("%+v", got)
	}
	text, err := os.ReadFile("r/result.json")
	if err != nil || !strings.Contains(string(text), `"in_bars": 2`) {
		t.Errorf("%v: no second opinion in %s", err, text)
	}
	if got := try(t, e, "run", "case.yaml", "--out", "r"); strings.Contains(got.stdout, "energy at infinity") {
		t.Errorf("unasked: %+v", got)
	}
	possible = errors.New("there is none for this case")
	got = try(t, e, "run", "case.yaml", "--second-opinion", "--out", "s")
	if got.code != ExitUsage || !strings.Contains(got.stderr, "--second-opinion: there is none for this case") {
		t.Errorf("%+v", got)
	}
}
