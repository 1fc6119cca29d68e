package reports

import (
	"fmt"
	"strconv"
	"strings"

	"drivemend/diagnose"
)

// listed is how many lines of a layer the report carries.
const listed = 8

// pages are what stands behind the first page.
func (r Report) pages() []section {
	sections := []section{r.question(), r.evidence(), r.openTests(), r.chances(), r.edges(), r.assumed(), r.needs(), r.earlierRepairs(), r.asFound(), r.cautions(), r.safetyLog(), r.conditions(), r.steps(), r.outsideAll(), r.leftOut(), r.boardValues(), r.files(), r.sources(), deferral()}
	var out []section
	for _, s := range sections {
		if len(s.Blocks) > 0 {
			out = append(out, s)
		}
	}
	return out
}

func (r Report) evidence() section {
	s := section{ID: "evidence", Title: "Evidence"}
	k := r.Ranking
	if k == nil {
		return s
	}
	known := r.beside()
	t := table{Caption: "What speaks for (+) and against (-): " + aboutTitle(k), Heads: []string{"Finding", "Where", "Shown", "How known", "dB", "Alone, dB"}, Numeric: []bool{false, false, false, false, true, true}}
	for _, f := range k.Findings {
		t.Rows = append(t.Rows, evidenceRow(f, known))
	}
	t.Foot = cells("Sum", "", "", "", decibans(sumOf(k.Findings)), "")
	s.tabulate(t)
	s.say(neutral, "", oddsWords(k)+" 10 dB is a factor of ten in the odds. The column alone gives a finding's weight with every other finding already known; where the two differ by more than 3 dB it is marked as shared, because it says much the same as others.")
	if text := known.note(k.Findings); text != "" {
		s.say(caution, "OUTSIDE A HOLD POINT.", text)
	}
	for _, f := range k.Findings {
		if len(f.Assumed) > 0 {
			s.say(caution, "ASSUMED.", findingName(f)+" rests on assumed values: "+strings.Join(f.Assumed, ", ")+".")
		}
	}
	if len(k.Unexplained) > 0 {
		var items []string
		for _, f := range k.Unexplained {
			items = append(items, known.name(f)+": "+known.shown(f)+" ("+decibans(f.Alone)+" dB)")
		}
		s.say(caution, "UNEXPLAINED.", "These speak against "+aboutTitle(k)+" by 3 dB or more:")
		s.enumerate(false, items...)
	}
	return s
}

func evidenceRow(f diagnose.Finding, known Beside) []entry {
	title := "a test that is not known"
	if f.Test != nil {
		title = f.Test.Title
	}
	title += known.mark(f)
	if isShared(f) {
		title += " (shared with others)"
	}
	how := f.Source
	switch {
	case f.Observation >= 0:
		how += ", " + seen(f.Seen)
	case f.Source != "computed":
		how += " by the board's stated values"
	}
	if len(f.Assumed) > 0 {
		how += ", rests on assumed values"
	}
	return cells(title, place(f.Part, f.Position), known.shown(f), how, decibans(f.Decibans), decibans(f.Alone))
}

// chances are the lines of the three layers with the chance before any answer where there is one.
func (r Report) chances() section {
	s := section{ID: "chances", Title: "All chances"}
	if r.Ranking == nil {
		return s
	}
	k := r.Ranking
	for _, layer := range []struct {
		caption string
		lines   []diagnose.Line
	}{{"Faults: what is broken", k.Faults}, {"Stresses: what killed it", k.Stresses}, {"Causes: what let that happen", k.Causes}} {
		s.tabulate(chanceTable(k, layer.caption, layer.lines))
	}
	s.say(neutral, "", "A cause that is not in this rule base: "+percent(k.Unlisted)+", from "+percent(k.UnlistedPrior)+" before any answer. "+belief)
	return s
}

