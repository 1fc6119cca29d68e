package reports

import (
	"fmt"
	"io"
	"strconv"
	"strings"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Keys prints what case keys mean: a table of several, a single one in full.
func Keys(w io.Writer, keys []measure.Key, style Style) error {
	s := newScreen(style)
	if len(keys) == 1 {
		writeKey(s, keys[0])
		return s.write(w)
	}
	var rows [][]entry
	for _, k := range keys {
		rows = append(rows, []entry{{Text: k.Path}, {Text: kindWords(k)}, {Text: k.Help}})
	}
	s.grid([]column{{title: "key", width: 32}, {title: "takes", width: 14}, {title: "what it is"}}, rows)
	s.say(neutral, "One key in full: drivemend keys NAME.")
	return s.write(w)
}

func writeKey(s *screen, k measure.Key) {
	s.line(strong, k.Path)
	s.item(strong, "what", k.Help)
	s.item(strong, "takes", kindWords(k))
	if k.Min != k.Max {
		s.item(strong, "range", quantity.Format(k.Min, k.Unit)+" to "+quantity.Format(k.Max, k.Unit))
	}
	if len(k.Words) > 0 {
		s.item(strong, "words", strings.Join(k.Words, ", "))
	}
	for _, t := range k.Typical {
		s.item(strong, "typical", typicalWords(t))
	}
	if len(k.Users) > 0 {
		s.item(strong, "used by", strings.Join(k.Users, ", "))
	}
	if k.Required {
		s.item(mandatory, "must", "has to be stated")
	}
}

func kindWords(k measure.Key) string {
	if k.Kind == measure.KindQuantity && k.Unit == quantity.Any {
		return "number in the unit of the reading"
	}
	if k.Kind == measure.KindQuantity {
		return "number in " + string(k.Unit)
	}
	return string(k.Kind)
}

// Shelf prints the cases of a folder, one line each.
func Shelf(w io.Writer, cases []ShelfCase, style Style) error {
	s := newScreen(style)
	var rows [][]entry
	for _, c := range cases {
		rows = append(rows, shelfRow(c))
	}
	s.grid([]column{{title: "case", width: 28}, {title: "answers", width: 7, right: true}, {title: "leading cause"}, {title: "chance", width: 6, right: true}, {title: "outcome", width: 12}}, rows)
	s.line(neutral, count(len(cases), "case", "cases")+".")
	return s.write(w)
}

func shelfRow(c ShelfCase) []entry {
	if c.Case == nil {
		return []entry{{Text: c.File}, {}, {c.Problem, danger}}
	}
	row := []entry{{Text: c.Case.ID}, {Text: strconv.Itoa(answered(c.Case))}, {Text: "not ranked"}, {Text: "-"}, {Text: "open"}}
	if c.Problem != "" {
		row[2] = entry{c.Problem, danger}
	}
	if c.Ranking != nil && len(c.Ranking.Causes) > 0 {
		row[2].Text, row[3].Text = c.Ranking.Causes[0].Title, percent(c.Ranking.Causes[0].Probability)
	}
	if o := c.Case.Outcome; o != nil {
		row[4].Text = "closed"
		if o.ConfirmedBy != "" {
			row[4].Text = confirmedWords(c.Case, time.Time{})
		}
	}
	return row
}

func answered(c *measure.Case) int {
	n := 0
	for i, o := range c.Observations {
		if o.Answer == "" && !c.Superseded(i) {
			n++
		}
	}
	return n
}

// Demo prints the end of the demonstration: the ranking, the margin, the report's path, the one next command.
func Demo(w io.Writer, d DemoSummary, style Style) error {
	s := newScreen(style)
	s.ends(strong, d.Case.ID, boardLine(d.Case.Board), answers(d.Case))
	writeLayers(s, d.Ranking, Beside{Outside: d.Outside})
	if text := (Beside{Outside: d.Outside}).note(d.Ranking.Findings); text != "" {
		s.say(caution, text)
	}
	if m := d.Margin; m != nil && m.AsFound != nil && m.Rebuild != nil {
		s.hang(verdictTone(m.Rebuild.Verdict), "MARGIN  ", fmt.Sprintf("99.9th percentile %s as found (%s), %s rebuilt with all its changes (%s), rated %s",
			volts(m.AsFound.P999.Peak), m.AsFound.Verdict, volts(m.Rebuild.P999.Peak), m.Rebuild.Verdict, volts(m.Rebuild.Rated)))
	}
	s.item(strong, "report", d.Report)
	s.item(mandatory, "try next", d.Command)
	return s.write(w)
}

func typicalWords(t measure.Typical) string {
	text := t.Text
	if t.For != "" {
		text += " (" + t.For + ")"
	}
	if t.Source != "" {
		text += ", " + t.Source
	}
	return text
}
