package configs

import (
	"bytes"
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"

	"go.yaml.in/yaml/v3"
)

func mustParse(t *testing.T, r Reader, typed string) *Case {
	t.Helper()
	c, err := r.Parse("c.yaml", []byte(typed))
	if err != nil {
		t.Fatalf("%q: %v", typed, err)
	}
	return c
}

func TestDefaults(t *testing.T) {
	got := mustParse(t, Reader{}, good)
	want := &Case{
		Title:    "untitled",
		Waves:    Waves{Equation: Master, LMax: 8},
		Orbit:    &Orbit{Kind: Circular, Radius: 10},
		Accuracy: Accuracy{Relative: 1e-8, Floor: 1e-14},
		Output:   Output{Every: 0.5, Keep: []string{"waveform", "horizon", "flux", "report"}},
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got  %+v\nwant %+v", got, want)
	}
	spinning := mustParse(t, everything(), good+"hole: {spin: 0.5}")
	if w := spinning.Waves; w.Equation != Teukolsky || w.SpinWeight != -2 {
		t.Errorf("a spinning hole got %+v", w)
	}
}

// Defaults < file < environment < --set, key by key.
func TestPrecedence(t *testing.T) {
	typed := "orbit: {kind: circular, radius: 10}\naccuracy: {relative: 1e-3, floor: 1e-5}\nspan: {until: 5}\n"
	r := Reader{
		Env:  []string{"NULLMARK_ORBIT_RADIUS=11", "NULLMARK_ACCURACY_RELATIVE=1e-4", "NULLMARK_TITLE=2024", "PATH=x", "NULLMARK_SPAN_UNTIL="},
		Sets: []string{"orbit.radius=5", "orbit.radius=6", "output={every: 2, keep: []}"},
	}
	c := mustParse(t, r, typed)
	if c.Orbit.Radius != 6 || c.Accuracy.Relative != 1e-4 || c.Accuracy.Floor != 1e-5 || c.Title != "2024" ||
		*c.Span.Until != 5 || c.Waves.LMax != 8 || c.Output.Every != 2 || len(c.Output.Keep) != 0 {
		t.Errorf("got %+v, orbit %+v", c, c.Orbit)
	}
	// The rules between keys hold for the values that count.
	r = everything()
	r.Sets = []string{"hole.spin=0", "orbit.kind=circular", "orbit.radius=7"}
	if c := mustParse(t, r, "orbit: {kind: eccentric}\nhole: {spin: 0.5}"); c.Waves.Equation != Master || c.Orbit.Kind != Circular {
		t.Errorf("got %+v, orbit %+v", c.Waves, c.Orbit)
	}
	// Every key can be reached through the environment, by one name only.
	seen := map[string]string{}
	for _, p := range everyPath() {
		if other, taken := seen[variable(p)]; taken {
			t.Errorf("%s and %s share %s", p, other, variable(p))
		}
		seen[variable(p)] = p
	}
	// A case may consist of settings alone on top of an almost empty file.
	if c := mustParse(t, Reader{Sets: []string{"orbit.kind=circular", "orbit.radius=7"}}, "title: x"); c.Orbit.Radius != 7 {
		t.Errorf("got %+v", c.Orbit)
	}
}

// Of l_max and modes the one from the later source counts.
func TestModesAgainstLMax(t *testing.T) {
	for _, test := range []struct {
		file string
		set  string
		lmax int
		list string
	}{
		{"modes: [[3,-1],[2,2],[3,1],[2,1]]", "title=x", 3, "[[2 1] [2 2] [3 1]]"},
		{"l_max: 8", "waves.modes=[[2,2]]", 2, "[[2 2]]"},
		{"modes: [[4,2]]", "waves.l_max=2", 2, "[[2 0] [2 1] [2 2]]"},
		{"l_max: 3", "waves.l_max=2.0", 2, "[[2 0] [2 1] [2 2]]"},
	} {
		c := mustParse(t, Reader{Sets: []string{test.set}}, good+"waves: {"+test.file+"}")
		if got := fmt.Sprint(c.ModeList()); got != test.list || c.Waves.LMax != test.lmax {
			t.Errorf("%s, %s: %s up to %d", test.file, test.set, got, c.Waves.LMax)
		}
	}
	scalar := mustParse(t, everything(), "pulse: {centre: 10, width: 2}\nwaves: {equation: teukolsky, spin_weight: 0, l_max: 1}")
	if got := fmt.Sprint(scalar.ModeList()); got != "[[0 0] [1 0] [1 1]]" {
		t.Errorf("scalar modes %s", got)
	}
}

