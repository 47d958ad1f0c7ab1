package report

import (
	_ "embed"
	"errors"
	"fmt"
	"html/template"
	"io"

	"nullmark/extract/result"
)

//go:embed page.css
var style string

//go:embed page.html
var layout string

// HTML writes the page of a finished run: answer, tables, pictures, then
// conventions, resolutions, warnings and provenance. Parts for which the
// bundle has no data are left out; b.Series may be nil. The same bundle gives
// the same bytes. It returns an error when b holds no result or w fails; b is
// not modified.
func HTML(w io.Writer, b *result.Bundle) error {
	if b == nil || b.Result == nil {
		return errors.New("report: there is no result to write a page about")
	}
	t, err := template.New("page").Funcs(template.FuncMap{"style": func() template.CSS { return template.CSS(style) }}).Parse(layout)
	if err != nil {
		return fmt.Errorf("report: page template: %w", err)
	}
	if err := t.Execute(w, view(b)); err != nil {
		return fmt.Errorf("report: writing the page: %w", err)
	}
	return nil
}
