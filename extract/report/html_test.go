package report

import (
	"bytes"
	"encoding/xml"
	"errors"
	"flag"
	"fmt"
	"image"
	_ "image/png"
	"io"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	"nullmark/extract/result"
)

var keep = flag.String("keep", "", "directory in which the drawn pages are left")

// node is one element of the parsed page.
type node struct {
	name  string
	attrs map[string]string
	kids  []*node
	text  string // character data directly inside
}

// parsePage reads a page as strict XML; any fault of form fails the test.
func parsePage(t *testing.T, page []byte) *node {
	t.Helper()
	d := xml.NewDecoder(bytes.NewReader(page))
	d.Strict = true
	root := &node{}
	stack := []*node{root}
	for {
		tok, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Fatalf("the page is not well-formed: %v", err)
		}
		top := stack[len(stack)-1]
		switch tok := tok.(type) {
		case xml.StartElement:
			n := &node{name: tok.Name.Local, attrs: map[string]string{}}
			for _, a := range tok.Attr {
				n.attrs[a.Name.Local] = a.Value
			}
			top.kids = append(top.kids, n)
			stack = append(stack, n)
		case xml.EndElement:
			stack = stack[:len(stack)-1]
		case xml.CharData:
			top.text += string(tok)
		}
	}
	return root
}

// all returns the descendants of that name, in document order.
func (n *node) all(name string) []*node {
	var out []*node
	for _, k := range n.kids {
		if k.name == name {
			out = append(out, k)
		}
		out = append(out, k.all(name)...)
	}
	return out
}

// words is all text inside, in order of elements.
func (n *node) words() string {
	s := n.text
	for _, k := range n.kids {
		s += " " + k.words()
	}
	return strings.Join(strings.Fields(s), " ")
}

func (n *node) byID(id string) *node {
	for _, k := range n.kids {
		if k.attrs["id"] == id {
			return k
		}
		if found := k.byID(id); found != nil {
			return found
		}
	}
	return nil
}

func render(t *testing.T, b *result.Bundle) []byte {
	t.Helper()
	var page bytes.Buffer
	if err := HTML(&page, b); err != nil {
		t.Fatal(err)
	}
	return page.Bytes()
}

func TestPageIsWellFormedAndSelfContained(t *testing.T) {
	for name, b := range kinds() {
		t.Run(name, func(t *testing.T) { wellFormed(t, render(t, b)) })
	}
}

func TestPageIsAccessible(t *testing.T) {
	for name, b := range kinds() {
		t.Run(name, func(t *testing.T) { accessible(t, parsePage(t, render(t, b))) })
	}
}

// wellFormed fails unless the page is strict XML, refers to nothing outside
// itself, runs nothing and has no id twice.
func wellFormed(t *testing.T, page []byte) {
	t.Helper()
	outside := regexp.MustCompile(`(?i)(https?:|//[a-z]|@import|<script|javascript:|\son[a-z]+=|<iframe|<object|<embed|<link|url\((?:[^#]))`)
	root := parsePage(t, page)
	bare := strings.NewReplacer(`xmlns="http://www.w3.org/1999/xhtml"`, "", `xmlns="http://www.w3.org/2000/svg"`, "").Replace(string(page))
	if hit := outside.FindString(bare); hit != "" {
		t.Errorf("the page refers outside itself or runs something: %q", hit)
	}
	if len(page) >= 1<<20 {
		t.Errorf("the page has %d bytes, want less than one megabyte", len(page))
	}
	for _, bad := range []string{"NaN", "Inf", "%!", "ZgotmplZ", "<no value>", "<nil>"} {
		if strings.Contains(string(page), bad) {
			t.Errorf("the page contains %q", bad)
		}
	}
	seen := map[string]bool{}
	var walk func(n *node)
	walk = func(n *node) {
		if id := n.attrs["id"]; id != "" {
			if seen[id] {
				t.Errorf("id %q occurs twice", id)
			}
			seen[id] = true
		}
		for _, k := range n.kids {
			walk(k)
		}
	}
	walk(root)
	for _, use := range regexp.MustCompile(`(?:url\(|href=")#([^)"]+)`).FindAllStringSubmatch(string(page), -1) {
		if !seen[use[1]] {
			t.Errorf("reference to #%s, which is not on the page", use[1])
		}
	}
}

