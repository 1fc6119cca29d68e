package reports

import (
	"fmt"
	"io"
	"strings"
)

// Markdown writes the report as Markdown; the figure is left to its table of key points (FigureSVG draws it apart).
func Markdown(w io.Writer, r Report) error {
	d, err := r.build()
	if err != nil {
		return err
	}
	var b strings.Builder
	b.WriteString("# " + escaped(d.Title) + "\n\n" + escaped(d.Subtitle) + "\n")
	for _, s := range append(append([]section(nil), d.First...), d.Rest...) {
		if len(s.Blocks) > 0 {
			markdownSection(&b, s)
		}
	}
	_, err = io.WriteString(w, b.String())
	return err
}

func markdownSection(b *strings.Builder, s section) {
	b.WriteString("\n## " + escaped(s.Title) + "\n")
	for _, x := range s.Blocks {
		switch {
		case x.Para != nil:
			b.WriteString("\n" + joinLabel(x.Para.Label, x.Para.Text) + "\n")
		case x.Facts != nil:
			b.WriteString("\n")
			for _, f := range x.Facts {
				b.WriteString("- " + joinLabel(f.Name+":", f.Text) + "\n")
			}
		case x.List != nil:
			b.WriteString("\n")
			for i, item := range x.List.Items {
				mark := "- "
				if x.List.Ordered {
					mark = fmt.Sprintf("%d. ", i+1)
				}
				b.WriteString(mark + opening(item) + "\n")
			}
		case x.Table != nil:
			markdownTable(b, *x.Table)
		}
	}
}

func joinLabel(label, text string) string {
	switch {
	case label == "":
		return opening(text)
	case text == "":
		return "**" + escaped(label) + "**"
	}
	return "**" + escaped(label) + "** " + escaped(text)
}

func markdownTable(b *strings.Builder, t table) {
	b.WriteString("\n*" + escaped(t.Caption) + "*\n\n")
	heads := cells(t.Heads...)
	markdownRow(b, heads)
	for i := range t.Heads {
		if i < len(t.Numeric) && t.Numeric[i] {
			b.WriteString("| ---: ")
		} else {
			b.WriteString("| --- ")
		}
	}
	b.WriteString("|\n")
	for _, row := range t.Rows {
		markdownRow(b, row)
	}
	if t.Foot != nil {
		markdownRow(b, t.Foot)
	}
}

func markdownRow(b *strings.Builder, row []entry) {
	for _, c := range row {
		text := escaped(c.Text)
		if c.Tone != neutral && text != "" {
			text = "**" + text + "**"
		}
		b.WriteString("| " + text + " ")
	}
	b.WriteString("|\n")
}

// escaped makes a text harmless: entities for markup characters of HTML and for the pipe, a backslash before what
// Markdown may read as its own.
func escaped(text string) string {
	var b strings.Builder
	word := strings.ReplaceAll(plain(text), "www.", "www\u2024")
	for i, r := range word {
		switch {
		case r == '<':
			b.WriteString("&lt;")
		case r == '>':
			b.WriteString("&gt;")
		case r == '&':
			b.WriteString("&amp;")
		case r == '|':
			b.WriteString("&#124;")
		case strings.ContainsRune("\\`*_[]~$", r):
			b.WriteString("\\" + string(r))
		case r == ':' && strings.HasPrefix(word[i:], "://"):
			b.WriteString("&#58;")
		case r == '\u2024':
			b.WriteString("&#46;")
		case r == '@':
			b.WriteString("&#64;")
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// opening escapes a text that begins a block: a mark that would start a heading, list, quote or rule is kept
// from it by a backslash.
func opening(text string) string {
	out := escaped(text)
	head := strings.TrimLeft(out, "0123456789")
	if head != "" && strings.ContainsRune("#+-=.)", rune(head[0])) {
		return out[:len(out)-len(head)] + "\\" + head
	}
	return out
}
