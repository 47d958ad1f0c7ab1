package report

import (
	"bytes"
	"regexp"
	"strings"
	"testing"
	"unicode/utf8"

	"nullmark/extract/result"
)

func printed(t *testing.T, r *result.Result, width int, colour bool) string {
	t.Helper()
	var b bytes.Buffer
	if err := Terminal(&b, r, width, colour); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestTerminalTable(t *testing.T) {
	const want = `Circular orbit at r = 10
Energy per coordinate time in μ²/M², m and −m together
       to null infinity        ± bar  into the horizon         ± bar
total  6.150372549(43)e-5    4.3e-13  1.2591294230(21)e-8    2.1e-17
(2,2)  5.3687954790(15)e-5   1.5e-14  1.1308280000(14)e-8    1.4e-17
`
	got := printed(t, circular().Result, 80, false)
	if !strings.HasPrefix(got, want) {
		t.Errorf("the table begins\n%s\nwant\n%s", got, want)
	}
	for _, line := range []string{"25 more modes in flux.csv and in report.html", "Asked accuracy NOT met. 1 mode of 35 did not reach", "Warning: The horizon number"} {
		if !strings.Contains(got, line) {
			t.Errorf("no %q in\n%s", line, got)
		}
	}
	if got := printed(t, plunge().Result, 80, false); !strings.Contains(got, "Asked accuracy met. Every mode reached") {
		t.Errorf("no verdict in\n%s", got)
	}
	if got := printed(t, pulse().Result, 80, false); !strings.Contains(got, "0.3736716844(20)") || !strings.Contains(got, "4.0020(40)") {
		t.Errorf("no ringing or decay in\n%s", got)
	}
}

func TestTerminalKeepsToTheWidth(t *testing.T) {
	for name, b := range kinds() {
		for _, width := range []int{44, 60, 80, 200} {
			for line := range strings.Lines(printed(t, b.Result, width, false)) {
				if n := utf8.RuneCountInString(strings.TrimRight(line, "\n")); n > width && name != "pulse" {
					t.Errorf("%s: a line of %d columns at width %d: %q", name, n, width, line)
				}
			}
		}
	}
}

func TestTerminalReadsTheSameWithoutColour(t *testing.T) {
	escapes := regexp.MustCompile("\x1b\\[[0-9;]*m")
	for name, b := range kinds() {
		plain, coloured := printed(t, b.Result, 80, false), printed(t, b.Result, 80, true)
		if strings.Contains(plain, "\x1b") {
			t.Errorf("%s: colour although none was asked for", name)
		}
		if !strings.Contains(coloured, "\x1b[") {
			t.Errorf("%s: no colour although it was asked for", name)
		}
		if escapes.ReplaceAllString(coloured, "") != plain {
			t.Errorf("%s: colour changes the words", name)
		}
	}
}
