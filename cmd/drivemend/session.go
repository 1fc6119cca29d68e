package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// session is the guided loop on one case: ask, keep, run the chain, ask what it says. All it knows of the board is in
// the case file; beside that it remembers only what was put off while it runs.
type session struct {
	*app
	asker ask.Asker
	file  *measure.File
	base  *knowledge.Base
	chain *chain
	start time.Time // what --at names; the session's clock runs on from there

	putOff map[string]bool // by step, while this session runs
	told   map[string]bool // what has been shown once
	trail  []func() *step  // the steps answered in this session, to go back to
	stands bool            // the isolation was stated in this session, or said to stand still
	jump   func() *step    // what was asked for by a word comes next
	ranked *diagnose.Ranking
	margin *stress.Margin       // as last shown
	wanted []string             // steps asked for at the end: board values
	left   int                  // tests that are worth their minutes and steps of the record, open or locked, when the end was shown
	laters []diagnose.Candidate // tests put off earlier, to be asked now
}

// step is one thing to be settled; it asks, keeps the answer and says how it ended.
type step struct {
	id  string
	run func() (ask.Kind, error)
}

// errStopped ends a session at the technician's word.
var errStopped = errors.New("stopped")

// session runs the loop until it is stopped, the input ends, or nothing is left to do.
func (a *app) session(asker ask.Asker, f *measure.File) error {
	base, err := a.base()
	if err != nil {
		return err
	}
	start, err := a.stamp()
	if err != nil {
		return err
	}
	if err := notBefore(f.Case, start); err != nil {
		return err
	}
	if err := a.writable(f.Path); err != nil {
		return err
	}
	s := &session{app: a, asker: asker, file: f, base: base, start: start, putOff: map[string]bool{}, told: map[string]bool{}}
	if err := s.refresh(); err != nil {
		return err
	}
	s.sayAsItStood(s.start)
	s.welcome()
	err = s.loop()
	switch {
	case errors.Is(err, ask.ErrEnd):
		s.say("the input ended.")
	case err != nil && !errors.Is(err, errStopped):
		return err
	}
	s.farewell()
	return nil
}

// writable proves before the first question that the answers to come can be saved.
func (a *app) writable(path string) error {
	if real, err := filepath.EvalSymlinks(path); err == nil {
		path = real
	}
	try := a.tryFolder
	if try == nil {
		try = triedFolder
	}
	if err := try(folderOf(path)); err != nil {
		return wrongInput(path+": nothing can be saved here, so nothing is asked: "+err.Error(),
			"make the folder writable, or copy the case to one that is, and start it there: drivemend bench OTHER-FOLDER/"+quoted(filepath.Base(path)))
	}
	return nil
}

// triedFolder writes an empty file into a folder and takes it away again.
func triedFolder(folder string) error {
	file, err := os.CreateTemp(folder, ".drivemend-try-*")
	if err != nil {
		var p *os.PathError
		if errors.As(err, &p) {
			err = p.Err
		}
		return err
	}
	return errors.Join(file.Close(), os.Remove(file.Name()))
}

// clock is the time of the session: --at, and what has passed since.
func (s *session) clock() time.Time {
	now := s.env.now()
	if s.at == "" {
		return now.Truncate(time.Second)
	}
	return s.start.Add(now.Sub(s.began)).Truncate(time.Second)
}

// refresh runs the chain from the case as it now stands.
func (s *session) refresh() error {
	if s.chain == nil {
		s.chain = &chain{base: s.base, kept: diagnose.For(s.base)}
	}
	k, err := s.chain.following(s.file.Case)
	if err != nil {
		return err
	}
	s.chain = k
	s.ranked, err = k.rank("")
	return err
}

func (s *session) welcome() {
	n := len(s.file.Case.Current())
	switch {
	case !s.file.Saved():
		s.say("New case " + s.file.Path + "; it is written with the first answer. The time used is " + s.clock().Format(time.RFC3339) + ".")
	default:
		s.say(fmt.Sprintf("Case %s, %s so far. The time used is %s.", s.file.Path, counted(n, "answer"), s.clock().Format(time.RFC3339)))
	}
	s.say("Local codes and licensed practice come first. Every question can be skipped.")
}