// accessible fails unless tables and pictures say what they are.
func accessible(t *testing.T, root *node) {
	t.Helper()
	if n := len(root.all("h1")); n != 1 {
		t.Errorf("%d main headings, want one", n)
	}
	for _, tab := range root.all("table") {
		if len(tab.all("caption")) != 1 || tab.all("caption")[0].words() == "" {
			t.Errorf("table %q has no caption", tab.attrs["id"])
		}
		width := len(tab.all("thead")[0].all("th"))
		rows := tab.all("tbody")[0].all("tr")
		if len(rows) == 0 {
			t.Errorf("table %q has no rows: an empty frame", tab.attrs["id"])
		}
		for _, r := range rows {
			if got := len(r.all("th")) + len(r.all("td")); got != width {
				t.Errorf("table %q: a row of %d cells under %d headings", tab.attrs["id"], got, width)
			}
		}
	}
	for _, svg := range root.all("svg") {
		for _, id := range strings.Fields(svg.attrs["aria-labelledby"]) {
			if n := svg.byID(id); n == nil || n.words() == "" {
				t.Errorf("picture without the description %q", id)
			}
		}
		if svg.attrs["role"] != "img" || svg.attrs["aria-labelledby"] == "" {
			t.Error("a picture has no role or no description")
		}
		if len(svg.all("text")) == 0 {
			t.Error("a picture has no text")
		}
	}
	for _, sec := range root.all("section") {
		if len(sec.all("table"))+len(sec.all("figure"))+len(sec.all("dl"))+len(sec.all("ul"))+len(sec.all("pre")) == 0 {
			t.Errorf("section %q is empty", sec.attrs["aria-labelledby"])
		}
	}
}

// headings returns the section headings in order.
func headings(root *node) string {
	var out []string
	for _, h := range root.all("h2") {
		out = append(out, h.words())
	}
	return strings.Join(out, " | ")
}

func figures(root *node) string {
	var out []string
	for _, f := range root.all("figure") {
		out = append(out, strings.TrimPrefix(f.attrs["id"], "picture-"))
	}
	return strings.Join(out, " ")
}

func TestPageHoldsWhatTheResultHasInOrder(t *testing.T) {
	want := map[string][2]string{
		"circular":     {"Total | Modes | Pictures | Conventions | Orbit | Resolutions | Warnings | Provenance | Loading the data", "orbit wave amplitude flux budget evidence"},
		"plunge":       {"Total | Modes | Pictures | Conventions | Orbit | Loading the data", "orbit wave peak amplitude flux evidence"},
		"spinning":     {"Total | Modes | Pictures", "flux"},
		"pulse":        {"Ringing and decay | Pictures | Loading the data", "wave amplitude ringing decay evidence"},
		"bare":         {"", ""},
		"empty series": {"Loading the data", ""},
	}
	for name, b := range kinds() {
		root := parsePage(t, render(t, b))
		if got := headings(root); got != want[name][0] {
			t.Errorf("%s: sections\n%s, want\n%s", name, got, want[name][0])
		}
		if got := figures(root); got != want[name][1] {
			t.Errorf("%s: pictures %q, want %q", name, got, want[name][1])
		}
	}
}

func TestPageOpensWithTheAnswer(t *testing.T) {
	root := parsePage(t, render(t, circular()))
	answer := root.all("header")[0].words()
	for _, want := range []string{
		"Circular orbit at r = 10",
		"loses energy at the rate 6.150372549e-5 ± 4.3e-13 μ²/M² to null infinity",
		"1.2591294230e-8 ± 2.1e-17 μ²/M² into the hole",
		"Asked accuracy NOT met.",
		"1 mode of 35 did not reach the asked relative accuracy 1e-9; the worst is the energy at the horizon of mode (8,1) with a relative bar of 3.2e-8.",
	} {
		if !strings.Contains(answer, want) {
			t.Errorf("the answer lacks %q:\n%s", want, answer)
		}
	}
	row := ""
	for _, r := range root.byID("modes-energy").all("tr") {
		if strings.HasPrefix(r.words(), "2 2 ") {
			row = r.words()
		}
	}
	if want := "2 2 even 5.3687954790(15)e-5 1.5e-14 1.1308280000(14)e-8 1.4e-17 met"; row != want {
		t.Errorf("row of (2,2) is %q, want %q", row, want)
	}
	if got := len(root.byID("modes-energy").all("tbody")[0].all("tr")); got != 35 {
		t.Errorf("%d rows, want 35", got)
	}
	for _, id := range []string{"total", "truncation", "modes-energy", "modes-angular", "modes-strain"} {
		bars := 0
		tab := root.byID(id)
		for _, h := range tab.all("thead")[0].all("th") {
			if strings.HasPrefix(h.words(), "bar (") {
				bars++
			} else if h.attrs["class"] == "num" && len(h.all("span")) == 0 {
				t.Errorf("table %s: heading %q has no unit", id, h.words())
			}
		}
		if bars == 0 {
			t.Errorf("table %s has no column of bars", id)
		}
	}
}