// What the user may legitimately write must not be refused.
func TestAccepted(t *testing.T) {
	for _, typed := range []string{
		"\ufeff" + good,
		good + "numerics:\nspan:\n",
		good + "accuracy: {relative: 1.0e-300}",
		good + "accuracy: {floor: 0}",
		good + "waves: {l_max: 1e1}",
		good + "title: 'yes'",
		good + "title: Bahn um r = 10, größer als 6",
		"orbit: {kind: circular, radius: +.5e+1}",
		"---\n" + good + "...\n",
		strings.ReplaceAll(good, "\n", "\r\n"),
	} {
		mustParse(t, Reader{}, typed)
	}
	for _, typed := range []string{
		"orbit: {kind: infall, from: .inf, energy: 1}",
		"orbit: {kind: infall, from: 8, energy: 0.9, angular_momentum: 2}",
		"orbit: {kind: scatter, from: 200, energy: 1, angular_momentum: -4.5}",
		"orbit: {kind: circular, radius: 6, inclination: 30}\nhole: {spin: 0.9}",
		"pulse: {centre: -5, width: 1, moving: static}",
		good + "model: {flux: {file: f.csv, energy: F}}\nalign: {window: [-1, 2.5]}",
		good + "model: {waveform: {file: m.npz, modes: {\"2,2\": h22, \"2, 1\": [re, im]}}}\nalign: none",
	} {
		mustParse(t, everything(), typed)
	}
}

// File names start from the case file's directory, those on the command line
// from the working directory; resolved they are absolute.
func TestFileNames(t *testing.T) {
	r := everything()
	c, err := r.Parse(filepath.Join("some", "where.yaml"), []byte("orbit: {kind: table, file: a/b.csv}"))
	if err != nil {
		t.Fatal(err)
	}
	here, _ := filepath.Abs(".")
	if want := filepath.Join(here, "some", "a", "b.csv"); c.Orbit.File != want {
		t.Errorf("got %s, want %s", c.Orbit.File, want)
	}
	r.Sets = []string{"orbit.file=b.csv"}
	if c, err = r.Parse(filepath.Join("some", "where.yaml"), []byte("orbit: {kind: table, file: a/b.csv}")); err != nil || c.Orbit.File != filepath.Join(here, "b.csv") {
		t.Errorf("got %+v, %v", c, err)
	}
	r.Sets = nil
	if c := mustParse(t, r, "orbit: {kind: inspiral, mass_ratio: 1e-3, from: 9, drive: pn}"); c.Orbit.Drive != DrivePN {
		t.Errorf("got %s", c.Orbit.Drive)
	}
}

// Column names keep their case: E and e differ.
func TestColumnsKeepCase(t *testing.T) {
	c := mustParse(t, everything(), "orbit: {kind: table, file: a.csv, columns: {E: Energy, L: Lz, t: TIME}}")
	if want := (Columns{E: "Energy", L: "Lz", T: "TIME"}); c.Orbit.Columns != want {
		t.Errorf("got %+v", c.Orbit.Columns)
	}
}

// Each row of the schema has a field of its type, each field a row.
func TestSchemaMatchesCase(t *testing.T) {
	rows := map[string]bool{}
	for _, k := range schema {
		if rows[k.path] {
			t.Errorf("%s stands twice in the schema", k.path)
		}
		rows[k.path] = true
		if k.doc == "" {
			t.Errorf("%s has no meaning", k.path)
		}
		for _, kind := range slices.Concat(k.of, k.need, k.infinite) {
			if kind != always && !slices.Contains(kinds, kind) {
				t.Errorf("%s names the unknown kind %s", k.path, kind)
			}
		}
	}
	var fields func(prefix string, typ reflect.Type) []string
	fields = func(prefix string, typ reflect.Type) (list []string) {
		for i := range typ.NumField() {
			f := typ.Field(i)
			path := join(prefix, f.Tag.Get("mapstructure"))
			inner := f.Type
			if inner.Kind() == reflect.Pointer {
				inner = inner.Elem()
			}
			if slices.Contains(sections, path) {
				list = append(list, fields(path, inner)...)
				continue
			}
			list = append(list, path)
			k := find(path)
			if k == nil {
				t.Errorf("the field %s has no row", path)
				continue
			}
			want := map[form]reflect.Kind{text: reflect.String, pathForm: reflect.String, choice: reflect.String, real: reflect.Float64, whole: reflect.Int}[k.form]
			if want != reflect.Invalid && inner.Kind() != want {
				t.Errorf("%s is a %s in the Case", path, inner)
			}
			if k.preset != nil && reflect.TypeOf(k.preset) != inner {
				t.Errorf("the default of %s is a %T, the field a %s", path, k.preset, inner)
			}
		}
		return list
	}
	if n := len(fields("", reflect.TypeFor[Case]())); n != len(schema) {
		t.Errorf("%d fields, %d rows", n, len(schema))
	}
}

