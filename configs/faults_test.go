package configs

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// everything is a reader of a version in which all features are there.
func everything() Reader {
	all := map[string]bool{}
	for f := range features {
		all[f] = true
	}
	return Reader{features: all}
}

const good = "orbit: {kind: circular, radius: 10}\n"

// The sentences that a user sees, whole. Lines count from 1.
var sentences = []struct {
	name   string
	reader Reader
	typed  string
	want   string
}{
	{"all at once", Reader{}, `title: 5
hole:
  spin: 1
waves:
  equation: mastr
  l_max: 8.5
orbit:
  kind: circular
  radius: ten
  e: 0.1
accuracy:
  relative: -1.0e-9
  floor: .nan
output:
  every: true
`, `c.yaml:1: title is 5, but must be one line of text of at most 200 characters, in quotes where it looks like a number
c.yaml:3: hole.spin is 1, but must be a number above -1 and below 1
c.yaml:5: waves.equation is mastr, but must be master or teukolsky (did you mean master?)
c.yaml:6: waves.l_max is 8.5, but must be a whole number from 0 to 100 (at least 2 for gravitational waves)
c.yaml:9: orbit.radius is ten, but must be a number above 0
c.yaml:10: orbit.e does not belong to orbit.kind circular, which has radius, inclination
c.yaml:12: accuracy.relative is -1.0e-9, but must be a number above 0 and below 1
c.yaml:13: accuracy.floor is .nan, but must be a number from 0 and below 1
c.yaml:15: output.every is true, but must be a number from 0.001 to 10000`},
	{"misspelt key", Reader{}, "orbit:\n  kind: circular\n  raduis: 10\n",
		"c.yaml:3: orbit.raduis is not a known key; did you mean orbit.radius?"},
	{"capital letter", Reader{}, "orbit: {kind: circular, Radius: 10}",
		"c.yaml:1: orbit.Radius is not a known key; did you mean orbit.radius?"},
	{"misspelt section", Reader{}, "orbti: {kind: circular, radius: 10}",
		"c.yaml:1: orbti is not a known key; did you mean orbit?"},
	{"wrong section", Reader{}, good + "l_max: 4",
		"c.yaml:2: l_max is not a known key; did you mean waves.l_max?"},
	{"flat key", Reader{}, "orbit: {kind: circular}\norbit.radius: 10",
		"c.yaml:2: orbit.radius is not a known key; did you mean orbit: {radius: …}?"},
	{"unknown key", Reader{}, good + "accuracy: {zzzzzzzz: 1}",
		"c.yaml:2: accuracy.zzzzzzzz is not a known key; accuracy has relative, floor"},
	{"unknown key without a value", Reader{}, good + "colour:\nhole: {mass: {}}",
		"c.yaml:2: colour is not a known key; the case has title, hole, waves, orbit, pulse, accuracy, numerics, span, model, align, output\nc.yaml:3: hole.mass is not a known key; hole has spin"},
	{"key twice", Reader{}, "orbit:\n  kind: circular\n  radius: 10\n  radius: 12\n",
		"c.yaml:4: orbit.radius is given twice, first in line 3; keep one"},
	{"section twice", Reader{}, good + "hole: {}\nhole: {spin: 0}",
		"c.yaml:3: hole is given twice, first in line 2; keep one"},
	{"no value", Reader{}, "orbit:\n  kind: circular\n  radius:\n",
		"c.yaml:3: orbit.radius has no value; it must be a number above 0"},
	{"quoted number", Reader{}, "orbit: {kind: circular, radius: \"10\"}",
		"c.yaml:1: orbit.radius is \"10\", but must be a number above 0"},
	{"octal look", Reader{}, "orbit: {kind: circular, radius: 010}",
		"c.yaml:1: orbit.radius is 010, but must be a number above 0"},
	{"infinite radius", Reader{}, "orbit: {kind: circular, radius: .inf}",
		"c.yaml:1: orbit.radius is .inf, but must be a number above 0"},
	{"too large for a double", Reader{}, "orbit: {kind: circular, radius: 1e999}",
		"c.yaml:1: orbit.radius is 1e999, but must be a number above 0"},
	{"alias", Reader{}, "title: &a x\nhole: {spin: *a}\n" + good,
		"c.yaml:2: hole.spin is an alias, but must be a number above -1 and below 1"},
	{"scalar for a section", Reader{}, "orbit: circular",
		"c.yaml:1: orbit is circular, but must be a section with keys such as kind, radius, p, e"},
	{"list for a case", Reader{}, "- a\n- b",
		"c.yaml:1: the file holds [a, b], but must hold keys and values such as title, hole, waves, orbit"},
	{"no orbit", Reader{}, "title: x",
		"c.yaml: orbit is missing; a case has exactly one of orbit (a particle) and pulse (initial data)"},
	{"orbit and pulse", everything(), good + "pulse: {centre: 10, width: 2}",
		"c.yaml:2: orbit and pulse are both given; a case has exactly one of them"},
	{"empty orbit", Reader{}, "orbit:\n",
		"c.yaml:1: orbit.kind is missing; it must be circular, eccentric, infall, scatter, inspiral or table"},
	{"missing radius", Reader{}, "title: x\norbit:\n  kind: circular\n",
		"c.yaml:2: orbit.radius is missing; orbit.kind circular needs it, a number above 0"},
	{"kind for later", Reader{features: map[string]bool{"orbit.kind eccentric": false}}, "orbit: {kind: eccentric, p: 10, e: 0.5}",
		"c.yaml:1: orbit.kind eccentric is not available in this version"},
	{"equation for later", Reader{features: map[string]bool{"waves.equation teukolsky": false}}, good + "waves: {equation: teukolsky}",
		"c.yaml:2: waves.equation teukolsky is not available in this version"},
	{"spin for later", Reader{features: map[string]bool{"waves.equation teukolsky": false}}, good + "hole: {spin: 0.5}",
		"c.yaml:2: hole.spin 0.5 needs waves.equation teukolsky, which is not available in this version"},
	{"pulse for later", Reader{features: map[string]bool{"pulse": false}}, "pulse: {}",
		"c.yaml:1: pulse is not available in this version"},
	{"model for later", Reader{features: map[string]bool{"model": false}}, good + "model: {name: mine}",
		"c.yaml:2: model is not available in this version"},
	{"noise without a mass", Reader{}, good + "model: {flux: {file: f.csv}, noise: {file: n.csv}}",
		"c.yaml:2: model.noise.total_mass is missing; it must be a number above 0"},
	{"spin with master", Reader{}, good + "hole: {spin: -0.5}\nwaves: {equation: master}",
		"c.yaml:2: hole.spin is -0.5, but must be 0 with waves.equation master (a spinning hole needs waves.equation teukolsky)"},
	{"key of the other equation", everything(), good + "waves: {spin_weight: -2}",
		"c.yaml:2: waves.spin_weight belongs to waves.equation teukolsky, and this case has master"},
	{"spin weight of a particle", everything(), good + "waves: {equation: teukolsky, spin_weight: 2}",
		"c.yaml:2: waves.spin_weight is 2, but must be -2 for a particle (other spin weights are for pulses)"},
	{"modes", Reader{}, good + "waves:\n  modes:\n  - [2, 2]\n  - [2, 3]\n  - [1, 1]\n  - [2, 2]\n  - [2.5, 1]\n  - 7\n",
		`c.yaml:5: waves.modes[1] is [2, 3], but must be a pair [l, m] with |m| <= l
c.yaml:6: waves.modes[2] is [1, 1], but must be a pair [l, m] with l >= 2 (gravitational waves begin at l = 2)
c.yaml:7: waves.modes[3] is [2, 2], but must be a mode that is not in the list already
c.yaml:8: waves.modes[4] is [2.5, 1], but must be a pair [l, m] of whole numbers with |m| <= l <= 100
c.yaml:9: waves.modes[5] is 7, but must be a pair [l, m] of whole numbers with |m| <= l <= 100`},
	{"no modes", Reader{}, good + "waves: {modes: []}",
		"c.yaml:2: waves.modes is [], but must be a list of pairs [l, m] of whole numbers with |m| <= l <= 100, not empty and none twice"},
	{"modes twice over", Reader{}, good + "waves: {l_max: 4, modes: [[2, 2]]}",
		"c.yaml:2: waves.l_max and waves.modes are both given; a case has at most one of them"},
	{"l_max below 2", Reader{}, good + "waves: {l_max: 1}",
		"c.yaml:2: waves.l_max is 1, but must be a whole number from 2 to 100 (gravitational waves begin at l = 2)"},
	{"odd order", Reader{}, good + "numerics: {order: 7, kernel_moments: 18, rungs: 1}",
		`c.yaml:2: numerics.order is 7, but must be an even number from 2 to 12
c.yaml:2: numerics.kernel_moments is 18, but must be an even number from 2 to 16
c.yaml:2: numerics.rungs is 1, but must be a whole number from 2 to 5`},
	{"zero accuracy", Reader{}, good + "accuracy: {relative: 0}",
		"c.yaml:2: accuracy.relative is 0, but must be a number above 0 and below 1"},
	{"kept twice", Reader{}, good + "output: {keep: [flux, flux]}",
		"c.yaml:2: output.keep is [flux, flux], but must be a list of some of waveform, horizon, flux, report, none twice"},
	{"scalar for a list", Reader{}, good + "output: {keep: flux}",
		"c.yaml:2: output.keep is flux, but must be a list of some of waveform, horizon, flux, report, none twice"},
	{"negative eccentricity", everything(), "orbit: {kind: eccentric, p: 10, e: -0.1}",
		"c.yaml:1: orbit.e is -0.1, but must be a number from 0 and below 1 (an unbound orbit is kind: scatter)"},
	{"mass ratio", everything(), "orbit: {kind: inspiral, from: 10, drive: pn, mass_ratio: 0.3}",
		"c.yaml:1: orbit.mass_ratio is 0.3, but must be a number above 0 and up to 0.25"},
	{"scatter from infinity", everything(), "orbit: {kind: scatter, from: .inf, energy: 0.9, angular_momentum: 5}",
		`c.yaml:1: orbit.from is .inf, but must be a finite radius with orbit.kind scatter
c.yaml:1: orbit.energy is 0.9, but must be at least 1 (an orbit with less energy is bound: kind eccentric or infall)`},
	{"infall from infinity", everything(), "orbit: {kind: infall, from: .inf, energy: 1.2}",
		"c.yaml:1: orbit.energy is 1.2, but must be 1 with orbit.from .inf (a fall from rest at infinity)"},
	{"model without a file", everything(), good + "model: {waveform: {modes: {\"2,2\": h}}}",
		"c.yaml:2: model.waveform.file is missing; it must be the name of a file"},
	{"model with an unnatural mode", everything(), good + "model: {waveform: {file: a.npz, modes: {\"2,3\": h}}}",
		"c.yaml:2: model.waveform.modes is a mapping, but must be a mapping of \"l,m\" to the name of one complex array or a list of two real ones"},
	{"model of nothing", everything(), good + "model: {name: mine}",
		"c.yaml:2: model names nothing to compare; it needs at least one of waveform, flux, force"},
	{"align of nothing", everything(), good + "align: {window: [1, 2]}",
		"c.yaml:2: align belongs to a model, and the case has none"},
	{"unknown column", everything(), "orbit: {kind: table, file: a.csv, columns: {e: energy}}",
		"c.yaml:1: orbit.columns is a mapping, but must be a mapping of some of t, r, phi, theta, pr, pphi, E, L to the names in the file"},
	{"environment and --set", Reader{
		Env:  []string{"HOME=x", "NULLMARK_ACCURACY_RELATIVE=2", "NULLMARK_ORBIT_RADUIS=6", "NULLMARK_WAVES_MODES=[[2,2],[1,0]]", "NULLMARK_TITLE="},
		Sets: []string{"orbit.radius=ten", "orbit.raduis=6", "hole.spin", "output.every=", "span.until=[", "numerics.order={}"}}, good + "title: 5",
		`c.yaml:2: title is 5, but must be one line of text of at most 200 characters, in quotes where it looks like a number
environment NULLMARK_ACCURACY_RELATIVE: accuracy.relative is 2, but must be a number above 0 and below 1
environment NULLMARK_ORBIT_RADUIS: NULLMARK_ORBIT_RADUIS does not stand for a key; did you mean NULLMARK_ORBIT_RADIUS?
environment NULLMARK_WAVES_MODES: waves.modes[1] is [1, 0], but must be a pair [l, m] with l >= 2 (gravitational waves begin at l = 2)
--set orbit.radius: orbit.radius is ten, but must be a number above 0
--set orbit.raduis: orbit.raduis is not a known key; did you mean orbit.radius?
--set hole.spin: "hole.spin" is not a setting; write key.path=value, such as orbit.radius=6
--set output.every: output.every has no value; it must be a number from 0.001 to 10000
--set span.until: span.until is "[", but must be a number above 0
--set numerics.order: numerics.order is a mapping, but must be an even number from 2 to 12`},
	{"settings of nothing", Reader{Sets: []string{"foo.bar=1", "=5", "Orbit.Radius=6"}}, good + "hole: {\"\": 1}",
		`c.yaml:2: hole."" is not a known key; hole has spin
--set foo.bar: foo.bar is not a known key; the case has title, hole, waves, orbit, pulse, accuracy, numerics, span, model, align, output
--set : "=5" is not a setting; write key.path=value, such as orbit.radius=6
--set Orbit.Radius: Orbit.Radius is not a known key; did you mean orbit.radius?`},
	{"empty file", Reader{}, "", "c.yaml: the file is empty; a case needs at least an orbit or a pulse"},
	{"comments alone", Reader{}, "# nothing\n", "c.yaml: the file is empty; a case needs at least an orbit or a pulse"},
	{"binary file", Reader{}, "\x7fELF\x00\x01", "c.yaml: this is not a text file in UTF-8; a case file is YAML"},
	{"latin-1 file", Reader{}, "title: caf\xe9", "c.yaml: this is not a text file in UTF-8; a case file is YAML"},
	{"huge file", Reader{}, "#" + strings.Repeat("x", MaxBytes), "c.yaml: the file is larger than 1024 KiB, which no case file needs to be"},
	{"two documents", Reader{}, good + "---\ntitle: x\n", "c.yaml:2: this is not valid YAML: a case file holds one document, and here a second one begins"},
	{"broken YAML", Reader{}, good + "hole: {spin: 0\n", "c.yaml:2: this is not valid YAML: did not find expected ',' or '}'"},
	{"broken first line", Reader{}, "orbit: ]", "c.yaml:1: this is not valid YAML: did not find expected node content"},
	{"broken list", Reader{}, good + "waves:\n  - 1\n  l_max: 2\n", "c.yaml:3: this is not valid YAML: did not find expected '-' indicator"},
	{"tab", Reader{}, good + "\thole: 1\n", "c.yaml:2: this is not valid YAML: found character that cannot start any token"},
	{"cursor codes", Reader{}, good + "title: \"\\e[2J\"", "c.yaml:2: title is \"\\x1b[2J\", but must be one line of text of at most 200 characters, in quotes where it looks like a number"},
}

