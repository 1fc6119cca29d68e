package reports

import (
	"errors"
	"fmt"
	"sort"
	"strconv"
	"strings"

	"drivemend/diagnose"
	"drivemend/diagnose/stress"
	"drivemend/measure"
)

// What stands beside a leading line on the first page: the chance from which it is named, the chance from which
// another fault is called likely (judgement), and how many are named.
const (
	notExcluded = worthALine // of the causes
	notLeading  = 0.05       // of the stresses
	alsoLikely  = 0.2
	shownBeside = 5
)

func (r Report) check() error {
	if r.Case == nil {
		return errors.New("a report needs a case; load one and give it as Case")
	}
	return nil
}

// build sets out the whole report.
func (r Report) build() (document, error) {
	if err := r.check(); err != nil {
		return document{}, err
	}
	d := document{Title: "Fault report " + r.Case.ID, Subtitle: r.boardTitle()}
	d.First = []section{r.caseHead(), r.finding(), r.threeQuestions(), r.rebuildVerdict(), r.outsideShort()}
	d.Rest = r.pages()
	return d, nil
}

func (r Report) boardTitle() string {
	text, ok := r.Case.Board.Word("title")
	if ok {
		return text + ", " + boardLine(r.Case.Board)
	}
	return boardLine(r.Case.Board)
}

func (r Report) caseHead() section {
	c := r.Case
	s := section{ID: "case", Title: "Case"}
	facts := []fact{{"Report made", moment(r.At)}, {"Case opened", day(c.Opened)}}
	add := func(name, text string) {
		if text != "" {
			facts = append(facts, fact{name, text})
		}
	}
	if !r.Private {
		add("Owner", c.Owner)
		add("Technician", c.Technician)
		add("Serial number", c.Serial)
		add("Firmware", c.Firmware)
	}
	for _, k := range [][2]string{{"supply", "Supply"}, {"history", "History"}} {
		word, _ := c.Board.Word(k[0])
		add(k[1], strings.ReplaceAll(word, "-", " "))
	}
	if q, ok := c.Board.Quantity("service"); ok {
		add("Service", q.String())
	}
	if c.Rebuild != nil {
		add("Rebuild", rebuildWords(c, len(c.Rebuild.Keys)))
	}
	add("Earlier repairs", earlierWords(c.Repairs))
	add("What happened", c.Story)
	add("Source", sourceOf(c.Source))
	s.Blocks = append(s.Blocks, block{Facts: facts})
	return s
}

func sourceOf(x measure.Source) string {
	var parts []string
	for _, t := range []string{x.Title, x.Site, x.Year, x.Address} {
		if t != "" {
			parts = append(parts, t)
		}
	}
	if x.Read != "" {
		parts = append(parts, "("+x.Read+")")
	}
	return strings.Join(parts, ", ")
}

func (r Report) eventTitle(id string) string {
	if r.Base != nil {
		if e := r.Base.Event(id); e != nil {
			return e.Title
		}
	}
	return id
}

func (r Report) causeTitle(id string) string {
	if r.Base != nil {
		if c := r.Base.Cause(id); c != nil {
			return c.Title
		}
	}
	return id
}

// disagrees tells whether the case's outcome names other causes than the leading one.
func (r Report) disagrees() bool {
	o := r.Case.Outcome
	if o == nil || len(o.Causes) == 0 || r.Ranking == nil || len(r.Ranking.Causes) == 0 {
		return false
	}
	for _, id := range o.Causes {
		if id == r.Ranking.Causes[0].ID {
			return false
		}
	}
	return true
}

// threeQuestions keeps the layers apart: what is broken, what killed it, what let that happen.
func (r Report) threeQuestions() section {
	s := section{ID: "answers", Title: "Broken, killed by, let happen"}
	if r.Ranking == nil {
		s.say(caution, "MISSING.", "The case was not ranked.")
		return s
	}
	k := r.Ranking
	s.tabulate(table{Caption: "The leading answer to each of the three questions", Heads: []string{"Question", "Leading answer", "Chance", "Beside it"}, Numeric: []bool{false, false, true, false},
		Rows: [][]entry{layerRow("What is broken?", k.Faults, "also likely broken", alsoLikely), layerRow("What killed it?", k.Stresses, "not excluded", notLeading),
			layerRow("What let that happen?", k.Causes, "not excluded", notExcluded, "a cause not in this rule base "+percent(k.Unlisted))}})
	for _, group := range k.Alike {
		s.say(caution, "CANNOT TELL APART.", "The answers so far do not separate: "+strings.Join(titlesOf(k, group), "; ")+".")
	}
	label, text := r.deciding()
	s.say(neutral, label, text)
	s.say(neutral, "", belief+" Two causes can act together, so their column may pass 100 %.")
	return s
}

// layerRow is one question with its leading answer and the lines beside it: of causes and stresses those that are not
// excluded, of faults those that are likely broken as well, for one broken part does not clear another.
func layerRow(question string, lines []diagnose.Line, beside string, from float64, always ...string) []entry {
	if len(lines) == 0 {
		return cells(question, "nothing", "", strings.Join(always, "; "))
	}
	others, more := othersBeside(lines[1:], from)
	if more > 0 {
		others = append(others, fmt.Sprintf("%d more of %s or more", more, percent(from)))
	}
	others = append(others, always...)
	text := "nothing else of " + percent(from) + " or more"
	if len(others) > 0 {
		text = beside + ": " + strings.Join(others, "; ")
	}
	lead := lines[0].Title
	if lines[0].Role != "" {
		lead += " (" + lines[0].Role + ")"
	}
	if len(lines[0].Parts) > 0 {
		lead += ": " + partWords(lines[0].Parts, 8)
	}
	return []entry{{Text: question}, {lead, strong}, {Text: percent(lines[0].Probability)}, {Text: text}}
}