// Every kind and equation has its entry, and what the table holds back is
// exactly what is refused.
func TestFeatures(t *testing.T) {
	for _, kind := range kinds {
		if _, ok := features["orbit.kind "+kind]; !ok {
			t.Errorf("no entry for %s", kind)
		}
	}
	whole := map[string]string{
		"orbit.kind " + Circular:      good,
		"orbit.kind " + Eccentric:     "orbit: {kind: eccentric, p: 9, e: 0.5}",
		"orbit.kind " + Infall:        "orbit: {kind: infall, from: .inf, energy: 1}",
		"orbit.kind " + Scatter:       "orbit: {kind: scatter, from: 100, energy: 1.1, angular_momentum: 6}",
		"orbit.kind " + Inspiral:      "orbit: {kind: inspiral, from: 9, mass_ratio: 1e-3, drive: pn}",
		"orbit.kind " + Table:         "orbit: {kind: table, file: a.npz}",
		"waves.equation " + Master:    good + "waves: {equation: master}",
		"waves.equation " + Teukolsky: good + "waves: {equation: teukolsky}",
		pulsesTeukolsky:               "pulse: {centre: 10, width: 2}\nwaves: {equation: teukolsky}",
		"pulse":                       "pulse: {centre: 10, width: 2}",
		"model":                       good + "model: {flux: {file: f.csv}}",
	}
	for feature := range features {
		typed, ok := whole[feature]
		if !ok {
			t.Errorf("no case for %s", feature)
			continue
		}
		r := everything()
		mustParse(t, r, typed)
		r.features[feature] = false
		_, err := r.Parse("c.yaml", []byte(typed))
		if err == nil || len(err.(Faults)) != 1 || !strings.HasSuffix(err.Error(), feature+" is not available in this version") {
			t.Errorf("%s switched off: %v", feature, err)
		}
		// The table of this version is the one that counts for users.
		if _, err := (Reader{}).Parse("c.yaml", []byte(typed)); (err == nil) != features[feature] {
			t.Errorf("%s: %v", feature, err)
		}
	}
}

func TestShipped(t *testing.T) {
	if !slices.Contains(Shipped(), "circular.yaml") {
		t.Fatalf("shipped are %v", Shipped())
	}
	for _, name := range Shipped() {
		data, err := ShippedFile(name)
		if err != nil {
			t.Fatal(err)
		}
		embedded, err := Reader{}.Parse(name, data)
		if err != nil {
			t.Fatal(err)
		}
		onDisk, err := Reader{}.Read(name)
		if err != nil || !reflect.DeepEqual(embedded, onDisk) {
			t.Errorf("%s: %+v on disk, %v", name, onDisk, err)
		}
	}
	data, _ := ShippedFile("circular.yaml")
	c := mustParse(t, Reader{}, string(data))
	if c.Orbit.Radius != 10 || c.Waves.LMax != 8 || c.Accuracy.Relative != 1e-9 || len(c.ModeList()) != 42 {
		t.Errorf("%+v", c)
	}
	if _, err := ShippedFile("none.yaml"); err == nil {
		t.Error("a case that is not there was found")
	}
}

func TestReference(t *testing.T) {
	lines := strings.Split(strings.TrimSpace(Reference()), "\n")
	if len(lines) != len(schema)+2 {
		t.Fatalf("%d lines for %d keys", len(lines), len(schema))
	}
	for i, line := range lines {
		if n := strings.Count(line, "|") - strings.Count(line, `\|`); n != 6 {
			t.Errorf("%d bars in %s", n, line)
		}
		if i >= 2 && !strings.HasPrefix(line, "| `"+schema[i-2].path+"` |") {
			t.Errorf("%s stands where %s belongs", line, schema[i-2].path)
		}
	}
	want := "| `orbit.radius` | a number above 0 | required | circular | Radius of the orbit, M. |"
	if !slices.Contains(lines, want) {
		t.Errorf("no line reads %s", want)
	}
}