func TestSentences(t *testing.T) {
	for _, test := range sentences {
		c, err := test.reader.Parse("c.yaml", []byte(test.typed))
		if err == nil {
			t.Errorf("%s: accepted as %+v", test.name, c)
			continue
		}
		if got := err.Error(); got != test.want {
			t.Errorf("%s:\ngot  %s\nwant %s", test.name, got, test.want)
		}
		var faults Faults
		if !errors.As(err, &faults) || c != nil {
			t.Errorf("%s: want a nil case and Faults, got %v and %T", test.name, c, err)
		}
	}
}

func TestFilesThatCannotBeRead(t *testing.T) {
	dir := t.TempDir()
	for _, test := range []struct{ path, want string }{
		{dir, dir + ": this is a directory; name a case file in it"},
		{filepath.Join(dir, "none.yaml"), filepath.Join(dir, "none.yaml") + ": there is no such file"},
	} {
		if _, err := (Reader{}).Read(test.path); err == nil || err.Error() != test.want {
			t.Errorf("got %v, want %s", err, test.want)
		}
	}
	// Permission and device faults are injected: the superuser meets neither.
	for err, want := range map[error]string{
		&fs.PathError{Op: "open", Path: "x", Err: syscall.EACCES}: "no permission to read this file",
		&fs.PathError{Op: "open", Path: "x", Err: syscall.EIO}:    "the file cannot be read: input/output error",
	} {
		if _, got := load(func(string) (fs.File, error) { return nil, err }, "x"); got == nil || got.Error() != want {
			t.Errorf("got %v, want %s", got, want)
		}
	}
	huge := filepath.Join(dir, "huge.yaml")
	if err := os.WriteFile(huge, make([]byte, 3*MaxBytes), 0o600); err != nil {
		t.Fatal(err)
	}
	data, err := load(func(p string) (fs.File, error) { return os.Open(p) }, huge)
	if err != nil || len(data) > MaxBytes+1 {
		t.Errorf("read %d bytes of a huge file, %v; want no more than one above the limit", len(data), err)
	}
}

