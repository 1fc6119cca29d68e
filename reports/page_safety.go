package reports

import (
	"slices"
	"sort"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure/quantity"
)

// cautions stand with this board's joules.
func (r Report) cautions() section {
	s := section{ID: "cautions", Title: "Cautions"}
	p := r.plan()
	if p == nil {
		s.say(caution, "MISSING.", "The stored energy of this board was not worked out. Treat it as live.")
		return s
	}
	s.say(danger, "STORED ENERGY.", "This board can hold "+mostEnergy(p)+" at up to "+volts(p.BusV)+".")
	t := table{Caption: "Stores of energy", Heads: []string{"Store", "What", "Up to", "Holds", "Energy", "Known"}, Numeric: []bool{false, false, true, true, true, false}}
	t.Rows = storeRows(p)
	s.tabulate(t)
	r.sayDischarge(&s, p)
	var items []string
	for _, c := range p.Cautions {
		items = append(items, c.Text+basisOf(c))
	}
	s.enumerate(false, items...)
	if t := limitsTable(p.Limits); len(t.Rows) > 0 {
		s.tabulate(t)
	}
	return s
}

// plan is the discharge as far as it may be carried out at the moment of the report: of a board that is not isolated
// its figures alone, and what is missing.
func (r Report) plan() *safety.Plan {
	if r.Discharge == nil || r.Safety.Isolation.Isolated {
		return r.Discharge
	}
	p := *r.Discharge
	missing := r.Safety.Isolation.Missing
	if len(missing) == 0 {
		missing = []safety.Missing{{Point: 0, Text: "whether the board is isolated was not looked at", Unlock: "state the isolation, and make this report anew"}}
	}
	p.Withheld, p.Steps = slices.Concat(missing, p.Withheld), nil
	return &p
}

// sayDischarge gives the resistor and its times as what to do only where that may be done; else as figures, below what
// is missing. A resistor that is withheld by itself has none.
func (r Report) sayDischarge(s *section, p *safety.Plan) {
	through, times := quantity.Format(p.Resistor.Ohm, quantity.Ohm), timesWords(p.Wait)+". Waiting is never a proof"
	if len(p.Withheld) == 0 {
		s.say(neutral, "Discharge.", "Through "+through+": "+times+"; measure every store, DC and AC.")
		return
	}
	s.say(danger, "DISCHARGE WITHHELD.", "At "+moment(r.At)+" this board must not be discharged, for:")
	var why []string
	for _, m := range p.Withheld {
		why = append(why, missingWords([]safety.Missing{m}, 1)+". What to do: "+m.Unlock+".")
	}
	s.enumerate(false, why...)
	if len(r.Discharge.Withheld) == 0 {
		s.say(neutral, "Figures alone.", "Through "+through+" it would take: "+times+".")
	}
}

// limitsTable holds the lines of all sources that are drawn for such a board side by side, with how each was read.
func limitsTable(limits []safety.Limit) table {
	t := table{Caption: "Limits, source by source; * the lowest for its hazard here, and gone by", Heads: []string{"Hazard", "Limit", "This board", "Stands", "Source", "Read"}}
	for _, l := range limits {
		if l.Apart {
			continue
		}
		row := limitRow(l)
		source := l.Source
		if source == "" {
			source = l.Short
		}
		hazard := l.Hazard
		if l.Lowest {
			hazard += " *"
		}
		t.Rows = append(t.Rows, []entry{{Text: hazard}, row[1], row[3], row[4], {Text: source}, row[5]})
	}
	return t
}

// logged is one entry of the safety log.
type logged struct {
	at   time.Time
	text string
}