// TestLongRunStaysSmall draws a run of many revolutions whose samples are as
// rough as they can be.
func TestLongRunStaysSmall(t *testing.T) {
	b := circular()
	s := b.Series
	s.U, s.T, s.R, s.Phi = nil, nil, nil, nil
	for k := range 60000 {
		u := 0.5 * float64(k)
		s.U, s.T = append(s.U, u), append(s.T, u)
		r := 4 + 30*math.Pow(1-u/30001, 0.25)
		s.R, s.Phi = append(s.R, r), append(s.Phi, 300*2*math.Pi*u/30000)
	}
	for i := range s.Modes {
		m := &s.Modes[i]
		size := m.Wave[len(m.Wave)-1]
		m.Wave, m.WaveErr, m.Evidence = nil, nil, nil
		for k := range s.U {
			rough := 1 + 0.9*math.Sin(float64(k*k%1009))
			m.Wave = append(m.Wave, size*complex(rough, 0))
			m.WaveErr = append(m.WaveErr, 1e-10*rough)
			m.Evidence = append(m.Evidence, 1e-11*rough)
		}
	}
	page := render(t, b)
	parsePage(t, page)
	t.Logf("%d bytes", len(page))
	if len(page) >= 1<<20 {
		t.Errorf("the page has %d bytes, want less than one megabyte", len(page))
	}
}

func TestHostileTextIsInert(t *testing.T) {
	evil := "<script>alert(1)</script>\"'><img src=x onerror=alert(2)>&amp;</title></style>]]>\x00\x1b[31m\u202E\xff"
	b := circular()
	r := b.Result
	r.Title, r.Orbit.Kind = evil, evil
	r.Warnings = []string{evil}
	r.Conventions[evil] = evil
	r.Provenance.Commit = evil
	r.Modes[0].Parity, r.Modes[0].Counts = evil, evil
	r.Modes[0].Met, r.Modes[0].Why = false, evil
	r.Modes[0].Budget[evil] = 1e-10
	r.Orbit.Numbers[evil] = 1
	r.Orbit.Markers = map[string]float64{evil: 1}
	r.Total.Truncation.Note = evil
	r.Rungs[0].Modes = evil
	r.Accuracy.Worst.What = evil
	r.Ringing = []result.Ringing{{L: 2, Where: evil}}
	r.Tail = []result.Tail{{L: 2, Where: evil}}
	r.Case = map[string]any{"title": evil}
	b.Series.Prefix = evil
	page := render(t, b)
	root := parsePage(t, page)
	if n := len(root.all("script")) + len(root.all("img")); n != 0 {
		t.Errorf("%d elements came out of a text", n)
	}
	if got := root.all("h1")[0].words(); !strings.HasPrefix(got, "<script>alert(1)</script>") {
		t.Errorf("the title is not shown as typed: %q", got)
	}
	if bytes.ContainsAny(page, "\x00\x1b\u202e") {
		t.Error("a control character reached the page")
	}
	var term bytes.Buffer
	if err := Terminal(&term, r, 80, false); err != nil {
		t.Fatal(err)
	}
	if strings.ContainsAny(term.String(), "\x00\x1b\u202e") {
		t.Error("a control character reached the terminal")
	}
}

func TestSamePageTwice(t *testing.T) {
	if !bytes.Equal(render(t, circular()), render(t, circular())) {
		t.Error("the same bundle gave two different pages")
	}
}

func TestNoResultIsAnError(t *testing.T) {
	if HTML(io.Discard, nil) == nil || HTML(io.Discard, &result.Bundle{}) == nil || Terminal(io.Discard, nil, 80, false) == nil {
		t.Error("no error without a result")
	}
	if HTML(full{}, circular()) == nil || Terminal(full{}, circular().Result, 80, false) == nil {
		t.Error("a failed write went unnoticed")
	}
}

type full struct{}

func (full) Write([]byte) (int, error) { return 0, errors.New("no space left") }