// The written form, byte for byte.
func TestCanonical(t *testing.T) {
	typed := "output: {keep: [flux, waveform]}\norbit: {radius: 1e1, kind: circular}\naccuracy: {relative: 0.00000001}\ntitle: '12'\nwaves: {modes: [[2, 2], [2, -1]]}\nnumerics: {order: 1.2e1, layer: 25}\nhole: {spin: -0.0}\n"
	want := `title: "12"
hole:
  spin: 0
waves:
  equation: master
  modes: [[2, -1], [2, 2]]
orbit:
  kind: circular
  radius: 10
accuracy:
  relative: 1e-8
  floor: 1e-14
numerics:
  order: 12
  layer: 25
output:
  every: 0.5
  keep: [waveform, flux]
`
	c := mustParse(t, Reader{}, typed)
	got, err := c.YAML()
	if err != nil || string(got) != want {
		t.Errorf("%v, got\n%s", err, got)
	}
	same := mustParse(t, Reader{}, want)
	if c.Hash() != same.Hash() || len(c.Hash()) != 16 {
		t.Errorf("hashes %s and %s", c.Hash(), same.Hash())
	}
	other := mustParse(t, Reader{Sets: []string{"orbit.radius=10.000000000000002"}}, want)
	if c.Hash() == other.Hash() {
		t.Error("the next double has the same hash")
	}
}

// Two reads share no memory, so nobody can change another's case.
func TestReadsAreIndependent(t *testing.T) {
	typed := good + "waves: {modes: [[2, 2]]}\nspan: {until: 5}"
	a, b := mustParse(t, Reader{}, typed), mustParse(t, Reader{}, typed)
	a.Waves.Modes[0][0], *a.Span.Until, a.Output.Keep[0], a.Orbit.Radius = 7, 7, "x", 7
	if c := mustParse(t, Reader{}, typed); !reflect.DeepEqual(b, c) {
		t.Errorf("%+v and %+v", b, c)
	}
}

// randomCase writes a valid case file of any kind. Every optional key is there
// or not by chance, in random order and notation.
func randomCase(rng *rand.Rand) string {
	equation := Master
	spin := 0.0
	if rng.IntN(2) == 0 {
		equation = Teukolsky
		spin = 2*rng.Float64() - 1
	}
	kind := kinds[rng.IntN(len(kinds))]
	pulse := rng.IntN(5) == 0
	withModes := rng.IntN(2) == 0
	put := map[string]any{}
	value := func(k *key) any {
		switch k.form {
		case text:
			return []string{"plain", "12", "with: colon", "yes", "é # ü", " blank ", "-", "'", "1e3", "~", `"`}[rng.IntN(11)]
		case pathForm:
			return []string{"a.npz", "/x/b.csv", "../c d.npy"}[rng.IntN(3)]
		case choice:
			return k.choices[rng.IntN(len(k.choices))]
		case subset:
			list := slices.Clone(k.choices)
			rng.Shuffle(len(list), func(i, j int) { list[i], list[j] = list[j], list[i] })
			return list[:rng.IntN(len(list)+1)]
		case real:
			low, high := math.Max(k.bounds.low, -1e6), math.Min(k.bounds.high, 1e6)
			x := low + (high-low)*(1-rng.Float64())
			if !k.bounds.hold(x) {
				x = (low + high) / 2
			}
			return x
		case whole:
			n := int(k.bounds.low) + rng.IntN(int(k.bounds.high-k.bounds.low)+1)
			if k.even {
				n -= n & 1
			}
			return max(n, 2)
		case pairs:
			list := [][]int{}
			seen := map[[2]int]bool{}
			for range 1 + rng.IntN(6) {
				l := 2 + rng.IntN(9)
				m := rng.IntN(2*l+1) - l
				if !seen[[2]int{l, m}] {
					seen[[2]int{l, m}] = true
					list = append(list, []int{l, m})
				}
			}
			return list
		case columns:
			return map[string]string{"t": "time", "E": "Energy", "pphi": "12"}
		case arrays:
			return map[string]any{"2,2": "h22", "3,-1": []string{"re", "im"}, "10,1": "null"}
		case shift:
			return map[string]any{"window": []float64{-1.5, rng.Float64()}}
		}
		panic("unknown form")
	}
	for i := range schema {
		k := &schema[i]
		first, rest, _ := strings.Cut(k.path, ".")
		part, _, deeper := strings.Cut(rest, ".")
		required := slices.Contains(k.need, kind) || slices.Contains(k.need, always)
		switch {
		case first == "orbit" && (pulse || !k.suits(setting{kind, equation})):
		case first == "pulse" && !pulse:
		case !k.suits(setting{equation: equation}):
		case (first == "model" || first == "align") && kind == Table: // no model with this kind, by choice
		case first == "model" && deeper && part != "flux" && rng.IntN(3) == 0 && !required:
		case k.path == "hole.spin":
			put[k.path] = spin
		case k.path == "waves.equation":
			put[k.path] = equation
		case k.path == "waves.spin_weight" && !pulse:
			put[k.path] = -2
		case k.path == "waves.l_max" && withModes, k.path == "waves.modes" && !withModes:
		case k.path == "orbit.kind":
			put[k.path] = kind
		case k.path == "orbit.from" && kind == Infall && rng.IntN(2) == 0:
			put[k.path], put["orbit.energy"] = math.Inf(1), 1
		case k.path == "orbit.energy" && put[k.path] != nil:
		case k.path == "orbit.energy" && kind == Scatter:
			put[k.path] = 1 + rng.Float64()
		case required || rng.IntN(2) == 0 || k.path == "model.name":
			put[k.path] = value(k)
		}
	}
	nested := map[string]any{}
	for path, v := range put {
		at := nested
		for _, part := range strings.Split(parent(path), ".") {
			if part == "" {
				continue
			}
			if at[part] == nil {
				at[part] = map[string]any{}
			}
			at = at[part].(map[string]any)
		}
		at[name(path)] = v
	}
	data, err := yaml.Marshal(nested)
	if err != nil {
		panic(err)
	}
	return string(data)
}

