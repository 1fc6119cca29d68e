package reports

import (
	"slices"
	"strconv"
	"strings"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// earlierRepairs are the repairs before this case, part by part.
func (r Report) earlierRepairs() section {
	s := section{ID: "repairs", Title: "Earlier repairs"}
	t := table{Caption: "What was done to this board before, part by part", Heads: []string{"Part", "Position", "Day", "By", "Work", "Was", "Fitted", "Because", "Note"}, Numeric: make([]bool, 9)}
	for _, x := range r.Case.Repairs {
		done := ""
		if !x.Done.IsZero() {
			done = day(x.Done)
		}
		t.Rows = append(t.Rows, cells(x.Part, x.Position, done, r.who(x.By), x.Work, x.Was, x.Fitted, x.Because, x.Note))
	}
	s.tabulateAny(t)
	return s
}

// earlierWords names the parts of earlier repairs in a line: "Q2 replaced, R14 bridged".
func earlierWords(repairs []measure.Repair) string {
	var parts []string
	for _, x := range repairs {
		parts = append(parts, joined(" ", x.Part, x.Work))
	}
	return someOf(parts, 4, ", ")
}

// who names a person unless the report leaves out who.
func (r Report) who(name string) string {
	if r.Private {
		return ""
	}
	return name
}

// tabulateAny adds a table with rows, without its empty columns.
func (s *section) tabulateAny(t table) {
	if len(t.Rows) > 0 {
		s.tabulate(t.withoutEmptyColumns())
	}
}

// asFound is what the board itself remembers: its fault memory and its settings.
func (r Report) asFound() section {
	s := section{ID: "as-found", Title: "Fault memory and settings as found"}
	log := table{Caption: "The board's own fault memory; its times are the board's clock or hours", Heads: []string{"Code", "What it says", "Count", "When", "Note"}, Numeric: []bool{false, false, true, false, false}}
	for _, f := range r.Case.FaultLog {
		log.Rows = append(log.Rows, cells(f.Code, f.Text, countOr(f.Count), f.At, f.Note))
	}
	s.tabulateAny(log)
	settings := table{Caption: "Settings of the drive as found", Heads: []string{"Setting", "Value", "Note"}, Numeric: make([]bool, 3)}
	for _, x := range r.Case.Settings {
		settings.Rows = append(settings.Rows, cells(x.Name, x.Value, x.Note))
	}
	s.tabulateAny(settings)
	return s
}

func countOr(n int) string {
	if n == 0 {
		return ""
	}
	return quantity.Format(float64(n), quantity.Count)
}

// files are the pictures and the instrument files of the case; none of them is part of the report.
func (r Report) files() section {
	s := section{ID: "files", Title: "Photographs and captures"}
	var pictures, captures []string
	for _, p := range r.Case.Photographs {
		pictures = append(pictures, pictureWords(p))
	}
	for _, c := range r.Case.Captures {
		captures = append(captures, captureWords(c))
	}
	if len(pictures)+len(captures) > 0 {
		s.say(neutral, "", "The files stay where they are; paths are given from the case file. A sum tells whether a file is still the same; its first "+strconv.Itoa(shortSum)+" digits stand here, all of them in the JSON form of this report.")
	}
	if len(pictures) > 0 {
		s.say(neutral, "Photographs.", "")
		s.enumerate(false, pictures...)
	}
	if len(captures) > 0 {
		s.say(neutral, "Captures.", "")
		s.enumerate(false, captures...)
	}
	return s
}

func pictureWords(p measure.Photograph) string {
	return p.Path + ": " + joined("; ", p.Shows, p.Part, momentOr(p.At), fileWords(p.Bytes, p.SHA256))
}

func captureWords(c measure.Capture) string {
	var figures []string
	for key, q := range c.Figures {
		figures = append(figures, strings.ReplaceAll(key, "_", " ")+" "+readingOr(q))
	}
	slices.Sort(figures)
	return c.Name + ": " + joined("; ", joined(", ", c.Kind, c.Position, c.Edge), momentOr(c.At), strings.Join(figures, ", "), c.Note, fileWords(c.Bytes, c.SHA256))
}

// shortSum is how many hexadecimal digits of a sum are printed: enough to tell the files of a job apart.
const shortSum = 12

func fileWords(bytes int64, sum string) string {
	size := ""
	if bytes > 0 {
		size = count(int(bytes), "byte", "bytes")
	}
	if sum != "" {
		sum = "SHA-256 " + sum[:min(len(sum), shortSum)]
	} else {
		sum = "no sum on record"
	}
	return joined(", ", size, sum)
}

// joined joins the texts that say something.
func joined(between string, texts ...string) string {
	return strings.Join(slices.DeleteFunc(texts, func(t string) bool { return t == "" }), between)
}

func momentOr(t time.Time) string {
	if t.IsZero() {
		return ""
	}
	return moment(t)
}
