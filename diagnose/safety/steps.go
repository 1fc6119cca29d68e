package safety

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// Step is one step of the order of work; Point is the store it is done at, "" for the whole board.
type Step struct{ Point, Text string }

// steps is the order of work: cut off, prove the meter, then store by store measure, discharge, watch, measure again,
// and at the end keep it down. Common practice, in agreement with makers' manuals.
func steps(in Input, p *Plan) []Step {
	out := []Step{
		{"", "Cut the board off from every source, lock and tag it, unplug the motor or lock its shaft, name the other sources and switch them off."},
		{"", "Prove the meter on a known DC source of 50 V or more, same range and leads."},
	}
	if len(p.Withheld) > 0 {
		for _, m := range p.Withheld {
			out = append(out, Step{"", "Stop here: " + m.Text + ". Instead " + m.Unlock + "."})
		}
		return out
	}
	out = append(out, Step{"", "Take " + p.Resistor.inWords(p.Spread) + ", with insulated clips."})
	for _, d := range p.Stores {
		out = append(out, storeSteps(d, p.Resistor)...)
	}
	return append(out,
		Step{"", "Prove the meter again on the same source: only now do the readings count. Enter every one of them with its time."},
		Step{"", "Fit a shorting link or leave the resistor on while you work on the board. Take it off before any ohm, diode or capacitance reading, and enter both times."},
		Step{"", "Check every store again after the link came off, after 10 minutes, after every break and every heating-up, and before touching the board the next day."},
	)
}

// inWords says what to take from the shelf.
func (r Resistor) inWords(spread float64) string {
	what := "a resistor of " + format(r.Ohm, quantity.Ohm)
	switch {
	case r.LoadBank:
		what = fmt.Sprintf("a load bank or the maker's discharge tool of %s, good for %s (no stack of ordinary resistors does this)", format(r.Ohm, quantity.Ohm), format(r.EachV*float64(r.Series), quantity.Volt))
	case r.Series > 1:
		what = fmt.Sprintf("%d resistors of %s in series (%s), each good for %s", r.Series, format(r.EachOhm, quantity.Ohm), format(r.Ohm, quantity.Ohm), format(r.EachV, quantity.Volt))
	}
	return fmt.Sprintf("%s, rated %s or more in all, whose pulse rating stands %s at first and %s in all (capacitance %s)", what,
		format(r.RatedW, quantity.Watt), format(r.PeakW, quantity.Watt), format(max(r.JoulesJ, r.UnevenJ), quantity.Joule), atTop(spread))
}

func storeSteps(d StoreDischarge, r Resistor) []Step {
	s := d.Store
	name := s.Title
	if s.ToCheck {
		name += " (if fitted)"
	}
	first := Step{s.Point, fmt.Sprintf("%s: measure DC and AC %s. It can stand at %s%s.", name, s.Where, format(s.Voltage.Value, quantity.Volt), heldText(d))}
	if s.Capacitance.Basis == None {
		first.Text += " Above 5 V, DC or AC: find and cut off what feeds it, discharge the bus, measure again."
		return []Step{first}
	}
	first.Text += " AC above 5 V: a source is still connected; no resistor, isolate again and find it."
	return []Step{first,
		{s.Point, fmt.Sprintf("%s: put %s across it with insulated probes (%s at first) and watch the meter fall; if it does not, the resistor is open or not connected. %sLeave it on for %s.",
			name, format(r.Ohm, quantity.Ohm), format(d.peak(), quantity.Ampere), levelsText(d.latest()), seconds(d.FiveRC))},
		{s.Point, name + ": measure DC and AC again. 5 V or less is dead; below 50 V it may be touched but takes no ohmmeter."},
	}
}

// latest are the times down with everything at its worst: a half of a split bank with the whole voltage on it.
func (d StoreDischarge) latest() Times {
	if d.Uneven != nil {
		return d.Uneven.Wait
	}
	return d.Wait
}

// peak is the current at the first moment, likewise.
func (d StoreDischarge) peak() float64 {
	if d.Uneven != nil {
		return d.Uneven.PeakCurrentA
	}
	return d.PeakCurrentA
}

// levelsText gives the times to the levels that lie below the start: "Below 60 V after 5 s, 5 V after 11 s at the latest. ".
func levelsText(t Times) string {
	text := ""
	for _, l := range t.Levels() {
		if text != "" {
			text += ", "
		}
		text += format(l.Volt, quantity.Volt) + " after " + seconds(l.Seconds)
	}
	if text == "" {
		return ""
	}
	return "Below " + text + " at the latest. "
}

// heldText says what a store can hold, and what a reading adds to it.
func heldText(d StoreDischarge) string {
	s, text := d.Store, ""
	if s.Capacitance.Basis != None {
		text = ", " + s.energyText()
		if s.assumed() {
			text += ", worst case assumed"
		}
	}
	if u := d.Uneven; u != nil {
		text += "; out of balance at " + format(u.Volt, quantity.Volt) + ", the whole bus, " + format(u.EnergyJ, quantity.Joule)
	}
	if s.Expected.Basis != None {
		text += "; it was " + s.Voltage.Because
	}
	return text
}

// seconds prints a waiting time, rounded up: seconds to two minutes, then whole minutes.
func seconds(t float64) string {
	switch {
	case t <= 0:
		return "0 s"
	case t < 1:
		return "1 s"
	case t <= 120:
		return fmt.Sprintf("%.0f s", math.Ceil(t))
	}
	return fmt.Sprintf("%.0f min", math.Ceil(t/60))
}
