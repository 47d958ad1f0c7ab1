package verify

import (
	_ "embed"
	"html/template"
	"io"
	"math"
	"strconv"
)

//go:embed page.html
var layout string

// pageRow is a row as the page draws it; Bar is the length of the picture of its
// deviation in per cent of the width that stands for 1.
type pageRow struct {
	Row
	Cells []string // name, source, published, ours, bar, apart, verdict, seconds
	Bar   string
}

type pageGroup struct {
	Name string
	Rows []pageRow
}

// Page writes the outcome as one self-contained page: verdict, a table a group with
// a bar for each deviation, the sources in full. version names the build; it may
// be empty.
func (o *Outcome) Page(w io.Writer, version string) error {
	var data struct {
		Verdict, Legend, Version string
		Passed                   bool
		Groups                   []pageGroup
		Sources                  []Source
	}
	data.Verdict, data.Legend, data.Version, data.Passed = o.verdict(), legend, version, o.Passed
	told := map[string]bool{}
	for _, r := range o.Checks {
		if n := len(data.Groups); n == 0 || data.Groups[n-1].Name != r.Group {
			data.Groups = append(data.Groups, pageGroup{Name: r.Group})
		}
		g := &data.Groups[len(data.Groups)-1]
		row := pageRow{Row: r, Cells: r.cells()}
		if r.Deviation != nil {
			row.Bar = strconv.FormatFloat(100*math.Min(*r.Deviation, 1.25), 'f', 1, 64)
		}
		g.Rows = append(g.Rows, row)
		if !told[r.Source] {
			told[r.Source] = true
			data.Sources = append(data.Sources, Source{r.Source, r.Citation})
		}
	}
	return template.Must(template.New("page").Parse(layout)).Execute(w, data)
}