// A file of nothing but unknown keys is answered quickly and briefly.
func TestManyFaults(t *testing.T) {
	var b strings.Builder
	for i := 0; b.Len() < MaxBytes-100; i++ {
		b.WriteString("k" + number(float64(i)) + ":\n")
	}
	_, err := Reader{}.Parse("c.yaml", []byte(b.String()))
	if err == nil {
		t.Fatal("accepted")
	}
	lines := strings.Split(err.Error(), "\n")
	if len(lines) != mostShown+1 || !strings.HasPrefix(lines[mostShown], "and ") {
		t.Errorf("%d lines, the last is %q", len(lines), lines[len(lines)-1])
	}
}

func TestChecks(t *testing.T) {
	called := 0
	r := Reader{Checks: []func(*Case) []Problem{func(c *Case) []Problem {
		called++
		if c.Orbit.Radius <= 3 {
			return []Problem{
				{"orbit.radius", c.Orbit.Radius, "a radius above 3 (no timelike circular orbit at or inside the light ring)"},
				{"waves.l_max", c.Waves.LMax, "smaller"},
				{"orbit.inclination", c.Orbit.Inclination, "something else"},
			}
		}
		return nil
	}}}
	typed := "title: x\naccuracy: {relative: 2}\norbit:\n  kind: circular\n  radius: 2.5\n"
	want := `c.yaml: waves.l_max is 8 (the default), but must be smaller
c.yaml:2: accuracy.relative is 2, but must be a number above 0 and below 1
c.yaml:3: orbit.inclination is 0 (the default), but must be something else
c.yaml:5: orbit.radius is 2.5, but must be a radius above 3 (no timelike circular orbit at or inside the light ring)`
	_, err := r.Parse("c.yaml", []byte(typed))
	if err == nil || !sameLines(err.Error(), want) {
		t.Errorf("got\n%v\nwant\n%s", err, want)
	}
	if called != 1 {
		t.Errorf("checks ran %d times", called)
	}
	r.Sets = []string{"orbit.radius=6"} // beats the file, which then is no longer at fault
	if _, err := r.Parse("c.yaml", []byte(typed)); called != 2 || len(err.(Faults)) != 1 {
		t.Errorf("%v after %d calls", err, called)
	}
	r.Sets = []string{"orbit.radius=3"}
	if _, err := r.Parse("c.yaml", []byte(good)); err == nil || !strings.HasSuffix(err.Error(),
		"--set orbit.radius: orbit.radius is 3, but must be a radius above 3 (no timelike circular orbit at or inside the light ring)") {
		t.Errorf("got %v", err)
	}
	r.Sets, called = nil, 1
	if _, err := r.Parse("c.yaml", []byte(good)); err != nil || called != 2 {
		t.Errorf("%v after %d calls", err, called)
	}
	// Not on a case whose orbit is faulty, misspelt or not there.
	for _, bad := range []string{"orbit: {kind: circular, radius: x}", "orbit: {kind: circular}", "orbti: {}", "radius: 4\norbit: {kind: circular}", "title: x", good + "pulse: {}", good + "hole: {spin: 3}"} {
		r.Sets = nil
		if _, err := r.Parse("c.yaml", []byte(bad)); err == nil || called != 2 {
			t.Errorf("%q: %v after %d calls", bad, err, called)
		}
	}
}

// sameLines compares without regard to the order of lines.
func sameLines(a, b string) bool {
	count := map[string]int{}
	for _, l := range strings.Split(a, "\n") {
		count[l]++
	}
	for _, l := range strings.Split(b, "\n") {
		count[l]--
	}
	for _, n := range count {
		if n != 0 {
			return false
		}
	}
	return true
}

func TestNearest(t *testing.T) {
	for word, want := range map[string]string{"raduis": "radius", "RADIUS": "radius", "q": "", "velocity": "", "kidn": "kind", "engery": "energy"} {
		if got := nearest(word, []string{"p", "radius", "kind", "energy", "e"}); got != want {
			t.Errorf("%s: got %q, want %q", word, got, want)
		}
	}
	// Optimal string alignment, worked by hand; the last from V. Levenshtein's definition: three replacements.
	for _, d := range []struct {
		a, b string
		n    int
	}{{"", "abc", 3}, {"ab", "ba", 1}, {"ca", "abc", 3}, {"kitten", "sitting", 3}} {
		if got := distance(d.a, d.b); got != d.n {
			t.Errorf("distance(%q, %q) = %d, want %d", d.a, d.b, got, d.n)
		}
	}
}