func TestThinnedCurveKeepsItsExtremes(t *testing.T) {
	var xs, ys []float64
	for i := range 200000 {
		xs = append(xs, float64(i))
		ys = append(ys, math.Sin(float64(i)*0.01))
	}
	ys[77777], ys[123456] = 5, -7
	x, y := axis{lo: 0, hi: 199999, from: 0, to: 600}, axis{lo: -10, hi: 10, from: 200, to: 0}
	d := thinned(x, y, xs, ys)
	top, bottom, points := math.Inf(1), math.Inf(-1), 0
	at := 0.0
	for _, step := range regexp.MustCompile(`([Ml])\S+ (-?[\d.]+)`).FindAllStringSubmatch(d, -1) {
		v, err := strconv.ParseFloat(step[2], 64)
		if err != nil {
			t.Fatal(err)
		}
		if step[1] == "M" {
			at = 0
		}
		at += v
		top, bottom, points = math.Min(top, at), math.Max(bottom, at), points+1
	}
	if points > 4*601 || points < 600 {
		t.Errorf("%d points for 600 columns", points)
	}
	if math.Abs(top-y.at(5)) > 0.06 || math.Abs(bottom-y.at(-7)) > 0.06 {
		t.Errorf("the curve reaches from %v to %v, want its spikes at %v and %v", top, bottom, y.at(5), y.at(-7))
	}
	ys[500] = math.NaN()
	ys[501] = math.Inf(1)
	if d := thinned(axis{lo: 0, hi: 1000, from: 0, to: 600}, y, xs[:1000], ys[:1000]); strings.Count(d, "M") != 2 || strings.Contains(d, "NaN") || strings.Contains(d, "Inf") {
		t.Error("a gap does not break the curve in two")
	}
}

// TestBrowserDrawsThePage renders the page in headless Chromium where one is
// installed, and checks that ink is on it from top to bottom. With -keep DIR
// the pages of every kind and their pictures are left in DIR for looking at.
func TestBrowserDrawsThePage(t *testing.T) {
	browser, err := exec.LookPath("chromium")
	if err != nil {
		t.Log("chromium is not installed: the page was not drawn")
		return
	}
	names := []string{"circular"}
	dir := t.TempDir()
	if *keep != "" {
		dir = *keep
		names = []string{"circular", "plunge", "spinning", "pulse"}
	}
	for _, name := range names {
		page := filepath.Join(dir, name+".html")
		if err := os.WriteFile(page, render(t, kinds()[name]), 0o644); err != nil {
			t.Fatal(err)
		}
		shot := filepath.Join(dir, name+".png")
		cmd := exec.CommandContext(t.Context(), browser, "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
			"--disable-background-networking", "--disable-component-update", "--disable-sync", "--hide-scrollbars",
			"--user-data-dir="+t.TempDir(), "--screenshot="+shot, "--window-size=1200,4000", "file://"+page)
		cmd.WaitDelay = 5 * time.Second
		if out, err := cmd.CombinedOutput(); err != nil {
			t.Fatalf("%s: chromium: %v\n%s", name, err, out)
		}
		f, err := os.Open(shot)
		if err != nil {
			t.Fatal(err)
		}
		img, _, err := image.Decode(f)
		f.Close()
		if err != nil {
			t.Fatal(err)
		}
		if err := inked(img, 8); err != nil && name == "circular" { // the others are shorter than the window
			t.Errorf("%s: %v", name, err)
		}
	}
}

// inked reports an error unless each of n horizontal bands of the picture has
// between 0.2 and 60 per cent of dark or coloured pixels.
func inked(img image.Image, n int) error {
	b := img.Bounds()
	for band := range n {
		y0, y1 := b.Min.Y+b.Dy()*band/n, b.Min.Y+b.Dy()*(band+1)/n
		dark, all := 0, 0
		for y := y0; y < y1; y++ {
			for x := b.Min.X; x < b.Max.X; x++ {
				r, g, bl, _ := img.At(x, y).RGBA()
				if (r+g+bl)/3 < 0xc000 {
					dark++
				}
				all++
			}
		}
		if part := float64(dark) / float64(all); part < 0.002 || part > 0.6 {
			return fmt.Errorf("band %d of %d has %.2g %% ink", band+1, n, 100*part)
		}
	}
	return nil
}

func TestInkedNoticesABlankPage(t *testing.T) {
	if inked(image.NewGray(image.Rect(0, 0, 50, 50)), 2) == nil {
		t.Error("an all-black picture passes")
	}
	white := image.NewGray(image.Rect(0, 0, 50, 50))
	for i := range white.Pix {
		white.Pix[i] = 255
	}
	if inked(white, 2) == nil {
		t.Error("a blank picture passes")
	}
}