// othersBeside names the likeliest lines from a chance up, and counts the rest of them.
func othersBeside(lines []diagnose.Line, from float64) (named []string, more int) {
	sorted := append([]diagnose.Line(nil), lines...)
	sort.SliceStable(sorted, func(i, j int) bool { return sorted[i].Probability > sorted[j].Probability })
	for _, l := range sorted {
		switch {
		case !(l.Probability >= from):
		case len(named) < shownBeside:
			named = append(named, short(plain(l.Title), 60)+" "+percent(l.Probability))
		default:
			more++
		}
	}
	return named, more
}

// decidingBits is the information about the cause from which a test is said to decide. Judgement.
const decidingBits = 0.2

// deciding names the test worth doing now; where none decides, the open one that tells most. A test that neither saves
// minutes nor tells much is not called deciding.
func (r Report) deciding() (label, text string) {
	n := r.Next
	switch {
	case n == nil:
		return "The test that decides.", "Not worked out."
	case len(n.Tests) == 0:
		return "The test that decides.", "Every test of the rule base has been answered."
	}
	best := n.Tests[0]
	if n.Locked != nil {
		best = *n.Locked
	} else if allowed := n.Allowed(); len(allowed) > 0 {
		best = allowed[0]
	}
	if best.Value > 0 || best.Bits >= decidingBits {
		return "The test that decides.", testWords(best) + lockedWord(best) + "."
	}
	open := append([]diagnose.Candidate(nil), n.Tests...)
	sort.SliceStable(open, func(i, j int) bool { return open[i].Bits > open[j].Bits })
	if open[0].Bits >= decidingBits {
		return "The test that decides.", testWords(open[0]) + lockedWord(open[0]) + "."
	}
	return "No single open test decides.", "The most informative: " + testWords(open[0]) + lockedWord(open[0]) + "."
}

func lockedWord(c diagnose.Candidate) string {
	if c.Allowed {
		return ""
	}
	text := ", locked at the time of this report"
	if len(c.BlockedBy) > 0 {
		text += ": " + c.BlockedBy[0]
	}
	if more := len(c.BlockedBy) - 1; more > 0 {
		text += "; and " + count(more, "thing more", "things more")
	}
	return text
}

func testWords(c diagnose.Candidate) string {
	text := c.Test.Title
	if p := placeShort(c); p != "board" {
		text += " at " + p
	}
	return fmt.Sprintf("%s (%s, %.2f bit)", text, mins(c.Minutes), c.Bits)
}

func (r Report) rebuildVerdict() section {
	s := section{ID: "verdict", Title: "The rebuild's peak against its rating"}
	m := r.Margin
	switch {
	case m == nil:
		s.say(caution, "MISSING.", "The margin was not worked out.")
	case m.Rebuild != nil:
		s.say(verdictTone(m.Rebuild.Verdict), verdictWords(m.Rebuild.Verdict)+".", peakAgainst(r.rebuildShort(), m.Rebuild)+restWords(m, m.Rebuild))
		s.enumerate(false, m.Rebuild.Rests...)
		s.dangers(m.Rebuild)
	case m.AsFound != nil:
		s.say(caution, "NO REBUILD IS STATED.", "The board as found: "+string(m.AsFound.Verdict)+". "+peakAgainst("as found, with "+networkWords(m.AsFound.Network)+",", m.AsFound))
		s.dangers(m.AsFound)
	default:
		if text := topologyWords(m); text != "" {
			s.say(caution, "NOT COMPUTED.", capital(text)+".")
			return s
		}
		s.say(caution, "NOT COMPUTABLE.", "What is missing stands under missing values: "+needKeys(m.Needs)+".")
	}
	return s
}

// dangers says what kills a board whatever its verdict on the peak.
func (s *section) dangers(f *stress.Figures) {
	for _, d := range dangersOf(f) {
		s.say(danger, strings.ToUpper(d.Name)+".", capital(d.Text)+".")
	}
}

// restWords says, beside a good verdict, how much of it is assumed.
func restWords(m *stress.Margin, f *stress.Figures) string {
	if f.Verdict != stress.Within || len(m.Assumed) == 0 {
		return ""
	}
	return " It rests on assumed values (" + strconv.Itoa(len(m.Assumed)) + ", listed under assumed); each, moved over its interval by itself, leaves it within."
}

// peakAgainst sets the peak of a board, named by what it has, against its rating.
func peakAgainst(with string, f *stress.Figures) string {
	text := fmt.Sprintf("%s the peak is %s (%s); the rating at the coldest junction is %s.", capital(with), volts(f.P999.Peak), percentileWords(f), volts(f.Rated))
	if f.Worst.Peak > 0 {
		text += fmt.Sprintf(" The absolute corner is %s; what it would take stands with the figures.", volts(f.Worst.Peak))
	}
	if len(f.LiftedBy) > 0 {
		text += " " + liftWords(f) + " " + strings.Join(f.LiftedBy, ", ") + "."
	}
	return text
}

func needKeys(needs []stress.Need) string {
	var out []string
	for _, n := range needs {
		out = append(out, n.Key)
	}
	return strings.Join(out, ", ")
}

func (r Report) testTitle(id string) string {
	if t := r.test(id); t != nil {
		return t.Title
	}
	return id
}