func chanceTable(k *diagnose.Ranking, caption string, lines []diagnose.Line) table {
	t := table{Caption: caption, Heads: []string{"Line", "Parts or role", "Before", "Now"}, Numeric: []bool{false, false, true, true}}
	for i, l := range lines {
		if i == listed {
			break
		}
		before, note := "", l.Role
		if p, ok := priorOf(k, l.ID); ok {
			before = percent(p)
		}
		if len(l.Parts) > 0 {
			note = partWords(l.Parts, 12)
		}
		t.Rows = append(t.Rows, cells(l.Title, note, before, percent(l.Probability)))
	}
	if more := len(lines) - listed; more > 0 {
		t.Rows = append(t.Rows, cells("and "+strconv.Itoa(more)+" less likely", "", "", ""))
	}
	return t.withoutEmptyColumns()
}

// openTests are the tests worth most, also those that are locked.
func (r Report) openTests() section {
	s := section{ID: "tests", Title: "Open tests"}
	if r.Next == nil || len(r.Next.Tests) == 0 {
		return s
	}
	t := table{Caption: "The tests worth most, by the minutes of wrong repairs and comebacks they save", Heads: []string{"Test", "Where", "Takes", "Saves", "Tells", "Needs", "At this moment"}, Numeric: []bool{false, false, true, true, true, false, false}}
	for i, c := range r.Next.Tests {
		if i == listed {
			break
		}
		state := entry{"allowed", normal}
		if !c.Allowed {
			state = entry{"locked", caution}
		}
		saves := "less than it takes"
		if c.Value >= 0.5 {
			saves = mins(c.Value)
		}
		row := cells(c.Test.Title, placeShort(c), mins(c.Minutes), saves, fmt.Sprintf("%.2f bit", c.Bits), workWords(diagnose.WorkOf(c.Test)))
		t.Rows = append(t.Rows, append(row, state))
	}
	s.tabulate(t)
	if r.Next.Stop != "" {
		s.say(neutral, "Stop.", "It is time to stop testing: "+r.Next.Stop+".")
	}
	return s
}

const leftOutTitle = "Observations that do not count"

// leftOut lists every observation that takes no part in the ranking, and why; none is dropped.
func (r Report) leftOut() section {
	s := section{ID: "left-out", Title: leftOutTitle}
	var rows [][]entry
	named := map[int]bool{}
	add := func(i int, why string) {
		if i < 0 || i >= len(r.Case.Observations) || named[i] {
			return
		}
		named[i] = true
		o := r.Case.Observations[i]
		rows = append(rows, cells(r.testTitle(o.Test), place(o.Part, o.Position), r.shown(o), moment(o.At), why))
	}
	if r.Ranking != nil {
		for _, u := range r.Ranking.Unbound {
			add(u.Observation, u.Why)
		}
	}
	for i := range r.Case.Observations {
		if r.Case.Superseded(i) {
			add(i, "superseded by a later answer")
		}
	}
	if len(rows) == 0 {
		s.say(neutral, "", "Every observation on record counts.")
		return s
	}
	s.tabulate(table{Caption: "Kept in the case, without a vote", Heads: []string{"Test", "Where", "Shown", "When", "Why"}, Rows: rows})
	return s
}

func (r Report) sources() section {
	s := section{ID: "sources", Title: "Rule base and its sources"}
	if r.Base == nil {
		return s
	}
	s.say(neutral, "Rule base.", r.Base.Hash)
	s.say(neutral, "", "Its chances are judgements unless a source is named; a source backs the direction of a link, rarely its number.")
	var rows [][]entry
	for _, x := range r.Base.Sources {
		rows = append(rows, cells(x.Title, x.Where, x.Read))
	}
	if len(rows) > 0 {
		s.tabulate(table{Caption: "Sources of the rule base", Heads: []string{"Source", "Where", "How well it was read"}, Rows: rows})
	}
	return s
}

func deferral() section {
	s := section{ID: "limits", Title: "What comes before this report"}
	s.say(mandatory, "LOCAL CODES FIRST.", "Local electrical codes, the maker's instructions and licensed practice come before anything said here. Limits marked common practice or from memory were not read in a source.")
	s.say(neutral, "", belief)
	return s
}
