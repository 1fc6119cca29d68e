package main

import (
	"errors"
	"fmt"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/measure"
)

// put asks a question at which everything else that can be entered is one word away.
func (s *session) put(q ask.Question) (ask.Answer, error) {
	q.Asides = append(q.Asides, ask.Aside{Word: "more", Means: "link, isolation, steps, story, rebuild, board values, outcome", Do: s.more})
	return s.asker.Ask(q)
}

// more offers what is entered at any time of the job, whatever question stands.
func (s *session) more() error {
	answer, err := s.asker.Ask(ask.Question{Title: "More", Ask: "What shall be entered?", NoSkip: true,
		Choices: []ask.Choice{
			{Word: "isolation", Means: "state it anew"},
			{Word: "dead-check", Means: "take up the dead checks that were put off"},
			{Word: "link", Means: "a shorting link was fitted or taken off"},
			{Word: "energised", Means: "a source, a powered step or a turned shaft put energy in"},
			{Word: "step", Means: "a step of the record: pictures, fault memory, tests before connecting"},
			{Word: "story", Means: "what happened, in the owner's words"},
			{Word: "value", Means: "a value of the board, by its key"},
			{Word: "rebuild", Means: "a value of the rebuild that was chosen, by its key"},
			{Word: "outcome", Means: "how the case ended, by its key"},
		}})
	switch {
	case err != nil:
		return err
	case answer.Kind == ask.Quit:
		return errStopped
	case answer.Kind != ask.Given:
		return nil
	}
	return s.enterMore(answer.Text)
}

func (s *session) enterMore(word string) error {
	switch word {
	case "isolation":
		s.resume("isolation", "stands")
		s.jump = s.isolationStep
		return nil
	case "dead-check":
		s.resume("isolation", "stands", "link", "check ")
		if id := s.unlocking(); id != "" {
			s.jump = s.stepNamed(id)
			return nil
		}
		s.say("Every store of energy is proved dead at this moment.")
		return nil
	case "step":
		next, err := s.chooseRecord()
		s.jump = next
		return err
	case "link":
		return s.enterLink()
	case "energised":
		return s.enterEnergised()
	case "story":
		return s.enterStory()
	case "rebuild":
		return s.enterKeyed("rebuild", "", "snubber.kind rc")
	case "outcome":
		return s.enterKeyed("outcome", "Keys: faults, parts, stress, causes (ids of the ranking), confirmed_by, closed.", "causes clamp-missing")
	}
	return s.enterKeyed("board", "", "gate.pull_down 10k")
}

// said is the answer to a question of the menu; ok is false when there is none. Quit ends the session.
func (s *session) said(q ask.Question) (text string, ok bool, err error) {
	answer, err := s.asker.Ask(q)
	if err == nil && answer.Kind == ask.Quit {
		err = errStopped
	}
	return answer.Text, err == nil && answer.Kind == ask.Given, err
}

func (s *session) enterLink() error {
	text, ok, err := s.said(ask.Question{Title: "Shorting link", Ask: "Is it on or off now? Type the whole word.", Danger: true,
		Choices: []ask.Choice{{Word: "fitted", Means: "it is on: no meter step is given"}, {Word: "removed", Means: "it is off: every store is checked again"}}})
	if !ok {
		return err
	}
	_, err = s.keep(func(f *measure.File) error {
		if text == "fitted" {
			return fitLink(f, s.clock())
		}
		return f.RemoveLink(s.clock())
	})
	s.resume("link", "check ")
	return err
}

func (s *session) enterEnergised() error {
	text, ok, err := s.said(ask.Question{Title: "Energy put in", Ask: "What put energy into the board, or may have?", Danger: true,
		Choices: []ask.Choice{{Word: "source", Means: "a source was connected"}, {Word: "powered-step", Means: "it was powered for a test"},
			{Word: "shaft", Means: "the motor was turned"}}})
	if !ok {
		return err
	}
	ok, err = s.keep(func(f *measure.File) error { return f.Energise(measure.Energised{What: text, At: s.clock()}) })
	if ok {
		s.resume("isolation", "check ")
		s.say("Kept. The isolation and every dead check before are over.")
	}
	return err
}

func (s *session) enterStory() error {
	q := ask.Question{Title: "Story", Ask: "What happened, in the owner's words?", Free: "one line",
		Check: func(text string) error { return s.tried("story", text) }}
	if s.file.Case.Story != "" {
		q.Lines = []string{"So far: " + s.file.Case.Story, "What is typed now takes its place."}
	}
	text, ok, err := s.said(q)
	if !ok {
		return err
	}
	_, err = s.keep(func(f *measure.File) error { return f.SetStory(text) })
	return err
}

// enterKeyed asks for a key below a head and its value, in one line.
func (s *session) enterKeyed(head, line, sample string) error {
	q := ask.Question{Title: strings.ToUpper(head[:1]) + head[1:], Ask: "Which key, and what is its value?", Free: "KEY VALUE, such as " + sample,
		Check: func(text string) error {
			key, value, err := s.keyed(head, text)
			if err != nil {
				return err
			}
			return s.tried(key, value)
		}}
	if line != "" {
		q.Lines = []string{line}
	}
	text, ok, err := s.said(q)
	if !ok {
		return err
	}
	key, value, err := s.keyed(head, text)
	if err != nil {
		return err
	}
	ok, err = s.keep(func(f *measure.File) error { return f.Set(key, value) })
	if ok {
		s.say(fmt.Sprintf("  kept: %s: %s", key, value))
	}
	return err
}

// keyed reads a key and its value from one line. The head may be typed as well or left out.
func (s *session) keyed(head, text string) (key, value string, err error) {
	key, value, _ = strings.Cut(strings.TrimSpace(text), " ")
	key, value = strings.TrimSuffix(strings.TrimSpace(key), ":"), strings.TrimSpace(value)
	if value == "" {
		return "", "", errors.New("type a key, a blank and its value; drivemend keys lists the keys")
	}
	if key = strings.ToLower(key); !strings.HasPrefix(key, head+".") {
		key = head + "." + strings.TrimPrefix(key, "board.")
	}
	k, ok := measure.LookupKey(key)
	if !ok {
		hint := ""
		if near := measure.NearestKey(key); near != "" {
			hint = "; the nearest is " + near
		}
		return "", "", fmt.Errorf("there is no key %s%s", key, hint)
	}
	value, err = keyText(s.file.Case.Board, key, withUnit(k, value))
	return key, value, err
}