func (r Report) safetyLog() section {
	s := section{ID: "safety-log", Title: "Safety log"}
	log := r.logEntries()
	sort.SliceStable(log, func(i, j int) bool { return log[i].at.Before(log[j].at) })
	var rows [][]entry
	for _, l := range log {
		rows = append(rows, cells(moment(l.at), l.text))
	}
	if len(rows) > 0 {
		s.tabulate(table{Caption: "What the case records, in order of time", Heads: []string{"When", "What"}, Rows: rows})
	} else {
		s.say(caution, "EMPTY.", "The case records no isolation, dead check or link.")
	}
	if r.Safety.Dead {
		s.say(normal, "DEAD.", "At "+moment(r.Safety.At)+": isolated, no link, every store proved.")
	} else if !r.Safety.At.IsZero() {
		s.say(danger, "NOT PROVED DEAD.", "At "+moment(r.Safety.At)+" this board does not count as dead:")
		s.enumerate(false, stillMissing(r.Safety)...)
	}
	return s
}

func (r Report) logEntries() []logged {
	var log []logged
	history := r.Case.Safety
	for _, i := range history.Isolation {
		locked := "locked"
		if !i.Locked {
			locked = "NOT locked"
		}
		log = append(log, logged{i.At, "Isolation: " + locked + ", motor " + i.Motor + ", other sources " + i.OtherSources})
	}
	for _, d := range history.DeadChecks {
		proved := "meter proved before and after"
		if !d.MeterProved {
			proved = "meter NOT proved"
		}
		log = append(log, logged{d.At, "Dead check at " + d.Point + ": DC " + readingOr(d.DC) + ", AC " + readingOr(d.AC) + ", " + proved})
	}
	for _, l := range history.Links {
		log = append(log, logged{l.Fitted, "Shorting link fitted"})
		if !l.Removed.IsZero() {
			log = append(log, logged{l.Removed, "Shorting link removed"})
		}
	}
	for _, e := range history.Energised {
		log = append(log, logged{e.At, "Energy put in: " + stepName(e.What)})
	}
	return append(append(log, r.poweredReadings()...), r.poweredRecord()...)
}

// countsAs is said of an entry that ends the isolation and every dead check without being one of the safety record.
const countsAs = "Counts as energy put in: "

// poweredReadings are the readings that the hold points take as energy put in: those of powered tests, of the
// insulation tester, and of tests that the rule base does not know.
func (r Report) poweredReadings() []logged {
	var log []logged
	for _, o := range r.Case.Observations {
		t := r.test(o.Test)
		if o.Answer != "" || t == nil && o.Reading == nil || t != nil && !diagnose.WorkOf(t).Energises() {
			continue
		}
		work := "of a test that the rule base does not know"
		if t != nil {
			work = workWords(diagnose.WorkOf(t))
		}
		log = append(log, logged{o.At, countsAs + "reading " + r.testTitle(o.Test) + ", " + place(o.Part, o.Position) + " (" + work + ")"})
	}
	return log
}

// poweredRecord are the steps of the record and of the bring-up that were done under power.
func (r Report) poweredRecord() []logged {
	var log []logged
	powered := map[string]safety.RecordStep{}
	for _, x := range safety.RecordSteps() {
		if x.Work.Need.Powered() {
			powered[x.ID] = x
		}
	}
	for _, e := range r.Case.Steps {
		if x, ok := powered[e.Step]; ok && (e.Result == "done" || e.Result == "failed") {
			log = append(log, logged{e.At, countsAs + "step " + x.Title + ", " + e.Result + " (" + workWords(x.Work) + ")"})
		}
	}
	for _, b := range r.Case.BringUp {
		log = append(log, logged{b.At, countsAs + "bring-up, stage " + b.Stage})
	}
	return log
}

func stillMissing(st safety.Status) []string {
	var out []string
	for _, m := range st.Isolation.Missing {
		out = append(out, m.Text)
	}
	if st.Link.Fitted {
		out = append(out, "a shorting link is fitted")
	}
	for _, p := range st.Points {
		for _, m := range p.Missing {
			out = append(out, m.Text)
		}
	}
	return out
}
