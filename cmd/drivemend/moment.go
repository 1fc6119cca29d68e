package main

import (
	"fmt"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/measure"
)

// moment is the time that --at names; without it the time now, to the second.
func (a *app) moment() (time.Time, error) {
	if a.at == "" {
		return a.env.now().Truncate(time.Second), nil
	}
	t, err := time.Parse(time.RFC3339, a.at)
	if err != nil {
		return t, wrongCommand(fmt.Sprintf("--at %q is no time", a.at), "write date, time and offset: "+a.began.Format(time.RFC3339))
	}
	return t, nil
}

// stamp is the time of something that is entered: it has happened, so it does not lie ahead of the clock.
func (a *app) stamp() (time.Time, error) {
	at, err := a.moment()
	if err == nil && at.After(a.env.now()) {
		return at, wrongInput("--at "+a.at+" lies in the future: the clock of this computer says "+a.env.now().Format(time.RFC3339),
			"give the time at which it was done, or set the clock right; nothing was changed")
	}
	return at, err
}

// notBefore refuses an entry from before the day on which its case was opened.
func notBefore(c *measure.Case, at time.Time) error {
	if !beforeOpened(c, at) {
		return nil
	}
	return wrongInput(fmt.Sprintf("%s lies before %s, the day on which this case was opened", at.Format(time.RFC3339), c.Opened.Format(time.DateOnly)),
		"give the time at which it was done, or correct opened in the case file; nothing was changed")
}

func beforeOpened(c *measure.Case, at time.Time) bool {
	return !c.Opened.IsZero() && at.Format(time.DateOnly) < c.Opened.Format(time.DateOnly)
}

// remark says on standard error that a question is answered for a moment at which nobody can have asked it.
func (a *app) remark(c *measure.Case, at time.Time) {
	switch {
	case at.After(a.env.now()):
		fmt.Fprintf(a.err, "drivemend: note: %s lies in the future: the clock of this computer says %s\n", at.Format(time.RFC3339), a.env.now().Format(time.RFC3339))
	case beforeOpened(c, at):
		fmt.Fprintf(a.err, "drivemend: note: %s lies before %s, the day on which this case was opened\n", at.Format(time.RFC3339), c.Opened.Format(time.DateOnly))
	}
}

// mostPast is how far --at may lie before the clock and still be now: the time it takes to type it. Judgement.
const mostPast = time.Minute

// asItStood is the line that stands above everything that is shown for a moment that is over: what was allowed then is
// no leave to do it now. "" for a moment that is now, or ahead.
func (a *app) asItStood(at time.Time) string {
	before := a.env.now().Sub(at)
	if a.at == "" || before <= mostPast {
		return ""
	}
	return fmt.Sprintf("AS IT STOOD at %s, %s before this computer's clock: no leave to do anything now.", at.Format("2006-01-02 15:04"), lasting(before))
}

// sayAsItStood prints that line first of all. Where the output is one JSON object it goes to standard error.
func (a *app) sayAsItStood(at time.Time) {
	line := a.asItStood(at)
	switch {
	case line == "":
	case a.asJSON:
		fmt.Fprintln(a.err, "drivemend: "+line)
	default:
		for _, part := range ask.Wrapped(line, "", "  ", a.columns()) {
			fmt.Fprintln(a.out, part)
		}
	}
}

// lasting is a time span in words, rounded down: 8 min, 3 h 20 min, 29 days.
func lasting(d time.Duration) string {
	switch m := int(d.Minutes()); {
	case m < 60:
		return fmt.Sprintf("%d min", m)
	case m < 48*60:
		return fmt.Sprintf("%d h %d min", m/60, m%60)
	default:
		return fmt.Sprintf("%d days", m/60/24)
	}
}

// patience is how long a computation may take before something is said of it.
const patience = time.Second

// slowly runs a computation and says on standard error what is being worked out when it takes long.
func (a *app) slowly(what string, work func() error) error {
	done, said := make(chan struct{}), make(chan struct{})
	go func() {
		defer close(said)
		select {
		case <-done:
		case <-time.After(patience):
			fmt.Fprintf(a.err, "working out %s …\n", what)
		}
	}()
	err := work()
	close(done)
	<-said
	return err
}
