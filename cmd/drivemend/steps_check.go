package main

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// readCheck asks DC and AC, which may be typed in one line, and then the proof of the meter, always by itself.
func (s *session) readCheck(p safety.PointStatus, plan *safety.Plan, d *measure.DeadCheck) (ask.Kind, error) {
	st := p.Store
	lines := checkLines(st, plan)
	if st.ToCheck {
		lines = append(lines, "Only if this board has it: "+st.Because+".")
	}
	if p.Last != nil {
		lines = append(lines, "The last check was at "+p.Last.At.Format("15:04")+".")
	}
	asides := []ask.Aside{s.text("how", "how it is done", "Prove the meter on a known DC source first. Then read DC and AC at the place named, and prove the meter again on the same source. If the store cannot be reached, say so with ? and leave ohms alone."),
		s.text("why", "why this is asked", "An ohmmeter on a charged capacitor kills the meter and may kill you; a bank recovers voltage by itself, so a check speaks for 10 minutes. The rails can read zero while half of a split bank is charged.")}
	if plan != nil {
		asides = append(asides, s.planAside(plan))
	}
	for {
		answer, err := s.put(ask.Question{Title: "DEAD CHECK at " + st.Point, Place: st.Title, Lines: lines, Ask: "What does the meter show, DC?",
			Free: "volts DC, or DC and AC at once, such as 212 0.3", Danger: true, Asides: asides, Choices: notFittedChoice(st),
			Check: func(text string) error { _, err := checkReadings(text); return err }})
		if err != nil || answer.Kind != ask.Given {
			return answer.Kind, err
		}
		if answer.Text == notFitted {
			return s.notFitted(st)
		}
		read, err := checkReadings(answer.Text)
		if err != nil {
			return ask.Later, err
		}
		s.warnLive(st.Point, read...)
		d.DC = read[0]
		if len(read) > 1 {
			d.AC = read[1]
		}
		kind, err := s.restOfCheck(st, d)
		if kind == ask.Back && err == nil {
			d.DC, d.AC = quantity.Quantity{}, quantity.Quantity{}
			continue
		}
		return kind, err
	}
}

// restOfCheck asks what the first line of a check left open.
func (s *session) restOfCheck(st safety.Store, d *measure.DeadCheck) (ask.Kind, error) {
	if d.AC.Unit == "" {
		answer, err := s.asker.Ask(ask.Question{Title: "DEAD CHECK at " + st.Point, Ask: "And AC?", Free: "volts AC", Danger: true,
			Check: func(text string) error { _, err := volts("AC", text); return err }})
		if err != nil || answer.Kind != ask.Given {
			return answer.Kind, err
		}
		if d.AC, err = volts("AC", answer.Text); err != nil {
			return ask.Later, err
		}
		s.warnLive(st.Point, d.AC)
	}
	answer, err := s.asker.Ask(ask.Question{Title: "DEAD CHECK at " + st.Point, Choices: yesNo, Danger: true,
		Lines: []string{"Before answering: prove the meter again now, after the reading, on the same known source as before it."},
		Ask:   "Did it read that source right both before and after the reading? Type yes only if both were done."})
	if err != nil || answer.Kind != ask.Given {
		return answer.Kind, err
	}
	d.MeterProved = answer.Text == "yes"
	return ask.Given, nil
}

// checkLines are the steps at one store, from the plan of this board.
func checkLines(st safety.Store, plan *safety.Plan) []string {
	lines := []string{"Prove the meter on a known source first, and again after the last reading, before the proof is asked."}
	if plan != nil {
		for _, step := range plan.Steps {
			if step.Point == st.Point {
				text := strings.TrimPrefix(strings.TrimPrefix(step.Text, st.Title), " (if fitted)")
				lines = append(lines, strings.TrimPrefix(text, ": "))
			}
		}
	}
	if len(lines) == 1 {
		lines = append(lines, "Measure "+st.Where+". It can stand at "+st.Voltage.String()+".")
	}
	return append(lines, "Enter what it reads with shorting link and resistor taken off.")
}

var (
	oneVoltage   = regexp.MustCompile(`[-+]?(\d+\.?\d*|\.\d+)\s*([mkµu]?[vV])?\b`)
	decimalComma = regexp.MustCompile(`\d,\d`)
)

