package main

import (
	"errors"
	"fmt"
	"slices"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/meter"
	"drivemend/measure/quantity"
)

// testID names the step of a test at its place.
func testID(c diagnose.Candidate) string {
	return strings.TrimRight("test "+c.Test.ID+" "+c.Part+c.Position, " ")
}

// expectedKeys are the board values that named expected readings rest on.
var expectedKeys = map[string]string{"expected.gate_bleed": "gate.pull_down"}

// testOrKey gives the step of a test, or first the board value its readings are compared with.
func (s *session) testOrKey(c diagnose.Candidate) func() *step {
	for _, r := range c.Test.Results {
		if key := expectedKeys[r.Expected]; key != "" && s.openValue(key) != "" && !s.putOff["value "+key] {
			return func() *step { return s.valueStep(key) }
		}
	}
	return func() *step { return s.testStep(c) }
}

// uncompared names the board value that the readings of a test are compared with and that is not stated, "" for none.
func uncompared(b measure.Board, t *knowledge.Test, lifted bool) string {
	for _, r := range t.Results {
		if r.Expected == "" {
			continue
		}
		if _, ok, err := meter.Expected(b, r.Expected, meter.Place{Parallel: 1, Lifted: lifted}); !ok || err != nil {
			return expectedKeys[r.Expected]
		}
	}
	return ""
}

// testStep asks one test at its place.
func (s *session) testStep(c diagnose.Candidate) *step {
	t, w := c.Test, diagnose.WorkOf(c.Test)
	q := ask.Question{Title: t.Title, Place: s.placeOf(c), Ask: t.Ask, Choices: s.results(t),
		Asides: []ask.Aside{s.heldText(w, t.Title, t.How), s.text("why", "why this is asked", whyTest(c))}}
	if s.given() >= firstRanking {
		q.Asides = append(q.Asides, s.rankingAside())
	}
	if t.Unit != "" {
		q.Free = "a reading in " + unitWord(t.Unit)
		if t.Unit == quantity.Ohm || t.Unit == quantity.Volt {
			q.Free += " or OL"
		}
		q.Check = func(text string) error { return readable(t, text) }
		if missing := uncompared(s.file.Case.Board, t, c.Lifted); missing != "" {
			q.Lines = append(q.Lines, "A reading is kept all the same; it counts once board."+missing+" is stated.")
		}
	}
	for _, id := range t.Cautions {
		if caution := s.base.Caution(id); caution != nil {
			q.Lines = append(q.Lines, "! "+s.cautionText(id, caution.Text))
		}
	}
	q.Lines = append(q.Lines, s.carried(w)...)
	if w.Need != safety.NeedQuestion {
		q.Lines = append(q.Lines, s.joules()...)
	}
	return &step{testID(c), func() (ask.Kind, error) { return s.test(c, q) }}
}

// cautionText is a caution in full the first time it stands in a session, and its first sentence from then on: what
// is read ten times over is not read.
func (s *session) cautionText(id, text string) string {
	if first, _, more := strings.Cut(text, ". "); more && s.told["caution "+id] {
		return first + "."
	}
	s.told["caution "+id] = true
	return text
}

// readable tells what is wrong with a typed reading.
func readable(t *knowledge.Test, text string) error {
	_, err := answerTo(t, text)
	if f, ok := err.(*failure); ok {
		return fmt.Errorf("%s. %s", f.message, strings.Join(f.hints, ". "))
	}
	return err
}

func unitWord(u quantity.Unit) string {
	if u == quantity.Ratio {
		return "parts of the right value (1.02)"
	}
	return string(u)
}

// placeOf says where a test is taken.
func (s *session) placeOf(c diagnose.Candidate) string {
	if c.Part != "" && c.Lifted {
		return c.Part + ", one lead lifted"
	}
	for _, p := range s.file.Case.Board.Positions() {
		if p.Name != c.Position {
			continue
		}
		if len(p.Parts) > 1 {
			return p.Name + ", " + strings.Join(p.Parts, " ") + " in circuit: one reading for all"
		}
		return p.Name + ", " + p.Parts[0]
	}
	return c.Part
}

