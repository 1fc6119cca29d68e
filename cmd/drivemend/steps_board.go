package main

import (
	"errors"
	"fmt"
	"strconv"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// openValue names the step of a board value while it is not stated.
func (s *session) openValue(key string) string {
	if s.file.Case.Board.Stated(key) {
		return ""
	}
	return "value " + key
}

// open tells whether a step that was asked for is still to be done. A value that was not known may be known now.
func (s *session) open(id string) bool {
	key, ok := strings.CutPrefix(id, "value ")
	return !ok || !s.file.Case.Board.Stated(key) || s.file.Case.Board.Unknown(key)
}

// valueWords says in the technician's words what a value of the first five minutes is for.
var valueWords = map[string]struct{ title, ask, why string }{
	"supply":           {"Supply", "What feeds the bus?", "It decides which stores of energy have to be checked, and how often which cause is met."},
	"bus.nominal":      {"Bus voltage", "What is the working voltage of the DC bus?", "It gives the energy on this board. Not known: the worst case is taken and shown."},
	"bus.capacitance":  {"Bus capacitance", "What is the capacitance of the bus, all its capacitors together?", "It gives the energy on this board. Not known: the worst case is taken and shown."},
	"topology":         {"Topology", "How are the switches arranged?", "It decides which causes can be there at all, and where the readings are taken."},
	"switch.kind":      {"Kind of switch", "What are the switches?", "It decides which causes can be there at all."},
	"history":          {"History of the board", "Was it repaired before?", "A board that failed after a repair has other likely causes than one that failed for the first time."},
	"gate.pull_down":   {"Gate bleed", "What is the resistor from gate to emitter or source, at one part?", "A sound gate shows this resistor, divided by the number in parallel. Without it the reading cannot be compared."},
	"snubber.kind":     {"Snubber", "What network is at the switch?", "The edge is worked out with it."},
	"board.load.kind":  {"Load", "What does the board drive?", "A motor that turns makes voltage."},
	"switch.fall_time": {"Fall time", "What current fall time does the data sheet of the switch state?", "The faster the current falls, the higher the peak."},
}

// valueStep asks for one value of the board.
func (s *session) valueStep(key string) *step {
	k, ok := measure.LookupKey("board." + key)
	if !ok {
		return nil
	}
	q := s.valueQuestion(k)
	return &step{"value " + key, func() (ask.Kind, error) { return s.value(key, k, q) }}
}

// valueQuestion is how a value of the board is asked for.
func (s *session) valueQuestion(k measure.Key) ask.Question {
	key := k.Board()
	q := ask.Question{Title: keyTitle(k), Ask: "What is it on this board?"}
	why := "It is used for: " + strings.Join(k.Users, ", ") + "."
	if w, ok := valueWords[key]; ok {
		q.Title, q.Ask, why = w.title, w.ask, w.why
	}
	q.Asides = []ask.Aside{s.text("how", "how it is written", keyHelp(k)), s.text("why", "why this is asked", why)}
	if s.ranked != nil && s.given() >= firstRanking {
		q.Asides = append(q.Asides, s.rankingAside())
	}
	for _, w := range k.Words {
		q.Choices = append(q.Choices, ask.Choice{Word: w})
	}
	if k.Kind == measure.KindYesNo && len(k.Words) == 0 {
		q.Choices = append(q.Choices, yesNo...)
	}
	if k.Kind != measure.KindWord && k.Kind != measure.KindYesNo {
		q.Free = "a value" + sampleOf(k)
		q.Check = func(text string) error { return s.tried("board."+key, withUnit(k, text)) }
	}
	return q
}

// keyTitle is what a key is, with its group in front: "load: running current".
func keyTitle(k measure.Key) string {
	help := strings.TrimPrefix(k.Help, "its ")
	path := strings.Split(strings.TrimSuffix(k.Board(), ".value"), ".")
	if len(path) < 2 {
		return help
	}
	group := strings.ReplaceAll(strings.Join(path[:len(path)-1], " "), "_", " ")
	return strings.TrimPrefix(group, "stages ") + ": " + help
}

// value asks for a board value until it is taken. That it is not known is kept as well, so that it is not asked at
// every session.
func (s *session) value(key string, k measure.Key, q ask.Question) (ask.Kind, error) {
	for {
		answer, err := s.put(q)
		if err == nil && answer.Kind == ask.Skipped && k.MayBeUnknown && !s.file.Case.Board.Stated(key) {
			_, err = s.keep(func(f *measure.File) error { return f.SetBoard(key, "unknown") })
		}
		if err != nil || answer.Kind != ask.Given {
			return answer.Kind, err
		}
		ok, err := s.keep(func(f *measure.File) error { return f.SetBoard(key, withUnit(k, answer.Text)) })
		if err != nil {
			return ask.Later, err
		}
		if !ok {
			continue
		}
		if q, stated := s.file.Case.Board.Quantity(key); stated && k.Kind == measure.KindQuantity {
			s.say("  read as " + q.String())
		}
		return ask.Given, nil
	}
}

// tried tells what is wrong with a value, without changing the case.
func (s *session) tried(path, text string) error {
	return s.trial(func(f *measure.File) error { return f.Set(path, text) })
}

// trial tells what is wrong with a change, without making it.
func (s *session) trial(change func(f *measure.File) error) error {
	f, err := measure.Parse(s.file.Path, s.file.Bytes())
	if err == nil {
		err = change(f)
	}
	var p measure.Problems
	if errors.As(err, &p) && len(p) > 0 {
		return errors.New(p[0].Message + "; " + p[0].Hint)
	}
	return err
}

// plainUnits are written out in their own unit at the bench, so that a bare number can only mean that.
var plainUnits = map[quantity.Unit]bool{quantity.Volt: true, quantity.Ampere: true, quantity.Ohm: true}

// withUnit puts the unit behind a bare number, where it can only be that one.
func withUnit(k measure.Key, text string) string {
	if plainUnits[k.Unit] && bareNumber.MatchString(strings.TrimSpace(text)) {
		return strings.TrimSpace(text) + " " + string(k.Unit)
	}
	return text
}

// samples are how a value of a unit is written.
var samples = map[quantity.Unit]string{quantity.Volt: "310 V", quantity.Ampere: "20 A", quantity.Ohm: "4k7", quantity.Farad: "2200 µF or 2200uF",
	quantity.Henry: "120 nH", quantity.Second: "96 ns", quantity.Hertz: "16 kHz", quantity.VoltPerSecond: "15 V/ns"}

func sampleOf(k measure.Key) string {
	if text, ok := samples[k.Unit]; ok {
		return ", such as " + text
	}
	if k.Unit != "" {
		return " in " + string(k.Unit)
	}
	return ""
}

// keyHelp is a key in full: what it is, its range, what is typical.
func keyHelp(k measure.Key) string {
	text := k.Path + ": " + k.Help + "."
	if k.Kind == measure.KindQuantity && k.Min != k.Max {
		text += " From " + quantity.Format(k.Min, k.Unit) + " to " + quantity.Format(k.Max, k.Unit) + "."
	}
	for _, t := range k.Typical {
		text += fmt.Sprintf("\ntypical %s: %s (%s)", t.For, t.Text, t.Source)
	}
	return text + "\nA tolerance can stand behind a value: 120 nH ±20 %. Not sure: write it all the same, and name it in the file under assumed."
}

// openParts names the step of the parallel count while no position states its parts.
func (s *session) openParts() string {
	for _, p := range s.file.Case.Board.Positions() {
		if s.file.Case.Board.Stated("positions." + p.Name + ".parts") {
			return ""
		}
	}
	return "parts"
}

// mostParallel bounds what is believed as a number of parallel parts.
const mostParallel = 32

// partsStep asks how many parts are in parallel at each position, or their names where there is one position.
func (s *session) partsStep() *step {
	positions := s.file.Case.Board.Positions()
	q := ask.Question{Title: "Parallel parts", Ask: "How many switches are in parallel at each place?", Free: "a number, such as 3",
		Lines: []string{"The places of this board: " + namesOf(positions) + "."},
		Asides: []ask.Aside{s.text("how", "how it is told", "Count the devices whose power terminals are joined. Modules count as one device a place. The parts are named Q1, Q2 and so on; other names are typed instead of the number when there is one place, or edited in the file."),
			s.text("why", "why this is asked", "One shorted part makes all of its bank read shorted, so the readings are taken bank by bank first. Parallel parts that share badly are a cause of their own.")},
		Check: func(text string) error { _, err := partNames(positions, text); return err }}
	if len(positions) == 1 {
		q.Free = "a number, or the names: Q1 Q2 Q3"
	}
	return &step{"parts", func() (ask.Kind, error) {
		answer, err := s.put(q)
		if err != nil || answer.Kind != ask.Given {
			return answer.Kind, err
		}
		parts, err := partNames(positions, answer.Text)
		if err != nil {
			return ask.Later, err
		}
		ok, err := s.keep(func(f *measure.File) error {
			for i, p := range positions {
				if err := f.SetBoard("positions."+p.Name+".parts", strings.Join(parts[i], ", ")); err != nil {
					return err
				}
			}
			return nil
		})
		if err != nil || !ok {
			return ask.Later, err
		}
		for i, p := range positions {
			s.say("  " + p.Name + ": " + strings.Join(parts[i], ", "))
		}
		return ask.Given, nil
	}}
}

func namesOf(positions []measure.Position) string {
	var names []string
	for _, p := range positions {
		names = append(names, p.Name)
	}
	return strings.Join(names, ", ")
}

// partNames reads a number of parts for each position, or the names of the only position's parts.
func partNames(positions []measure.Position, text string) ([][]string, error) {
	words := strings.FieldsFunc(text, func(r rune) bool { return strings.ContainsRune(" ,;\t", r) })
	if len(words) == 1 {
		if n, err := strconv.Atoi(words[0]); err == nil {
			if n < 1 || n > mostParallel {
				return nil, fmt.Errorf("between 1 and %d parts can be in parallel", mostParallel)
			}
			return numbered(len(positions), n), nil
		}
	}
	if len(positions) != 1 {
		return nil, errors.New("type a number, such as 1; names of their own are written in the file, under board.positions")
	}
	return [][]string{words}, nil
}

// numbered names parts Q1, Q2 and on, n for each position.
func numbered(positions, n int) [][]string {
	out := make([][]string, positions)
	for i := range out {
		for k := range n {
			out[i] = append(out[i], fmt.Sprintf("Q%d", i*n+k+1))
		}
	}
	return out
}
