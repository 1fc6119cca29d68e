package measure

import (
	"fmt"
	"strings"
)

// belongs says in words what may stand under a key.
func belongs(k Key) string {
	what := map[Kind]string{KindText: "text", KindTime: "a time with its offset, as 2026-12-01T09:40:00+01:00", KindDate: "a day, as 2026-12-01",
		KindMap: "a group of keys", KindNamed: "a group whose keys are names of your own", KindName: "one word without blanks",
		KindReading: "what the instrument showed: 0.4 Ω, OL, above 20 MΩ, shorted"}[k.Kind]
	switch k.Kind {
	case KindQuantity, KindRatio, KindCount:
		what = expected(k)
	case KindWord, KindYesNo:
		what = either(k.Words)
	case KindList:
		if what = "a list of names"; hasItems(k) {
			what = "a list of entries"
		}
	}
	if k.Form != nil {
		what = k.Form.Said
	}
	if k.MayBeUnknown {
		what += ", or " + unknown
	}
	return what
}

// typicals gives what is taken where a case is silent, with where it comes from.
func typicals(k Key) []string {
	var out []string
	for _, t := range k.Typical {
		text := t.Text + " (" + t.Source + ")"
		if t.For != "" {
			text = t.For + ": " + text
		}
		out = append(out, text)
	}
	return out
}

// describeKey tells all the table knows of a key, a line for each thing.
func describeKey(k Key) string {
	lines := []string{k.Help, "Write: " + belongs(k) + "."}
	if t := typicals(k); t != nil {
		lines = append(lines, "Typical: "+strings.Join(t, "; ")+".")
	}
	if k.Users != nil {
		lines = append(lines, "Used by: "+some(k.Users)+".")
	}
	return strings.Join(lines, "\n")
}

// KeyPage gives the documentation of every key of a case file as Markdown, made from the key table: a heading for each
// group, a row for each key. The bytes are the same every time.
func KeyPage() []byte {
	var b strings.Builder
	b.WriteString("# Keys of a case file\n\n" +
		"A case file is YAML; what a key holds is written behind it. A number carries its unit: `310 V`, `4k7`, `120 nH ±20 %`,\n" +
		"`4 kΩ to 6 kΩ`. A bare number is for counts and ratios only. `*` stands for a name of your own, `[]` for each entry of a\n" +
		"list. Every key may be left out unless it says required.\n")
	group := "-"
	for _, k := range Keys() {
		if g := groupOf(k); g != group {
			group = g
			heading(&b, g)
		}
		fmt.Fprintf(&b, "| `%s` | %s | %s | %s | %s |\n", k.Path, cell(said(k)), cell(k.Help), cell(strings.Join(typicals(k), "; ")), cell(some(k.Users)))
	}
	return []byte(b.String())
}

// heading begins the table of a group.
func heading(b *strings.Builder, group string) {
	name, help := "the case", "what stands at the top of the file"
	if k, ok := LookupKey(group); ok {
		name, help = group, k.Help
	}
	fmt.Fprintf(b, "\n## %s\n\n%s\n\n| key | write | meaning | typical, where silent | used by |\n| --- | --- | --- | --- | --- |\n", name, help)
}

// groupOf gives the heading a key stands under: its section, within board, rebuild and safety its group; "" at the top.
func groupOf(k Key) string {
	parts := strings.Split(strings.ReplaceAll(k.Path, "[]", ""), ".")
	deep := parts[0] == "board" || parts[0] == "rebuild" || parts[0] == "safety"
	switch {
	case deep && len(parts) > 2, deep && len(parts) == 2 && holdsKeys(strings.Join(parts, ".")):
		return strings.Join(parts[:2], ".")
	case len(parts) > 1, holdsKeys(parts[0]):
		return parts[0]
	}
	return ""
}

// holdsKeys tells whether a key is a group, or a list of entries.
func holdsKeys(path string) bool {
	k, ok := LookupKey(path)
	return ok && (k.Kind == KindMap || k.Kind == KindNamed || k.Kind == KindList && hasItems(k))
}

// said tells what belongs under a key, for one that is a copy of another where to look.
func said(k Key) string {
	if at := original(k.Path); at != "" {
		return "as " + at
	}
	if k.Required {
		return belongs(k) + "; required"
	}
	return belongs(k)
}

// cell makes a text fit a cell of a table.
func cell(text string) string { return strings.ReplaceAll(text, "|", `\|`) }