// joules is the energy of this board, to stand beside a step that touches it.
func (s *session) joules() []string {
	plan, err := s.chain.discharge(s.clock())
	if err != nil {
		return nil
	}
	return []string{"! this board can hold up to " + quantity.Format(max(plan.TotalEnergyJ, plan.WorstEnergyJ), quantity.Joule) + "; it is " + s.deadWords() + "."}
}

func (s *session) deadWords() string {
	st := s.status()
	if p := soonest(st); st.Dead && p != nil {
		return "proved dead until " + p.ExpiresAt.Format("15:04")
	}
	return "NOT proved dead"
}

// results are the answers a test offers, with what they look like; patterns that this board cannot show are left out.
func (s *session) results(t *knowledge.Test) []ask.Choice {
	var out []ask.Choice
	patterns := diagnose.Shows(s.file.Case.Board)
	for _, r := range t.Results {
		if t.PatternOf != "" && !slices.Contains(patterns, r.ID) {
			continue
		}
		means := r.Means
		if r.Times > 0 && r.Expected == "" {
			means = "about " + quantity.Format(r.Median, t.Unit) + ". " + means
		}
		out = append(out, ask.Choice{Word: r.ID, Means: means})
	}
	return out
}

// whyTest says why a test is asked now.
func whyTest(c diagnose.Candidate) string {
	text := fmt.Sprintf("It takes %.0f min.", c.Minutes)
	switch {
	case c.Value > 0:
		text += fmt.Sprintf(" On average it saves %.0f min of wrong repairs and comebacks beyond that, and tells %.2f bit about the cause.", c.Value, c.Bits)
	case c.Test.Must:
		text += " It has to be done before a rebuild is called good."
	case c.Test.Needs == string(safety.NeedQuestion):
		text += " It is asked first, while memories are fresh."
	}
	return text
}

// test asks, keeps what was said, and says how it was read. The hold points are checked again with the clock before
// the instruction stands on the screen.
func (s *session) test(c diagnose.Candidate, q ask.Question) (ask.Kind, error) {
	w := diagnose.WorkOf(c.Test)
	if pass, kind, err := s.gate(w, c.Test.Title); !pass {
		return kind, err
	}
	surface, kind, err := s.surface(c.Test, &q)
	if err != nil || kind != ask.Given {
		return kind, err
	}
	if ok, err := s.powerOn(w); !ok {
		return ask.Later, err
	}
	fmt.Fprintln(s.out)
	s.say(s.standing())
	answer, err := s.put(q)
	if answer.Kind != ask.Given || err != nil {
		err = errors.Join(s.leftCharged(w), err)
	}
	if err != nil || answer.Kind == ask.Back || answer.Kind == ask.Quit || answer.Kind == ask.Moved {
		return answer.Kind, err
	}
	o, err := s.observation(c, answer)
	if err != nil {
		return ask.Later, err
	}
	o.Surface = surface
	ok, err := s.keep(func(f *measure.File) error { return f.Observe(o) })
	if err != nil || !ok {
		return ask.Later, err
	}
	if answer.Kind == ask.Given {
		s.sayRead(c, o)
		return answer.Kind, s.alsoKey(c.Test, o.Result)
	}
	return answer.Kind, nil
}

// sayRead says how an observation was taken, and what it leaves to be done.
func (s *session) sayRead(c diagnose.Candidate, o measure.Observation) {
	s.say("  read as " + echo(c.Test, s.file.Case.Board, o))
	for _, line := range s.chain.served() {
		s.say("  " + line)
	}
	for _, line := range s.chain.afterwards(s.ranked) {
		s.say("  ! " + line)
	}
	if missing := uncompared(s.file.Case.Board, c.Test, c.Lifted); missing != "" && o.Reading != nil {
		s.say("  ! to make it count: more, then value, then " + missing + " and the resistor that is fitted")
	}
	if diagnose.WorkOf(c.Test).Energises() {
		s.resume("isolation", "stands", "link", "check ")
		s.say("  ! energy was put in: isolation and every dead check before are over; they are asked again before the next step at a dead board.")
	}
}

