package reports

// document is a report before it is set in one of the page formats. Every text in it is still as it came; the format
// makes it harmless. Its fields are open to the page template.
type document struct {
	Title, Subtitle string
	First           []section // the first page
	Rest            []section
}

// section is a titled run of blocks.
type section struct {
	ID, Title string
	Blocks    []block
}

// block is one of a paragraph, facts, a list, a table and a figure; exactly one member is set.
type block struct {
	Para   *paragraph
	Facts  []fact
	List   *listing
	Table  *table
	Figure *picture
}

type paragraph struct {
	Label string // set before the text in bold; carries the meaning of the tone in words
	Text  string
	Tone  tone
}

// fact is a name with what is known under it.
type fact struct{ Name, Text string }

// Long tells whether a fact takes the whole width of a page.
func (f fact) Long() bool { return columns(f.Text) > 40 }

type listing struct {
	Items   []string
	Ordered bool
}

type table struct {
	Caption string
	Heads   []string
	Numeric []bool // columns set flush right
	Rows    [][]entry
	Foot    []entry // a last row, such as a sum
}

// withoutEmptyColumns gives the table without the columns in which no row says anything.
func (t table) withoutEmptyColumns() table {
	out := table{Caption: t.Caption, Rows: make([][]entry, len(t.Rows))}
	for i, head := range t.Heads {
		used := i == 0
		for _, row := range t.Rows {
			used = used || row[i].Text != ""
		}
		if !used {
			continue
		}
		out.Heads, out.Numeric = append(out.Heads, head), append(out.Numeric, t.Numeric[i])
		for k, row := range t.Rows {
			out.Rows[k] = append(out.Rows[k], row[i])
		}
	}
	return out
}

// picture is a finished SVG, described within, with the words below it.
type picture struct{ SVG, Caption string }

func (s *section) say(t tone, label, text string) {
	s.Blocks = append(s.Blocks, block{Para: &paragraph{label, text, t}})
}

func (s *section) enumerate(ordered bool, items ...string) {
	if len(items) > 0 {
		s.Blocks = append(s.Blocks, block{List: &listing{items, ordered}})
	}
}

func (s *section) tabulate(t table) {
	s.Blocks = append(s.Blocks, block{Table: &t})
}

// cells makes a row of texts without tone.
func cells(texts ...string) []entry {
	row := make([]entry, len(texts))
	for i, t := range texts {
		row[i].Text = t
	}
	return row
}