func (s *session) farewell() {
	if !s.file.Saved() {
		s.say("Nothing was answered, so nothing was written.")
		return
	}
	if s.underPower() {
		s.say("! The board counts as powered: switch off, take the supply away, and let nobody touch it before it is isolated and proved dead.")
	}
	s.say("Everything answered is saved in " + s.file.Path + ". Go on with: drivemend bench " + quoted(s.file.Path))
}

// loop settles one step after the other.
func (s *session) loop() error {
	for {
		again, err := s.pick()
		if err != nil {
			return err
		}
		if again == nil {
			if again, err = s.finish(); err != nil || again == nil {
				return err
			}
		}
		if err := s.settle(again); err != nil {
			return err
		}
	}
}

// settle runs a step, and the steps before it when back is typed.
func (s *session) settle(again func() *step) error {
	for again != nil {
		st := again()
		if st == nil {
			return nil
		}
		kind, err := st.run()
		if err != nil {
			return err
		}
		switch kind {
		case ask.Quit:
			return errStopped
		case ask.Moved:
			return nil
		case ask.Back:
			if again = s.before(); again == nil {
				s.say("This is the first question of this session.")
				return nil
			}
			continue
		case ask.Skipped, ask.Later:
			s.putOff[st.id] = true
		}
		s.trail = append(s.trail, again)
		return s.show()
	}
	return nil
}

// before takes the step that was settled last off the trail.
func (s *session) before() func() *step {
	if len(s.trail) == 0 {
		return nil
	}
	last := s.trail[len(s.trail)-1]
	s.trail = s.trail[:len(s.trail)-1]
	return last
}

// keep makes one change and brings it to disk before anything else is asked. ok is false when the change was refused,
// and the question is to be asked again.
func (s *session) keep(change func(f *measure.File) error) (ok bool, err error) {
	if err := change(s.file); err != nil {
		s.refused(err)
		return false, nil
	}
	for {
		err := s.file.Save()
		if err == nil {
			return true, s.refresh()
		}
		var changed *measure.ChangedError
		if errors.As(err, &changed) && !changed.Gone && !changed.There {
			if s.reread(change) {
				continue
			}
		}
		s.refused(err)
		if again, err := s.retry(); err != nil || !again {
			return false, errors.Join(err, wrongInput("the last answer could not be saved to "+s.file.Path))
		}
	}
}

// reread takes over what another program wrote to the file meanwhile, and makes the change on top of it.
func (s *session) reread(change func(f *measure.File) error) bool {
	f, err := measure.Load(s.file.Path)
	if err != nil || change(f) != nil {
		return false
	}
	s.file = f
	s.say("The file was changed by another program meanwhile; the answer is added to what stands there now.")
	return true
}

// retry asks what to do when the file cannot be written.
func (s *session) retry() (bool, error) {
	answer, err := s.asker.Ask(ask.Question{Title: "NOT SAVED", Lines: []string{"The last answer is not on disk yet."}, Ask: "Try again?",
		Choices: []ask.Choice{{Word: "again", Means: "write it now"}}, NoBack: true, NoSkip: true})
	if errors.Is(err, ask.ErrEnd) {
		return false, nil // nobody can say so any more; that it is not saved is the error
	}
	return answer.Kind == ask.Given, err
}

// refused says why a change was not made.
func (s *session) refused(err error) {
	var p measure.Problems
	var f *failure
	var save *measure.SaveError
	switch {
	case errors.As(err, &save):
		s.say("! not saved, " + save.Failed + ": " + save.Reason + "; " + save.Stands)
		s.say("  " + save.Todo)
	case errors.As(err, &p):
		for _, one := range p {
			s.say("! " + one.Message)
			if one.Hint != "" {
				s.say("  " + one.Hint)
			}
		}
	case errors.As(err, &f):
		s.say("! " + f.message)
		for _, h := range f.hints {
			s.say("  " + h)
		}
	default:
		s.say("! " + err.Error())
	}
}

// say prints a text broken to the width.
func (s *session) say(text string) {
	indent := text[:len(text)-len(strings.TrimLeft(text, " "))]
	for _, line := range ask.Wrapped(ask.Clean(text), indent, indent+"  ", s.columns()) {
		fmt.Fprintln(s.out, line)
	}
}

// counted gives "1 answer", "3 answers".
func counted(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}
