package reports

import (
	"fmt"
	"io"
	"strings"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
)

// rule is one entry of the base as a list shows it.
type rule struct {
	kind      knowledge.Kind
	id, title string
	note      string
}

// rulesOf gives the entries of a kind in base order; of every kind for "".
func rulesOf(b *knowledge.Base, kind knowledge.Kind) []rule {
	var all []rule
	for _, c := range b.Causes {
		all = append(all, rule{knowledge.KindCause, c.ID, c.Title, c.Role})
	}
	for _, e := range b.Events {
		all = append(all, rule{knowledge.KindEvent, e.ID, e.Title, string(e.Layer)})
	}
	for _, t := range b.Tests {
		all = append(all, rule{knowledge.KindTest, t.ID, t.Title, testNote(t)})
	}
	for _, r := range b.Repairs {
		all = append(all, rule{knowledge.KindRepair, r.ID, r.Title, mins(r.Minutes)})
	}
	for _, c := range b.Cautions {
		all = append(all, rule{knowledge.KindCaution, c.ID, c.Text, "caution"})
	}
	for _, x := range b.Sources {
		all = append(all, rule{knowledge.KindSource, x.ID, x.Title, "source"})
	}
	var out []rule
	for _, r := range all {
		if kind == "" || r.kind == kind {
			out = append(out, r)
		}
	}
	return out
}

func testNote(t knowledge.Test) string {
	if t.Computed != "" {
		return "computed"
	}
	return t.Needs
}

// RulesList prints the entries of a kind, of every kind for "".
func RulesList(w io.Writer, b *knowledge.Base, kind knowledge.Kind, style Style) error {
	s := newScreen(style)
	var last knowledge.Kind
	for _, r := range rulesOf(b, kind) {
		if r.kind != last {
			s.head(strings.ToUpper(string(r.kind))+"S", "")
			last = r.kind
		}
		s.grid([]column{{width: 28}, {}, {width: 13}}, [][]entry{{{Text: r.id}, {Text: r.title}, {Text: r.note}}})
	}
	s.line(neutral, "Rule base "+hash(b)+". One entry in full: drivemend rules show ID.")
	return s.write(w)
}

// hash is the short form of the base's hash.
func hash(b *knowledge.Base) string {
	if len(b.Hash) > 12 {
		return b.Hash[:12]
	}
	return b.Hash
}

// RulesChecked prints what a checked base holds and what it lacks.
func RulesChecked(w io.Writer, b *knowledge.Base, lacks knowledge.Problems, style Style) error {
	s := newScreen(style)
	s.say(neutral, fmt.Sprintf("Rule base %s: %s, %s, %s, %s, %s, %s.", hash(b), count(len(b.Causes), "cause", "causes"), eventCounts(b),
		count(len(b.Tests), "test", "tests"), count(len(b.Repairs), "repair", "repairs"), count(len(b.Cautions), "caution", "cautions"), count(len(b.Sources), "source", "sources")))
	for _, p := range lacks {
		s.hang(caution, " ! ", p.String())
	}
	if len(lacks) == 0 {
		s.line(normal, "OK: it loads and lacks nothing.")
	} else {
		s.line(caution, "It loads and works; "+count(len(lacks), "thing is", "things are")+" missing above.")
	}
	return s.write(w)
}

func eventCounts(b *knowledge.Base) string {
	n := map[knowledge.Layer]int{}
	for _, e := range b.Events {
		n[e.Layer]++
	}
	return count(n[knowledge.Stress], "stress", "stresses") + ", " + count(n[knowledge.Fault], "fault", "faults") + ", " + count(n[knowledge.Sign], "sign", "signs")
}

// RulesShow prints one entry of the base in full. The error names the nearest id when there is none of that name.
func RulesShow(w io.Writer, b *knowledge.Base, id string, style Style) error {
	s := newScreen(style)
	switch {
	case b.Cause(id) != nil:
		writeCause(s, b, b.Cause(id))
	case b.Event(id) != nil:
		writeEvent(s, b, b.Event(id))
	case b.Test(id) != nil:
		writeTestRule(s, b, b.Test(id))
	case b.Repair(id) != nil:
		writeRepairRule(s, b.Repair(id))
	case b.Caution(id) != nil:
		c := b.Caution(id)
		s.ends(strong, id, "", "caution")
		s.item(strong, "text", c.Text)
		s.item(strong, "when", c.When)
		s.item(strong, "source", sourceWords(b, c.Source))
	case b.Source(id) != nil:
		x := b.Source(id)
		s.ends(strong, id, "", "source")
		s.item(strong, "title", x.Title)
		s.item(strong, "where", x.Where)
		s.item(strong, "read", x.Read)
	default:
		return fmt.Errorf("the rule base has nothing called %q%s; all ids: drivemend rules list", plain(id), nearest(b, id))
	}
	return s.write(w)
}

func nearest(b *knowledge.Base, id string) string {
	var near []string
	for _, k := range []knowledge.Kind{knowledge.KindCause, knowledge.KindEvent, knowledge.KindTest, knowledge.KindRepair, knowledge.KindCaution, knowledge.KindSource} {
		if n := b.Nearest(k, id); n != "" {
			near = append(near, n)
		}
	}
	if len(near) == 0 {
		return ""
	}
	return "; near to it: " + strings.Join(near, ", ")
}