// checkReadings reads what was typed for a dead check: DC, then AC if it is there. The proof of the meter is never
// taken from the same line: what is asked by itself is thought of.
func checkReadings(text string) (read []quantity.Quantity, err error) {
	if decimalComma.MatchString(text) {
		return nil, errors.New("a comma between digits can be read in two ways; write 212.5 with a point, and a blank between DC and AC")
	}
	for _, one := range oneVoltage.FindAllString(text, -1) {
		q, err := volts("reading", strings.Replace(one, "v", "V", 1))
		if err != nil {
			return nil, errors.New(err.Error())
		}
		read = append(read, q)
	}
	rest := strings.FieldsFunc(oneVoltage.ReplaceAllString(text, " "), func(r rune) bool { return strings.ContainsRune(" ,;/\t", r) })
	for _, w := range rest {
		switch strings.ToLower(w) {
		case "dc", "ac", "and":
		case "yes", "no", "proved":
			return nil, errors.New("type the voltages only; the proof of the meter is asked by itself after them")
		default:
			return nil, fmt.Errorf("%q is not understood here; type volts DC, or DC and AC, such as 212 0.3", w)
		}
	}
	if len(read) == 0 || len(read) > 2 {
		return nil, errors.New("type one or two voltages: DC, or DC and AC, such as 212 0.3")
	}
	return read, nil
}

// warnLive says at once, before anything else is asked, that what was just read is not dead.
func (s *session) warnLive(point string, read ...quantity.Quantity) {
	for _, q := range read {
		v := math.Abs(q.Value)
		switch {
		case v >= safety.LiveVolts:
			s.say("")
			s.say(fmt.Sprintf("!! LIVE: %s at %s. HANDS OFF; touch nothing and connect nothing but the discharge resistor. Is a source still on?", q, point))
			s.say("!! Then discharge it and read again. This reading is kept and proves nothing dead.")
		case v > safety.DeadVolts:
			s.say("")
			s.say(fmt.Sprintf("! NOT DEAD: %s at %s, above %s. Leave ohms alone: discharge further and read again. This reading is kept.",
				q, point, quantity.Format(safety.DeadVolts, quantity.Volt)))
		}
	}
}

// notFitted is the answer at a store that the case neither states nor rules out, when the board has none.
const notFitted = "not-fitted"

// absence is the board value that says of a store that it is not there.
var absence = map[string]struct{ key, value string }{
	safety.PointUpperHalf: {"bus.halves", "no"}, safety.PointLowerHalf: {"bus.halves", "no"},
	safety.PointFused: {"bus.fuse", "none"}, safety.PointReservoir: {"bus.reservoir", "none"},
	safety.PointBrake: {"stages.brake.fitted", "no"}, safety.PointAuxiliary: {"stages.auxiliary.fitted", "no"},
}

// notFittedChoice offers that answer where it can be given.
func notFittedChoice(st safety.Store) []ask.Choice {
	if !st.ToCheck {
		return nil
	}
	if st.Point == safety.PointPhases {
		return []ask.Choice{{Word: notFitted, Means: "no motor: what the board drives is asked next"}}
	}
	a, ok := absence[st.Point]
	if !ok {
		return nil
	}
	return []ask.Choice{{Word: notFitted, Means: "you have looked and this board has none; kept as board." + a.key + ": " + a.value}}
}

// notFitted keeps that a store is not there.
func (s *session) notFitted(st safety.Store) (ask.Kind, error) {
	if st.Point == safety.PointPhases {
		return s.valueStep("load.kind").run()
	}
	a := absence[st.Point]
	if capacitance := "stages.auxiliary.primary_capacitance"; st.Point == safety.PointAuxiliary && s.file.Case.Board.Stated(capacitance) {
		a.key, a.value = capacitance, "none" // stated as unknown, which speaks before fitted
	}
	ok, err := s.keep(func(f *measure.File) error { return f.SetBoard(a.key, a.value) })
	if err != nil || !ok {
		return ask.Later, err
	}
	s.say("  kept: board." + a.key + ": " + a.value)
	return ask.Given, nil
}
