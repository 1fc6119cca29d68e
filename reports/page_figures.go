package reports

import (
	"fmt"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure"
)

// question is what the people who designed the board are asked, with the figures they need to answer.
func (r Report) question() section {
	s := section{ID: "question", Title: "To the design team"}
	cause, repair := r.change()
	if cause == nil {
		s.say(caution, "NO CHANGE IS ASKED FOR YET.", "Why stands on the first page.")
	} else {
		s.say(mandatory, "PLEASE CHANGE.", r.changeTitle()+". "+r.changeBecause())
	}
	if repair != nil {
		s.enumerate(true, repair.Steps...)
	}
	if rows := r.changedValues(); len(rows) > 0 {
		s.tabulate(table{Caption: "The figures it turns on", Heads: []string{"Value", "As found", "Rebuilt with"}, Rows: rows})
	}
	if cause != nil {
		s.say(neutral, "", "Is there a reason in the design for what was found here, and do other boards of this series have it too?")
	}
	if r.Margin != nil && len(r.Margin.Assumed) > 0 {
		s.say(neutral, "Please confirm or correct.", "These values were assumed; the first ones move the peak most:")
		s.enumerate(false, assumedQuestions(r.Margin.Assumed, 5)...)
	}
	return s
}

// asked are the values a design team needs to see beside the rebuild's own keys.
var asked = []string{"bus.nominal", "bus.highest", "load.running_current", "load.stall_current", "protection.trip_current", "loop.inductance", "snubber.kind", "gate.turn_off_resistance", "switch.rated_voltage", "switch.fall_time"}

func (r Report) changedValues() [][]entry {
	found, rebuilt := r.Case.Board, measure.Board{}
	keys := append([]string(nil), asked...)
	if r.Case.Rebuild != nil {
		rebuilt = r.Case.Rebuild.Board
		keys = append(keys, r.Case.Rebuild.Keys...)
	}
	var rows [][]entry
	done := map[string]bool{}
	for _, k := range keys {
		if done[k] || !found.Stated(k) && !rebuilt.Stated(k) {
			continue
		}
		done[k] = true
		before, after := valueWords(found, k), valueWords(rebuilt, k)
		row := cells(k, before, after)
		switch {
		case r.Case.Rebuild == nil:
			row[2].Text = "no rebuild stated"
		case before == after:
			row[2].Text = "unchanged"
		default:
			row[2].Tone = strong
		}
		rows = append(rows, row)
	}
	return rows
}

// valueWords is a stated value as written, with the mark of an assumed one.
func valueWords(b measure.Board, path string) string {
	text := ""
	if names, ok := b.Names(path); ok {
		text = strings.Join(names, ", ")
	} else if word, ok := b.Word(path); ok {
		text = word
	} else if q, ok := b.Quantity(path); ok {
		text = q.String()
	}
	switch {
	case text == "":
		return "not stated"
	case b.Assumed(path):
		return text + " (assumed)"
	}
	return text
}

func assumedQuestions(assumed []stress.Assumed, most int) []string {
	var out []string
	for i, a := range byMove(assumed) {
		if i == most {
			break
		}
		out = append(out, fmt.Sprintf("%s, taken as %s: moves the peak by %s", a.Key, between(a.Value), moves(a.MovesPeak)))
	}
	return out
}

func (r Report) assumed() section {
	s := section{ID: "assumed", Title: "Assumed values"}
	if r.Margin == nil {
		return s
	}
	if len(r.Margin.Assumed) == 0 {
		s.say(neutral, "", "The margin rests on no assumed value.")
		return s
	}
	t := table{Caption: "Not known to be true of this board", Heads: []string{"Key", "Taken as", "Because", "Moves the peak by"}, Numeric: []bool{false, false, false, true}}
	for _, a := range byMove(r.Margin.Assumed) {
		t.Rows = append(t.Rows, cells(a.Key, between(a.Value), a.Why, moves(a.MovesPeak)))
	}
	s.tabulate(t)
	return s
}

func (r Report) needs() section {
	s := section{ID: "needs", Title: "Missing values"}
	var rows [][]entry
	if r.Margin != nil {
		for _, n := range r.Margin.Needs {
			if n.Key == topologyKey {
				s.say(caution, "TOPOLOGY.", capital(topologyNeed(n))+".")
				continue
			}
			rows = append(rows, cells(n.Key, strings.Join(n.For, "; ")))
		}
	}
	if r.Discharge != nil {
		for _, n := range r.Discharge.Needs {
			rows = append(rows, cells(n.Key, n.Why))
		}
	}
	if len(rows) == 0 {
		s.say(neutral, "", "Nothing else that was asked for is missing.")
		return s
	}
	s.tabulate(table{Caption: "What the case does not state", Heads: []string{"Key", "What it is needed for"}, Rows: rows})
	return s
}

// boardValues are all values the case states of the board, so that the report can be checked without the case file.
func (r Report) boardValues() section {
	s := section{ID: "board", Title: "The board as stated"}
	var rows [][]entry
	for _, path := range r.Case.Board.Paths() {
		if text := valueWords(r.Case.Board, path); text != "not stated" && path != "assumed" {
			rows = append(rows, cells(path, text))
		}
	}
	if len(rows) > 0 {
		s.tabulate(table{Caption: "Values of the case file", Heads: []string{"Key", "Value"}, Rows: rows})
	}
	return s
}
