package reports

import (
	"sort"
	"strings"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure/quantity"
)

// cautions stand with this board's joules.
func (r Report) cautions() section {
	s := section{ID: "cautions", Title: "Cautions"}
	p := r.Discharge
	if p == nil {
		s.say(caution, "MISSING.", "The stored energy of this board was not worked out. Treat it as live.")
		return s
	}
	s.say(danger, "STORED ENERGY.", "This board can hold "+mostEnergy(p)+" at up to "+volts(p.BusV)+".")
	t := table{Caption: "Stores of energy", Heads: []string{"Store", "What", "Up to", "Holds", "Energy", "Known"}, Numeric: []bool{false, false, true, true, true, false}}
	t.Rows = storeRows(p)
	s.tabulate(t)
	if len(p.Withheld) > 0 {
		var why []string
		for _, m := range p.Withheld {
			why = append(why, m.Text+". Instead: "+m.Unlock)
		}
		s.say(danger, "DISCHARGE WITHHELD.", strings.Join(why, "; ")+".")
	} else {
		s.say(neutral, "Discharge.", "Through "+quantity.Format(p.Resistor.Ohm, quantity.Ohm)+": "+timesWords(p.Wait)+". Waiting is never a proof; measure every store, DC and AC.")
	}
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
		log = append(log, logged{e.At, "Energy put in: " + e.What})
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
