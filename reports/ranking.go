package reports

import (
	"fmt"
	"io"
	"math"
	"sort"
	"strconv"
	"strings"

	"drivemend/diagnose"
	"drivemend/measure"
)

// How many lines of a layer a screen of 24 lines has room for, and the chance below which a line is not worth one.
const (
	shownFaults, shownStresses, shownCauses = 4, 3, 5
	worthALine                              = 0.02
)

// Ranking prints the three layers, what is broken, what killed it, what let that happen, on one 80×24 screen.
// Findings taken outside a hold point carry an asterisk.
func Ranking(w io.Writer, c *measure.Case, r *diagnose.Ranking, style Style, beside ...Beside) error {
	s, known := newScreen(style), besides(beside).of(c)
	s.ends(strong, c.ID, boardLine(c.Board), answers(c))
	numbers := writeLayers(s, r, known)
	writeDoubts(s, c, r, known, func(id string) string {
		if n, ok := numbers[id]; ok {
			return strconv.Itoa(n)
		}
		return titleOf(r, id)
	})
	s.say(neutral, beliefShort)
	return s.write(w)
}

// answers counts what was answered and what was put off: "14 answers, 2 skipped".
func answers(c *measure.Case) string {
	given, put := 0, 0
	for i, o := range c.Observations {
		switch {
		case c.Superseded(i):
		case o.Answer != "":
			put++
		default:
			given++
		}
	}
	text := count(given, "answer", "answers")
	if put > 0 {
		text += fmt.Sprintf(", %d skipped", put)
	}
	return text
}

// writeLayers numbers the lines through all three layers and gives back each line's number.
func writeLayers(s *screen, r *diagnose.Ranking, known Beside) map[string]int {
	numbers := map[string]int{}
	layer := func(word, what, note string, lines []diagnose.Line, most int) {
		lines, more := topLines(lines, most)
		if more > 0 && word != "STRESS" {
			what += fmt.Sprintf(" (%d of %d ≥ %s)", len(lines), len(lines)+more, percent(worthALine))
		}
		s.layerHead(word, what, note)
		for _, l := range lines {
			numbers[l.ID] = len(numbers) + 1
			s.rankLine(r, l, numbers[l.ID], known)
		}
		if len(lines) == 0 {
			s.line(neutral, "  - nothing stands out")
		}
	}
	layer("FAULT ", "what is broken", "parts, %", r.Faults, shownFaults)
	layer("STRESS", "what killed it", "", r.Stresses, shownStresses)
	layer("CAUSE ", "what let that happen", "two can act together", r.Causes, shownCauses)
	s.add(rankColumns, []entry{{Text: "  -"}, {Text: "not in this rule base"}, {Text: percent(r.Unlisted)}, {Text: "from " + percent(r.UnlistedPrior)}})
	return numbers
}

const noteWidth = 24

var rankColumns = []column{{width: 3, right: true}, {}, {width: 6, right: true}, {width: noteWidth}}

// layerHead writes the heading of a layer over its columns.
func (s *screen) layerHead(word, what, note string) {
	if s.narrow(rankColumns) {
		s.head(word, what)
		return
	}
	cols := s.widths(rankColumns)
	left := cols[0].width + 1 + cols[1].width
	text := s.paint(strong, word) + "  " + pad(what, left-columns(word)-2) + " chance " + note
	s.WriteString(strings.TrimRight(text, " ") + "\n")
}

// rankLine writes one line of a layer; a second line under the asked one names the findings that weigh most.
func (s *screen) rankLine(r *diagnose.Ranking, l diagnose.Line, number int, known Beside) {
	title := s.widths(rankColumns)[1].width
	s.add(rankColumns, []entry{{Text: strconv.Itoa(number)}, {Text: short(plain(l.Title), title)},
		{percent(l.Probability), strong}, {Text: lineNote(r, l)}})
	if l.ID == r.About && len(r.Findings) > 0 {
		s.hang(neutral, "    dB: ", weightiest(r.Findings, 3, known))
	}
}

