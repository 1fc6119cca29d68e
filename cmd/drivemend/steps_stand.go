package main

import (
	"fmt"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// held tells whether the board counts as isolated by an earlier session only: until somebody has looked and said that
// it still stands, nothing at the board is asked for.
func (s *session) held() bool { return !s.stands && s.status().Isolation.Isolated }

// standStep asks at a resume whether the isolation on record still stands.
func (s *session) standStep() *step {
	return &step{"stands", func() (ask.Kind, error) {
		i := s.status().Isolation
		if !i.Isolated || i.Last == nil {
			return s.isolationStep().run()
		}
		answer, err := s.put(ask.Question{Title: "MAKE SAFE: does the isolation still stand?", Danger: true,
			Lines: []string{s.isolationOnRecord(i), "Go and look at each of them now. Others may have been at the board meanwhile."},
			Ask:   "Does all of it still stand? Type yes only if you have looked.",
			Choices: []ask.Choice{{Word: "yes", Means: "lock, motor and every other source are as stated"},
				{Word: "no", Means: "or not sure: it is stated anew"}}})
		switch {
		case err != nil:
			return answer.Kind, err
		case answer.Kind == ask.Skipped || answer.Kind == ask.Later:
			s.say("Until that is said no discharge, no dead check and no meter step is given. Questions go on.")
			return answer.Kind, nil
		case answer.Kind != ask.Given:
			return answer.Kind, nil
		case answer.Text == "yes":
			return s.confirmed(*i.Last)
		}
		return s.broken(*i.Last)
	}}
}

// isolationOnRecord is what was stated, and how long ago.
func (s *session) isolationOnRecord(i safety.IsolationStatus) string {
	lock := "lock on"
	if !i.Last.Locked {
		lock = "not locked"
	}
	return fmt.Sprintf("Isolated since %s (%s): %s, motor %s, other sources: %s.", i.Since.Format("2006-01-02 15:04"),
		ago(s.clock().Sub(i.Last.At)), lock, i.Last.Motor, i.Last.OtherSources)
}

// ago says how old something is.
func ago(d time.Duration) string {
	if d < time.Minute {
		return "stated just now"
	}
	return "stated " + lasting(d) + " ago"
}

// confirmed keeps the isolation as stated again now.
func (s *session) confirmed(last measure.Isolation) (ask.Kind, error) {
	if s.clock().After(last.At) {
		last.At = s.clock()
		if ok, err := s.keep(func(f *measure.File) error { return f.Isolate(last) }); err != nil || !ok {
			return ask.Later, err
		}
	}
	s.stands = true
	return ask.Given, nil
}

// broken keeps that a source may have been back, which ends isolation and dead checks, and asks for a new isolation.
func (s *session) broken(last measure.Isolation) (ask.Kind, error) {
	at := s.clock()
	if before := at.Add(-time.Second); !before.Before(last.At) {
		at = before // an isolation that is stated within this second comes after it
	}
	ok, err := s.keep(func(f *measure.File) error { return f.Energise(measure.Energised{What: "source", At: at}) })
	if err != nil || !ok {
		return ask.Later, err
	}
	s.say("Kept: a source may have been connected. The isolation and every dead check before are over.")
	return s.isolationStep().run()
}
