package measure

import (
	"fmt"
	"sort"
	"strings"
	"unicode"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// edit puts a text in the place of some bytes.
type edit struct {
	from, to int
	text     string
}

// applied gives the bytes with edits made; they do not overlap.
func applied(raw []byte, edits []edit) []byte {
	sort.SliceStable(edits, func(i, j int) bool { return edits[i].from < edits[j].from })
	var out []byte
	at := 0
	for _, e := range edits {
		out = append(out, raw[at:e.from]...)
		out = append(out, e.text...)
		at = e.to
	}
	return append(out, raw[at:]...)
}

// content is what is to be written under a key: on the key's own line in { } and [ ], or in lines below it.
type content struct {
	text  func(flow bool) string // one value
	key   string                 // a map with this one key
	under *content
	item  string // a list with this one entry, in flow style
}

// value is the content of one word or text.
func value(text string) *content {
	return &content{text: func(flow bool) string { return scalar(text, flow) }}
}

// flow gives the content as it stands inside { } or on one line.
func (c *content) flow() string { return c.oneLine(true) }

// oneLine gives the content on one line.
func (c *content) oneLine(flow bool) string {
	switch {
	case c.text != nil:
		return c.text(flow)
	case c.under != nil:
		return "{" + c.key + ": " + c.under.flow() + "}"
	}
	return "[" + c.item + "]"
}

// lined tells whether the content is better written in lines of its own: a list of entries, which grows.
func (c *content) lined() bool { return c.item != "" || c.under != nil && c.under.lined() }

// block gives what follows the colon of a key in block style. The key's own indentation is given.
func (c *content) block(indent int, style *style) string {
	if !c.lined() {
		return " " + c.oneLine(false)
	}
	start := style.lineEnd + strings.Repeat(" ", indent+style.step)
	if c.item != "" {
		return start + "- " + c.item
	}
	return start + c.key + ":" + c.under.block(indent+style.step, style)
}

// style is how the file is written.
type style struct {
	lineEnd string
	step    int // blanks a level is indented by
}

// styleOf finds out how a file is written: its line ends and the indentation of its first nested map.
func styleOf(s *source, root *yaml.Node) *style {
	st := &style{lineEnd: s.ending(), step: 2}
	for i := 1; i < len(root.Content); i += 2 {
		n := root.Content[i]
		if n.Kind == yaml.MappingNode && n.Style&yaml.FlowStyle == 0 && n.Column > root.Column {
			st.step = n.Column - root.Column
			break
		}
	}
	return st
}

// editor plans edits of one file.
type editor struct {
	*source
	*style
}

// pair finds a key of a map; nil when it is not there.
func pair(m *yaml.Node, name string) (key, value *yaml.Node) {
	for i := 0; i+1 < len(m.Content); i += 2 {
		if m.Content[i].Value == name {
			return m.Content[i], m.Content[i+1]
		}
	}
	return nil, nil
}

// isFlow tells whether a map or list is written with brackets.
func isFlow(n *yaml.Node) bool { return n.Style&yaml.FlowStyle != 0 }

// set plans the edits that put a content under a path below a map. A list content is added to the list there.
func (e *editor) set(m *yaml.Node, path []string, c *content) []edit {
	key, old := pair(m, path[0])
	if key == nil {
		return e.insert(m, path[0], nest(path[1:], c))
	}
	if len(path) > 1 {
		switch {
		case old.Kind == yaml.MappingNode:
			return e.set(old, path[1:], c)
		case empty(old):
			return e.replace(m, key, old, nest(path[1:], c))
		}
		return e.condition(old, path[1], c) // a plain value gets its first condition
	}
	if c.item != "" && old.Kind == yaml.SequenceNode {
		return e.add(m, key, old, c)
	}
	return e.replace(m, key, old, c)
}

// nest wraps a content into maps.
func nest(path []string, c *content) *content {
	for i := len(path) - 1; i >= 0; i-- {
		c = &content{key: path[i], under: c}
	}
	return c
}

// condition turns a plain value into {value: ..., condition: ...}.
func (e *editor) condition(old *yaml.Node, name string, c *content) []edit {
	return []edit{
		{e.begin(old), e.end(old), "{value: " + scalar(old.Value, true) + ", " + name + ": " + c.flow() + "}"},
	}
}

// insert plans a new key at the end of a map.
func (e *editor) insert(m *yaml.Node, name string, c *content) []edit {
	if isFlow(m) {
		return []edit{e.insertFlow(m, name+": "+c.flow())}
	}
	indent := m.Column - 1
	return []edit{e.lineAfter(e.end(m), strings.Repeat(" ", indent)+name+":"+c.block(indent, e.style))}
}

// insertFlow plans a new entry before the closing bracket of a map or list.
func (e *editor) insertFlow(n *yaml.Node, text string) edit {
	if len(n.Content) == 0 {
		at := e.begin(n) + 1
		return edit{at, at, text}
	}
	last := n.Content[len(n.Content)-1]
	at := e.end(last)
	if n.Kind == yaml.MappingNode {
		at = max(at, e.afterColon(n.Content[len(n.Content)-2]))
	}
	return edit{at, at, ", " + text}
}

// lineAfter plans a new line below the one that holds an offset.
func (e *editor) lineAfter(at int, text string) edit {
	end := e.endOfLine(at)
	if end == len(e.raw) {
		return edit{end, end, e.lineEnd + text + e.lineEnd}
	}
	next := e.nextLine(end)
	return edit{next, next, text + e.lineEnd}
}

// replace plans another content for a key that is there. Bytes before the value stay where that is possible.
func (e *editor) replace(m, key, old *yaml.Node, c *content) []edit {
	colon := e.afterColon(key)
	from, to := e.begin(old), e.end(old)
	if empty(old) && old.Value == "" {
		from, to = colon, colon
	}
	switch {
	case isFlow(m):
		return []edit{{from, to, e.gap(from, c.flow())}}
	case empty(old) && c.lined():
		edits := []edit{e.lineAfter(max(colon, to), strings.TrimPrefix(c.block(m.Column-1, e.style), e.lineEnd))}
		if to > from {
			edits = append(edits, edit{colon, to, ""})
		}
		return edits
	case old.Kind != yaml.ScalarNode && !isFlow(old), from == colon:
		return []edit{{colon, to, " " + c.oneLine(false)}}
	}
	return []edit{{from, to, c.oneLine(false)}}
}

// gap puts a blank before a text that would otherwise touch the colon.
func (e *editor) gap(at int, text string) string {
	if at > 0 && e.raw[at-1] == ':' {
		return " " + text
	}
	return text
}

// add plans a new entry at the end of a list.
func (e *editor) add(m, key, old *yaml.Node, c *content) []edit {
	switch {
	case !isFlow(old):
		dash := old.Column
		blanks := 1
		if last := old.Content[len(old.Content)-1]; last.Line == old.Line && last.Column > dash+1 && last.Column < dash+9 {
			blanks = last.Column - dash - 1
		}
		text := strings.Repeat(" ", dash-1) + "-" + strings.Repeat(" ", blanks) + c.item
		return []edit{e.lineAfter(e.end(old), text)}
	case len(old.Content) > 0 || isFlow(m) || !e.alone(old):
		return []edit{e.insertFlow(old, c.item)}
	}
	colon, end := e.afterColon(key), e.end(old)
	below := strings.TrimPrefix(c.block(m.Column-1, e.style), e.lineEnd)
	return []edit{{colon, end, ""}, e.lineAfter(end, below)}
}

// alone tells whether an empty list [ ] ends its line, comments apart, and begins on it.
func (e *editor) alone(n *yaml.Node) bool {
	end := e.end(n)
	rest := strings.TrimSpace(e.between(end, e.endOfLine(end)))
	return e.lineOf(end-1) == n.Line && (rest == "" || rest[0] == '#')
}

// remove plans taking a key of a map out.
func (e *editor) remove(m, key, old *yaml.Node) []edit {
	from, to := e.begin(key), max(e.end(old), e.afterColon(key))
	if !isFlow(m) {
		line := e.lines[key.Line-1]
		if strings.TrimSpace(e.between(line, from)) != "" {
			return []edit{{from, to, ""}} // the key shares its line with the dash of a list
		}
		return []edit{{line, e.nextLine(e.endOfLine(to)), ""}}
	}
	for after := to; after < len(e.raw); after++ {
		if e.raw[after] == ',' {
			to = after + 1
			for to < len(e.raw) && e.raw[to] == ' ' {
				to++
			}
			return []edit{{from, to, ""}}
		}
		if !isBlank(rune(e.raw[after])) {
			break
		}
	}
	for before := from; before > 0; before-- {
		if e.raw[before-1] == ',' {
			return []edit{{before - 1, to, ""}}
		}
		if !isBlank(rune(e.raw[before-1])) {
			break
		}
	}
	return []edit{{from, to, ""}}
}

// scalar writes a text so that YAML reads it back as it is: plain where that works, else quoted.
func scalar(text string, flow bool) string {
	if plainWorks(text, flow) {
		return text
	}
	if !utf8.ValidString(text) || strings.IndexFunc(text, func(r rune) bool { return !unicode.IsPrint(r) && r != '\u00a0' && r != '\u202f' }) < 0 {
		return "'" + strings.ReplaceAll(text, "'", "''") + "'"
	}
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range text {
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r == '\n':
			b.WriteString(`\n`)
		case r == '\t':
			b.WriteString(`\t`)
		case unicode.IsPrint(r):
			b.WriteRune(r)
		case r > 0xFFFF:
			fmt.Fprintf(&b, `\U%08X`, r)
		default:
			fmt.Fprintf(&b, `\u%04X`, r)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// plainWorks tells whether YAML reads a text back unquoted.
func plainWorks(text string, flow bool) bool {
	if text == "" || text != strings.TrimSpace(text) || strings.ContainsAny(text, "\r\n") || text[0] == '%' {
		return false
	}
	if checkText([]byte(text)) != nil || strings.HasPrefix(text, byteOrderMark) {
		return false
	}
	line := "k: " + text
	if flow {
		line = "{k: " + text + ", l: 1}"
	}
	doc, err := decode([]byte(line))
	if err != nil || len(doc.Content) == 0 || doc.Content[0].Kind != yaml.MappingNode {
		return false
	}
	m := doc.Content[0]
	n := m.Content[1]
	wanted := 2
	if flow {
		wanted = 4
	}
	return len(m.Content) == wanted && n.Kind == yaml.ScalarNode && n.Style == 0 && n.Value == text && n.Anchor == "" &&
		n.Tag != "!!null" && n.Tag != "!!merge"
}
