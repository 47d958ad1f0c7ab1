package app

import (
	"bytes"
	"math"
	"strings"
	"testing"
	"time"
)

// watch gives a meter a clock that the test moves.
func watch(m *meter) (move func(time.Duration)) {
	now := time.Unix(1000, 0)
	m.now = func() time.Time { return now }
	return func(d time.Duration) { now = now.Add(d) }
}

func TestLinesEveryFewSeconds(t *testing.T) {
	var out bytes.Buffer
	m := newMeter(&out, false)
	move := watch(m)
	for i := range 121 { // two minutes, two reports a second
		m.update("evolving", float64(i), 240)
		move(500 * time.Millisecond)
	}
	m.stop()
	m.update("evolving", 240, 240)
	lines := strings.Split(strings.TrimRight(out.String(), "\n"), "\n")
	if len(lines) != 12 {
		t.Fatalf("%d lines in a minute:\n%s", len(lines), out.String())
	}
	if want := "nullmark:   4 %, evolving, 5 s gone, about 115 s left"; lines[0] != want {
		t.Errorf("first line %q, want %q", lines[0], want)
	}
	if want := "nullmark:  50 %, evolving, 60 s gone, about 60 s left"; lines[11] != want {
		t.Errorf("last line %q, want %q", lines[11], want)
	}
}

func TestQuietAndSenselessReportsSayNothing(t *testing.T) {
	var out bytes.Buffer
	m := newMeter(&out, true)
	move := watch(m)
	for range 10 {
		m.update("evolving", 1, 2)
		move(time.Minute)
	}
	m = newMeter(&out, false)
	move = watch(m)
	for range 10 {
		m.update("evolving", 1, 0)
		m.update("evolving", 1, math.NaN())
		m.update("evolving", math.NaN(), 1)
		move(time.Minute)
	}
	m.stop()
	m.stop()
	if out.Len() > 0 {
		t.Errorf("wrote %q", out.String())
	}
}

// TestBarOfATerminal: what a terminal is sent begins its line anew each time,
// says the same as the lines elsewhere, and is erased at the end.
func TestBarOfATerminal(t *testing.T) {
	var out bytes.Buffer
	m := newMeter(&out, false)
	m.bar = newBar(&out)
	move := watch(m)
	m.update("evolving", 0, 100)
	move(20 * time.Second)
	time.Sleep(150 * time.Millisecond) // the library draws ten times a second
	m.update("evolving", 25, 100)
	time.Sleep(150 * time.Millisecond)
	m.update("evolving", 100, 100)
	time.Sleep(150 * time.Millisecond)
	m.update("climbing", 100, 400) // a full bar is not the end
	m.stop()
	got := out.String()
	for _, want := range []string{"25%", "evolving, 20 s gone, about 60 s left", "climbing, 20 s gone"} {
		if !strings.Contains(got, want) {
			t.Errorf("the bar lacks %q: %q", want, got)
		}
	}
	if strings.Contains(got, "\n") || !strings.HasSuffix(got, "\r\x1b[K") {
		t.Errorf("the bar does not stay on one line, or stays behind: %q", got)
	}
}

// TestWorkThatGrows: the total may grow when more turns out to be needed.
func TestWorkThatGrows(t *testing.T) {
	var out bytes.Buffer
	m := newMeter(&out, false)
	move := watch(m)
	m.update("evolving", 0, 100)
	move(6 * time.Second)
	m.update("evolving", 110, 100) // more than all of it
	move(6 * time.Second)
	m.update("climbing", 100, 400)
	if got := out.String(); got != "nullmark: 100 %, evolving, 6 s gone, about 0 s left\nnullmark:  25 %, climbing, 12 s gone, about 36 s left\n" {
		t.Errorf("wrote %q", got)
	}
}

func TestDurationsInWords(t *testing.T) {
	for d, want := range map[time.Duration]string{
		400 * time.Millisecond: "0 s", 119 * time.Second: "119 s", 125 * time.Second: "2 min 05 s",
		2*time.Hour + 7*time.Minute: "2 h 07 min",
	} {
		if got := roughly(d); got != want {
			t.Errorf("%v: %q, want %q", d, got, want)
		}
	}
}

func TestColoursOnlyOnTerminals(t *testing.T) {
	t.Setenv("NO_COLOR", "")
	if wantsColour(&bytes.Buffer{}) {
		t.Error("a buffer is no terminal")
	}
}
