package reports

import (
	"bytes"
	_ "embed" // the page template
	"html/template"
	"io"
	"regexp"
	"strings"
)

//go:embed report.html.tmpl
var pageText string

var page = template.Must(template.New("report").Funcs(template.FuncMap{
	"plain":   tied,
	"numeric": isNumeric,
	"titled":  isTitled,
	"wide":    func(t *table) bool { return len(t.Heads) > 3 },
	"class":   classOf,
	"drawing": func(svg string) template.HTML { return template.HTML(svg) }, // ours: drawn here, every text in it escaped
}).Parse(pageText))

var unitGap = regexp.MustCompile(`(\d) (%|dB|bit|min|h|[pnµmkMG]?(?:V|A|Ω|F|H|s|Hz|W|J|C|V/ns|V/µs))([\s,.;:()]|$)`)

// tied is plain with numbers tied to their units, so that no line breaks between them.
func tied(text string) string { return unitGap.ReplaceAllString(plain(text), "$1\u00a0$2$3") }

func isNumeric(t *table, i int) bool { return i < len(t.Numeric) && t.Numeric[i] }

func isTitled(t *table) bool { return strings.Join(t.Heads, "") != "" }

// classOf gives the style classes of a cell.
func classOf(t *table, i int, c entry) string {
	class := string(c.Tone)
	if isNumeric(t, i) {
		class = strings.TrimSpace("number " + class)
	}
	return class
}

// HTML writes the report as one HTML file that loads nothing, prints on A4 and reads on a phone.
func HTML(w io.Writer, r Report) error {
	d, err := r.build()
	if err != nil {
		return err
	}
	var b bytes.Buffer
	if err := page.Execute(&b, d); err != nil {
		return err
	}
	_, err = w.Write(b.Bytes())
	return err
}