// roundTrip checks that the resolved case reads back as itself, and that a
// general YAML reader finds in it only keys of its own kind.
func roundTrip(t *testing.T, c *Case) {
	t.Helper()
	written, err := c.YAML()
	if err != nil {
		t.Fatal(err)
	}
	again, err := everything().Parse("elsewhere/c.yaml", written)
	if err != nil {
		t.Fatalf("the resolved case is refused: %v\n%s", err, written)
	}
	if !reflect.DeepEqual(c, again) || c.Hash() != again.Hash() {
		t.Fatalf("got %+v\nwant %+v\n%s", again, c, written)
	}
	rewritten, err := again.YAML()
	if err != nil || !bytes.Equal(written, rewritten) {
		t.Fatalf("%v: written twice\n%s\n%s", err, written, rewritten)
	}
	var general struct{ Orbit map[string]any }
	if err := yaml.Unmarshal(written, &general); err != nil {
		t.Fatal(err)
	}
	belong := map[string][]string{
		Circular: {"kind", "radius", "inclination"}, Eccentric: {"kind", "p", "e", "inclination", "radial_phase", "polar_phase", "azimuth"},
		Infall: {"kind", "from", "energy", "angular_momentum"}, Scatter: {"kind", "from", "energy", "angular_momentum"},
		Inspiral: {"kind", "from", "mass_ratio", "drive"}, Table: {"kind", "file", "columns"},
	}
	for key := range maps.Keys(general.Orbit) {
		if !slices.Contains(belong[c.Orbit.Kind], key) {
			t.Errorf("%s does not belong to %s", key, c.Orbit.Kind)
		}
	}
}

func TestRoundTrip(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	reached := map[string]int{}
	for range 600 {
		typed := randomCase(rng)
		c := mustParse(t, everything(), typed)
		roundTrip(t, c)
		if c.Orbit != nil {
			reached[c.Orbit.Kind]++
		} else {
			reached["pulse"]++
		}
	}
	if len(reached) != len(kinds)+1 {
		t.Errorf("only %v were tried", reached)
	}
}

// Read must never panic, and what it accepts must survive the round trip.
func FuzzRead(f *testing.F) {
	for _, s := range sentences {
		if len(s.typed) < 4096 {
			f.Add(s.typed, "orbit.radius=6")
		}
	}
	rng := rand.New(rand.NewPCG(3, 4))
	for range 30 {
		f.Add(randomCase(rng), "accuracy={relative: 0.5}")
	}
	f.Fuzz(func(t *testing.T, typed, set string) {
		r := everything()
		r.Sets = []string{set}
		r.Env = []string{"NULLMARK_" + set}
		c, err := r.Parse("c.yaml", []byte(typed))
		if err != nil {
			if err.Error() == "" || strings.ContainsRune(err.Error(), '\x1b') {
				t.Errorf("unfit message %q", err.Error())
			}
			return
		}
		roundTrip(t, c)
	})
}
