package reports

import (
	"io"
	"strconv"
	"strings"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Discharge prints how the board is made dead: the energy, the resistor, the times, the steps, the cautions. Of a plan
// that must not be carried out it prints why, and neither resistor nor times nor steps.
func Discharge(w io.Writer, p *safety.Plan, style Style) error {
	s := newScreen(style)
	s.head("STORED", storedTotal(p))
	s.grid(storeColumns, storeRows(p))
	if len(p.Withheld) > 0 {
		s.hang(danger, "WITHHELD  ", "the steps of this discharge")
		writeMissing(s, p.Withheld)
	} else {
		writeResistor(s, p)
		writeTimes(s, p)
		writeSteps(s, p)
	}
	s.head("CAUTION", "")
	for _, c := range p.Cautions {
		s.hang(caution, " ! ", c.Text+basisOf(c))
	}
	writeWanted(s, p.Needs)
	return s.write(w)
}

// mostEnergy is what the board can hold with every capacitance at the top of its interval.
func mostEnergy(p *safety.Plan) string {
	return quantity.Format(max(p.WorstEnergyJ, p.TotalEnergyJ), quantity.Joule)
}

func storedTotal(p *safety.Plan) string {
	text := quantity.Format(p.TotalEnergyJ, quantity.Joule) + " in all"
	if p.WorstEnergyJ > p.TotalEnergyJ {
		text += ", " + mostEnergy(p) + " with every capacitance at the top of its interval"
	}
	return text
}

func writeSteps(s *screen, p *safety.Plan) {
	s.head("STEPS", "")
	for i, step := range p.Steps {
		text := step.Text
		if !strings.HasPrefix(text, step.Point) {
			text = step.Point + ": " + text
		}
		s.hang(mandatory, pad(strconv.Itoa(i+1), 3), text)
	}
}

var storeColumns = []column{{title: "store", width: 11}, {title: "what"}, {title: "up to", width: 8, right: true}, {title: "holds", width: 9, right: true}, {title: "energy", width: 8, right: true}, {title: "known", width: 8}}

func storeRows(p *safety.Plan) [][]entry {
	var rows [][]entry
	for _, d := range p.Stores {
		st := d.Store
		holds, energy := "", ""
		if st.Capacitance.Basis != safety.None {
			holds, energy = quantity.Format(st.Capacitance.Value, quantity.Farad), quantity.Format(st.EnergyJ, quantity.Joule)
		}
		rows = append(rows, []entry{{Text: st.Point}, {Text: storeTitle(st)}, {Text: volts(st.Voltage.Value)}, {Text: holds}, {Text: energy}, knownWord(st)})
	}
	return rows
}

func storeTitle(st safety.Store) string {
	if st.PartOf != "" {
		return st.Title + " (part of " + st.PartOf + ")"
	}
	return st.Title
}

func knownWord(st safety.Store) entry {
	switch {
	case st.ToCheck:
		return entry{"to check", caution}
	case st.Known():
		return entry{"stated", neutral}
	}
	return entry{"assumed", caution}
}

func writeResistor(s *screen, p *safety.Plan) {
	r := p.Resistor
	text := quantity.Format(r.Ohm, quantity.Ohm)
	if r.Series > 1 {
		text += " as " + strconv.Itoa(r.Series) + " × " + quantity.Format(r.EachOhm, quantity.Ohm) + " in series, " + volts(r.EachV) + " each"
	}
	text += "; takes " + quantity.Format(r.JoulesJ, quantity.Joule) + ", first moment " + quantity.Format(r.PeakA, quantity.Ampere) + " and " + quantity.Format(r.PeakW, quantity.Watt) + "; rated " + quantity.Format(r.RatedW, quantity.Watt) + " or more"
	if r.Given {
		text += " (as given)"
	}
	s.item(strong, "resistor", text)
	for _, n := range r.Notes {
		s.item(caution, "", n)
	}
}

func writeTimes(s *screen, p *safety.Plan) {
	s.item(strong, "wait", timesWords(p.Wait)+" (capacitance at the top of its interval; lower bounds, never a proof)")
	if b := p.Bleeder; b != nil {
		s.item(strong, "bleeder", quantity.Format(b.Ohm, quantity.Ohm)+", if intact: "+timesWords(b.Wait)+", "+quantity.Format(b.PowerW, quantity.Watt))
	}
	if p.Recovery.HighV > safety.DeadVolts {
		s.item(strong, "recovery", p.Recovery.Text)
	}
}

// timesWords names the levels that the store stands above to begin with; one it never reached has no time.
func timesWords(t safety.Times) string {
	var out []string
	for _, x := range []struct{ level, after float64 }{{safety.TouchVolts, t.To60V}, {safety.LiveVolts, t.To50V}, {safety.DeadVolts, t.To5V}} {
		if x.after > 0 {
			out = append(out, volts(x.level)+" after "+seconds(x.after))
		}
	}
	if len(out) == 0 {
		return "it stands at " + volts(safety.DeadVolts) + " or less to begin with"
	}
	return strings.Join(out, ", ")
}

func basisOf(c safety.Caution) string {
	switch {
	case c.Read == safety.CommonPractice && c.ID == "local-rules":
		return ""
	case c.Read == safety.CommonPractice && c.Source != "" && strings.Contains(c.Source, "common practice"):
		return " [" + c.Source + "]"
	case c.Read == safety.CommonPractice:
		return " [common practice]"
	case c.Read == safety.Memory && strings.Contains(c.Source, "memory"):
		return " [" + c.Source + "]"
	case c.Read == safety.Memory:
		return " [" + c.Source + ", from memory]"
	case c.Read == safety.SecondHand:
		return " [" + c.Source + ", second hand]"
	case c.Source != "":
		return " [" + c.Source + "]"
	}
	return ""
}

func writeWanted(s *screen, wanted []safety.Wanted) {
	if len(wanted) == 0 {
		return
	}
	s.head("MISSING", "what would settle more")
	for _, n := range wanted {
		s.hang(neutral, "   ", n.Key+": "+n.Why)
	}
}

// Status prints where a case stands: its answers, and at one moment its isolation, link and dead checks.
func Status(w io.Writer, c *measure.Case, st safety.Status, style Style) error {
	s := newScreen(style)
	s.ends(strong, c.ID, boardLine(c.Board), answers(c))
	if st.Dead {
		s.hang(normal, "DEAD      ", "isolated, no shorting link, every store proved: meter steps may be done")
	} else {
		s.hang(danger, "NOT DEAD  ", "no meter step on the power side; what is missing stands below")
	}
	writeIsolation(s, st.Isolation)
	s.item(strong, "link", linkWords(st.Link))
	s.grid(pointColumns, pointRows(st.Points))
	for _, p := range st.Points {
		writeMissing(s, p.Missing)
	}
	if len(st.Unplaced) > 0 {
		s.item(caution, "note", "dead checks at points this board does not have: "+strings.Join(st.Unplaced, ", "))
	}
	s.item(strong, "rebuild", rebuildWords(c))
	s.item(strong, "outcome", outcomeShort(c, st.At))
	s.say(neutral, "At "+moment(st.At)+".")
	return s.write(w)
}

func writeIsolation(s *screen, i safety.IsolationStatus) {
	if i.Isolated {
		s.item(normal, "isolated", "since "+moment(i.Since)+", motor "+i.Last.Motor+", other sources "+i.Last.OtherSources)
		return
	}
	s.item(danger, "isolated", "NO")
	writeMissing(s, i.Missing)
}

func linkWords(l safety.LinkStatus) string {
	switch {
	case l.Fitted:
		return "FITTED since " + moment(l.Since) + ": blocks meter steps and powered steps"
	case !l.Removed.IsZero():
		return "none, the last one came off " + moment(l.Removed)
	}
	return "none"
}

var pointColumns = []column{{title: "dead check", width: 11}, {title: "what"}, {title: "DC", width: 8, right: true}, {title: "AC", width: 8, right: true}, {title: "age", width: 7, right: true}, {title: "state", width: 8}}

func pointRows(points []safety.PointStatus) [][]entry {
	var rows [][]entry
	for _, p := range points {
		row := []entry{{Text: p.Store.Point}, {Text: p.Store.Title}, {Text: "-"}, {Text: "-"}, {Text: "-"}, {"OPEN", danger}}
		if p.Last != nil {
			row[2].Text, row[3].Text, row[4].Text = readingOr(p.Last.DC), readingOr(p.Last.AC), ageWords(p)
		}
		if p.Dead {
			row[5] = entry{"dead", normal}
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

// ageWords rounds up, so that an age never looks younger than it is.
func ageWords(p safety.PointStatus) string {
	m := int64((p.Age + 59e9) / 60e9)
	switch {
	case p.Age < 0:
		return "future"
	case m > 999:
		return ">999 min"
	}
	return strconv.FormatInt(m, 10) + " min"
}

func rebuildWords(c *measure.Case) string {
	switch {
	case c.Rebuild == nil:
		return "none chosen"
	case c.Rebuild.Done.IsZero():
		return "chosen, not done: " + strings.Join(c.Rebuild.Keys, ", ")
	}
	return "done " + moment(c.Rebuild.Done) + ": " + strings.Join(c.Rebuild.Keys, ", ")
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