// surfaces are what a camera can look at.
var surfaces = []ask.Choice{{Word: "matt-dot", Means: "a dot of matt paint"}, {Word: "tape", Means: "a piece of tape that has taken the temperature"},
	{Word: "moulded", Means: "the plastic of the part"}, {Word: "painted", Means: "paint or solder mask"},
	{Word: "bare-metal", Means: "looks colder than it is: the reading is kept as a lower bound"}}

// surface asks what a camera will look at, before it is warm and under power; "" for every other instrument. Bare metal
// and a surface that is not stated give a lower bound, which is said beside the question.
func (s *session) surface(t *knowledge.Test, q *ask.Question) (string, ask.Kind, error) {
	if t.Instrument != "camera" {
		return "", ask.Given, nil
	}
	answer, err := s.put(ask.Question{Title: t.Title, Ask: "What does the camera look at?", Choices: surfaces,
		Lines: []string{"Put a matt dot or tape on metal now, while nothing is switched on."}})
	if err != nil || answer.Kind != ask.Given && answer.Kind != ask.Skipped {
		return "", answer.Kind, err
	}
	if answer.Text == "" || answer.Text == "bare-metal" {
		s.say("  ! A lower bound: the surface is at least as warm as the camera shows, and may be much hotter.")
		q.Lines = append(q.Lines, "! What the camera shows is kept as a lower bound: the metal may be much hotter.")
	}
	return answer.Text, ask.Given, nil
}

// alsoKey offers to keep as a value of the board what an answer has just said of it: a missing snubber is a network of
// kind none. Where the answer leaves several values open, the value is asked next.
func (s *session) alsoKey(t *knowledge.Test, result string) error {
	if t.AnsweredBy == nil || result == "" {
		return nil
	}
	key := strings.TrimPrefix(t.AnsweredBy.Path, "board.")
	k, known := measure.LookupKey("board." + key)
	if !known || !s.open("value "+key) {
		return nil
	}
	var fits []string
	for _, w := range k.Words {
		if t.AnsweredBy.Results[w] == result {
			fits = append(fits, w)
		}
	}
	switch len(fits) {
	case 0:
		return nil
	case 1:
		return s.offerKey(key, fits[0])
	}
	delete(s.putOff, "value "+key)
	s.wanted = append([]string{"value " + key}, s.wanted...)
	return nil
}

// offerKey asks whether a value follows from the answer before.
func (s *session) offerKey(key, word string) error {
	q := ask.Question{Title: "Board value", Ask: "Shall board." + key + ": " + word + " be kept as well? The figures of the edge read it.", Choices: yesNo}
	text, ok, err := s.said(q)
	if !ok || text != "yes" {
		return err
	}
	ok, err = s.keep(func(f *measure.File) error { return f.SetBoard(key, word) })
	if ok {
		s.say("  kept: board." + key + ": " + word)
	}
	return err
}

// observation makes an entry of an answer.
func (s *session) observation(c diagnose.Candidate, answer ask.Answer) (measure.Observation, error) {
	o := measure.Observation{Test: c.Test.ID}
	switch answer.Kind {
	case ask.Skipped:
		o.Answer = "skipped"
	case ask.Later:
		o.Answer = "later"
	default:
		var err error
		if o, err = answerTo(c.Test, answer.Text); err != nil {
			return o, err
		}
		if c.Test.Instrument == "question" && c.Test.PatternOf == "" {
			o.Seen = "on-arrival" // what happened is told by others
		}
		if c.Test.Instrument == "meter" && c.Test.Per == "part" {
			o.State = "in-circuit"
		}
	}
	if c.Lifted {
		o.State = "lifted"
	}
	o.Part, o.Position, o.At = c.Part, c.Position, s.clock()
	return o, nil
}
