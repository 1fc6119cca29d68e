package reports

import (
	"io"
	"strconv"
	"strings"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// StatusPage is everything that the status of a case is written from. Case is needed; what rests on a member that is
// left out is not said.
type StatusPage struct {
	Case            *measure.Case
	At              time.Time
	Safety          safety.Status
	Works           []WorkLine // every kind of work, in the order of the job
	Record          []safety.RecordStatus
	Outside         []Outside     // readings taken outside their hold points
	OutsideSteps    []OutsideStep // steps of the record done outside theirs
	Open            []OpenTest    // what has to be done, and what was put off
	Needs           []stress.Need // values of the board that figures wait for
	Stated, Assumed int           // how many values of the board are stated, and how many of them assumed
}

// WorkLine is one kind of work, and whether it may be done now.
type WorkLine struct {
	Title    string
	Decision safety.Decision
}

// OpenTest is a test that stands open; Why is one or two words: "must be done", "later", "skipped".
type OpenTest struct{ Title, ID, Why string }

// Status prints where a case stands, in the order in which it is needed at the bench: is it dead, for how much
// longer, what withholds what, what may be done, what is still owed.
func Status(w io.Writer, p StatusPage, style Style) error {
	s := newScreen(style)
	s.ends(strong, p.Case.ID, boardLine(p.Case.Board), answers(p.Case))
	if p.Safety.Dead {
		s.hang(normal, "DEAD      ", "at "+moment(p.At)+": no link, every store proved"+lapses(p.Safety))
	} else {
		s.hang(danger, "NOT DEAD  ", "at "+moment(p.At)+": no meter step on the power side")
	}
	for _, text := range p.Safety.Alarms {
		s.item(danger, "ALARM", text)
	}
	writeIsolation(s, p.Safety)
	s.grid(pointColumns, pointRows(p.Safety))
	for _, text := range p.Safety.Spared {
		s.item(neutral, "spared", text)
	}
	if len(p.Safety.Unplaced) > 0 {
		s.item(caution, "note", "dead checks at points this board does not have: "+strings.Join(p.Safety.Unplaced, ", "))
	}
	writeHoldPoints(s, p)
	writeWorks(s, p.Works, p.Case.Rebuild != nil)
	writeRecord(s, p)
	writeOpen(s, p.Open)
	writeKnown(s, p)
	return s.write(w)
}

// lapses says when the first of the dead checks no longer counts.
func lapses(st safety.Status) string {
	left, known := leastLeft(st)
	if !known {
		return ""
	}
	return ", for " + left
}

// leastLeft is what is left of the dead check that lapses first; known is false without any that counts.
func leastLeft(st safety.Status) (left string, known bool) {
	var first time.Time
	for _, p := range st.Points {
		if p.Dead && (first.IsZero() || p.ExpiresAt.Before(first)) {
			first = p.ExpiresAt
		}
	}
	return minutesLeft(first.Sub(st.At)), !first.IsZero()
}

func writeIsolation(s *screen, st safety.Status) {
	i := st.Isolation
	switch {
	case i.Isolated:
		s.item(normal, "isolated", "since "+clockAt(i.Since, st.At)+", stated "+ago(i.Age)+"; motor "+i.Last.Motor+", other sources "+i.Last.OtherSources)
	case i.Last != nil && !i.Last.At.IsZero():
		s.item(danger, "isolated", "NO; last stated "+clockAt(i.Last.At, st.At))
	default:
		s.item(danger, "isolated", "NO")
	}
	if st.Link.Fitted {
		s.item(danger, "link", "FITTED since "+clockAt(st.Link.Since, st.At)+": blocks meter steps and powered steps")
	}
}

// clockAt prints a moment beside another that stands on the same screen: in its zone, and without the day they share.
func clockAt(t, beside time.Time) string {
	if t.IsZero() {
		return moment(t)
	}
	t = t.In(beside.Location())
	if day(t) == day(beside) {
		return t.Format("15:04")
	}
	return t.Format("2006-01-02 15:04")
}

// ago prints an age with its minutes, from two days on in days, rounded up so that it never looks younger than it is.
func ago(d time.Duration) string {
	m := upTo(d, time.Minute)
	switch {
	case d >= 2*day24:
		return strconv.FormatInt(upTo(d, day24), 10) + " days ago"
	case m >= 60:
		return strconv.FormatInt(m/60, 10) + " h " + strconv.FormatInt(m%60, 10) + " min ago"
	}
	return strconv.FormatInt(m, 10) + " min ago"
}

const day24 = 24 * time.Hour

// upTo counts units of time, a part of one as a whole one.
func upTo(d, unit time.Duration) int64 { return int64((d + unit - 1) / unit) }

// hoursWords prints a span of whole hours.
func hoursWords(d time.Duration) string { return strconv.Itoa(int(d/time.Hour)) + " h" }

// minutesLeft rounds down, so that a check never looks fresher than it is.
func minutesLeft(d time.Duration) string {
	if d < time.Minute {
		return "less than 1 min"
	}
	return strconv.FormatInt(int64(d/time.Minute), 10) + " min"
}

var pointColumns = []column{{title: "dead check", width: 11}, {title: "what"}, {title: "DC", width: 8, right: true}, {title: "AC", width: 8, right: true}, {title: "age", width: 8, right: true}, {title: "left", width: 6, right: true}, {title: "state", width: 5}}

func pointRows(st safety.Status) [][]entry {
	var rows [][]entry
	for _, p := range st.Points {
		row := []entry{{Text: p.Store.Point}, {Text: p.Store.Title}, {Text: "-"}, {Text: "-"}, {Text: "-"}, {Text: "-"}, {"OPEN", danger}}
		if p.Last != nil {
			row[2].Text, row[3].Text, row[4].Text = readingOr(p.Last.DC), readingOr(p.Last.AC), ageWords(p)
		}
		if p.Dead {
			row[5].Text, row[6] = strings.Replace(minutesLeft(p.ExpiresAt.Sub(st.At)), "less than ", "<", 1), entry{"dead", normal}
		}
		rows = append(rows, row)
	}
	return rows
}

func readingOr(q quantity.Quantity) string {
	if q.Unit == "" {
		return "not read"
	}
	if q.Text != "" {
		return q.Text
	}
	return q.String()
}

// ageWords is an age in minutes, from two hours on in hours, from two days on in days; rounded up, so that it never
// looks younger than it is.
func ageWords(p safety.PointStatus) string {
	switch {
	case p.Age < 0:
		return "future"
	case p.Age >= 2*day24:
		return strconv.FormatInt(upTo(p.Age, day24), 10) + " days"
	case p.Age >= 2*time.Hour:
		return strconv.FormatInt(upTo(p.Age, time.Hour), 10) + " h"
	}
	return strconv.FormatInt(upTo(p.Age, time.Minute), 10) + " min"
}

// rebuildWords says how a rebuild stands, naming so many of the keys it changes.
func rebuildWords(c *measure.Case, most int) string {
	switch {
	case c.Rebuild == nil:
		return "none chosen"
	case c.Rebuild.Done.IsZero():
		return "chosen, not done: " + someOf(c.Rebuild.Keys, most, ", ")
	case len(c.Rebuild.Keys) == 0:
		return "done " + moment(c.Rebuild.Done) + ", as the board was"
	}
	return "done " + moment(c.Rebuild.Done) + ": " + someOf(c.Rebuild.Keys, most, ", ")
}

func outcomeShort(c *measure.Case, at time.Time) string {
	if c.Outcome == nil {
		return "open"
	}
	text := confirmedWords(c, at)
	if text == "" {
		text = "not confirmed"
	}
	if len(c.Outcome.Causes) > 0 {
		text += ": " + strings.Join(c.Outcome.Causes, ", ")
	}
	return text
}

// shownOpen is how many tests of one kind the status names.
const shownOpen = 2

// writeOpen names the tests that stand open, those of one reason together, in the order given.
func writeOpen(s *screen, open []OpenTest) {
	var reasons []string
	titles := map[string][]string{}
	for _, t := range open {
		if titles[t.Why] == nil {
			reasons = append(reasons, t.Why)
		}
		titles[t.Why] = append(titles[t.Why], t.Title)
	}
	mark := "TESTS   "
	for _, why := range reasons {
		s.hang(mandatory, mark, why+": "+someOf(titles[why], shownOpen, "; "))
		mark = strings.Repeat(" ", len(mark))
	}
}

// someOf joins the first of a list and counts the rest.
func someOf(all []string, most int, between string) string {
	if len(all) <= most {
		return strings.Join(all, between)
	}
	return strings.Join(all[:most], between) + between + "and " + strconv.Itoa(len(all)-most) + " more"
}

// writeKnown says how much of the board is known, and how the case stands once it is being rebuilt or closed.
func writeKnown(s *screen, p StatusPage) {
	s.hang(strong, "BOARD   ", boardKnown(p))
	if p.Case.Rebuild != nil {
		s.hang(strong, "REBUILD ", rebuildWords(p.Case, 2))
	}
	if p.Case.Outcome != nil {
		s.hang(strong, "OUTCOME ", outcomeShort(p.Case, p.At))
	}
}

func boardKnown(p StatusPage) string {
	text := count(p.Stated, "value stated", "values stated") + ", " + strconv.Itoa(p.Assumed) + " of them assumed"
	var keys []string
	for _, n := range p.Needs {
		if p.Case.Board.Stated(strings.TrimPrefix(n.Key, "board.")) && len(n.For) > 0 {
			text += "; figures: " + clause(n.For[0]) // the key is there; what is missing is something else
			continue
		}
		keys = append(keys, n.Key)
	}
	if len(keys) > 0 {
		text += "; figures wait for " + someOf(keys, 3, ", ")
	}
	return text
}