func lineNote(r *diagnose.Ranking, l diagnose.Line) string {
	if len(l.Parts) > 0 {
		return partNumbers(l.Parts, noteWidth)
	}
	note := l.Role
	if p, ok := priorOf(r, l.ID); ok {
		if note != "" {
			note += ", "
		}
		note += "from " + percent(p)
	}
	return note
}

// topLines gives the lines worth showing, and how many more reach the same chance.
func topLines(lines []diagnose.Line, most int) (top []diagnose.Line, more int) {
	for _, l := range lines {
		switch {
		case l.Probability < worthALine:
		case len(top) < most:
			top = append(top, l)
		default:
			more++
		}
	}
	return top, more
}

// weightiest names the findings of the largest weight: "The exact moment +6.8, Computed peak +2.8".
func weightiest(findings []diagnose.Finding, most int, known Beside) string {
	sorted := append([]diagnose.Finding(nil), findings...)
	sort.SliceStable(sorted, func(i, j int) bool { return math.Abs(sorted[i].Decibans) > math.Abs(sorted[j].Decibans) })
	var out []string
	for i, f := range sorted {
		if i == most {
			break
		}
		out = append(out, known.name(f)+" "+decibans(f.Decibans))
	}
	return strings.Join(out, "; ")
}

func findingName(f diagnose.Finding) string {
	if f.Test == nil {
		return "a test that is not known"
	}
	if p := place(f.Part, f.Position); p != "board" {
		return f.Test.Title + ", " + p
	}
	return f.Test.Title
}

// writeDoubts says which lines cannot be told apart, what the asked line leaves unexplained, and what did not count;
// name gives what a line is called on this screen.
func writeDoubts(s *screen, c *measure.Case, r *diagnose.Ranking, known Beside, name func(id string) string) {
	var groups []string
	for _, group := range r.Alike {
		var names []string
		for _, id := range group {
			names = append(names, name(id))
		}
		groups = append(groups, strings.Join(names, " from "))
	}
	if len(groups) > 0 {
		s.say(caution, "Cannot tell "+strings.Join(groups, "; nor ")+".")
	}
	if len(r.Unexplained) > 0 {
		var names []string
		for _, f := range r.Unexplained {
			names = append(names, known.name(f)+": "+known.shown(f)+" ("+decibans(f.Alone)+" dB)")
		}
		s.say(caution, "Speaks against "+name(r.About)+" by 3 dB or more: "+strings.Join(names, "; ")+".")
	}
	if text := known.note(r.Findings); text != "" {
		s.say(caution, text)
	}
	if text := unboundWords(c, r.Unbound); text != "" {
		s.say(neutral, "Not counted: "+text+".")
	}
}

// titleOf is the title of a line of the ranking, without its detail, to be named among others.
func titleOf(r *diagnose.Ranking, id string) string {
	if l, ok := lineOf(r, id); ok {
		return short(plain(l.Title), 40)
	}
	return id
}

func titlesOf(r *diagnose.Ranking, ids []string) []string {
	var out []string
	for _, id := range ids {
		out = append(out, titleOf(r, id))
	}
	return out
}

func aboutTitle(r *diagnose.Ranking) string {
	if l, ok := lineOf(r, r.About); ok {
		return l.Title
	}
	if r.About == "unlisted" {
		return "a cause that is not in this rule base"
	}
	return r.About
}

// unboundWords groups what was left out by its reason: "2 skipped (fan-turns, esr), 1 superseded …".
func unboundWords(c *measure.Case, unbound []diagnose.Unbound) string {
	var reasons []string
	by := map[string][]string{}
	for _, u := range unbound {
		if u.Observation < 0 || u.Observation >= len(c.Observations) {
			continue
		}
		if len(by[u.Why]) == 0 {
			reasons = append(reasons, u.Why)
		}
		by[u.Why] = append(by[u.Why], c.Observations[u.Observation].Test)
	}
	for i, why := range reasons {
		names := by[why]
		text := strings.Join(names, ", ")
		if len(names) > 3 {
			text = strings.Join(names[:3], ", ") + " and " + strconv.Itoa(len(names)-3) + " more"
		}
		reasons[i] = why + " (" + text + ")"
	}
	return strings.Join(reasons, "; ")
}