func sourceWords(b *knowledge.Base, id string) string {
	if x := b.Source(id); x != nil {
		return x.Title + " (" + x.Read + ")"
	}
	return id
}

func writeCause(s *screen, b *knowledge.Base, c *knowledge.Cause) {
	s.ends(strong, c.ID, c.Title, c.Role+" cause")
	for _, set := range knowledge.Settings() {
		if band, ok := c.Share[set]; ok {
			s.item(strong, "share", set+" "+bandWords(band))
		}
	}
	writeLinks(s, b, c.LeadsTo)
	for _, t := range b.Tests {
		if row, ok := c.Answers[t.ID]; ok {
			s.item(strong, "answers", t.ID+": "+rowWords(t, row))
		}
	}
	s.item(strong, "repair", c.Repair)
	s.item(strong, "note", c.Note)
	s.item(strong, "file", fmt.Sprintf("%s:%d", c.File, c.Line))
}

func writeEvent(s *screen, b *knowledge.Base, e *knowledge.Event) {
	s.ends(strong, e.ID, e.Title, string(e.Layer))
	if e.Of != "" {
		s.item(strong, "of", e.Of+": sits in one or more of the parts")
	}
	s.item(strong, "leak", bandWords(e.Leak)+" without any listed parent")
	writeLinks(s, b, e.LeadsTo)
	s.item(strong, "repair", e.Repair)
	s.item(strong, "note", e.Note)
	s.item(strong, "file", fmt.Sprintf("%s:%d", e.File, e.Line))
}

func writeLinks(s *screen, b *knowledge.Base, links []knowledge.Link) {
	for _, l := range links {
		title := l.To
		if e := b.Event(l.To); e != nil {
			title += " (" + e.Title + ")"
		}
		s.item(strong, "leads to", title+" "+bandWords(l.P))
	}
}

// standsBehind says which hold points keep a test, so that its how is not read as leave to do it.
func standsBehind(t *knowledge.Test) string {
	w := diagnose.WorkOf(t)
	switch {
	case t.Computed != "" || w.Need == safety.NeedQuestion:
		return ""
	case w.Need.Powered():
		return "hold points 2 to 4: drivemend next gives it, and the session, once their conditions are kept"
	}
	return "hold points 0 to 2 and those of its instrument: drivemend next gives it, and the session, once they are kept"
}

// staticWords says which results every position has to show before power.
func staticWords(t *knowledge.Test) string {
	if len(t.Static) == 0 {
		return ""
	}
	return "every position passes it before power: " + strings.Join(t.Static, " or ")
}

func writeTestRule(s *screen, b *knowledge.Base, t *knowledge.Test) {
	s.ends(strong, t.ID, t.Title, testNote(*t)+", "+mins(t.Minutes))
	s.item(strong, "ask", t.Ask)
	s.item(strong, "how", t.How)
	s.item(strong, "behind", standsBehind(t))
	s.item(strong, "static", staticWords(t))
	s.item(strong, "observes", t.Observes)
	s.item(strong, "pattern of", t.PatternOf)
	s.item(strong, "computed", t.Computed)
	s.item(strong, "replaced by", t.ReplacedBy)
	for _, r := range t.Results {
		s.item(strong, "result", resultWords(r, t.Unit))
	}
	s.item(strong, "present", rowWords(*t, t.Present))
	s.item(strong, "absent", rowWords(*t, t.Absent))
	s.item(strong, "usual", rowWords(*t, t.Nominal))
	for _, text := range cautionTexts(b, t.Cautions) {
		s.item(caution, "caution", text)
	}
	s.item(strong, "file", fmt.Sprintf("%s:%d", t.File, t.Line))
}

func writeRepairRule(s *screen, r *knowledge.Repair) {
	s.ends(strong, r.ID, r.Title, "repair, "+mins(r.Minutes))
	s.item(strong, "parts", strings.Join(r.Parts, ", "))
	for i, step := range r.Steps {
		s.item(strong, fmt.Sprintf("step %d", i+1), step)
	}
	s.item(strong, "file", fmt.Sprintf("%s:%d", r.File, r.Line))
}

// bandWords is a belief, "0.85 (0.7 to 0.95)", with its grade: a judgement says so.
func bandWords(b knowledge.Band) string {
	text := fmt.Sprintf("%.3g", b.Mid)
	if b.Low != b.High {
		text += fmt.Sprintf(" (%.3g to %.3g)", b.Low, b.High)
	}
	grade := b.Grade
	if grade == "" {
		grade = "judgement"
	}
	return text + ", " + grade
}

func rowWords(t knowledge.Test, row map[string]knowledge.Band) string {
	var out []string
	for _, r := range t.Results {
		if band, ok := row[r.ID]; ok {
			out = append(out, fmt.Sprintf("%s %.3g", r.ID, band.Mid))
		}
	}
	return strings.Join(out, ", ")
}
