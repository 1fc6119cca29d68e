package main

import (
	"fmt"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// stepResults are the ways in which a step of the record ends.
var stepResults = []string{"done", "failed", "not-possible", "not-fitted"}

func (a *app) recordCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "record",
		Short: "enter what leaves no reading: steps, pictures, settings, repairs",
		Long: "Enters what was found and done beside the measuring. Nothing is instructed, and nothing that happened is refused: " +
			"a step that was done outside its hold point is kept and marked.",
		Args: takes(0, 0),
		RunE: func(*cobra.Command, []string) error {
			return wrongCommand("record needs a word", "drivemend record step, photo, capture, fault-code, setting or repair")
		},
	}
	c.AddCommand(a.recordStepCommand(), a.recordPhotoCommand(), a.recordCaptureCommand(), a.recordFaultCodeCommand(),
		a.recordSettingCommand(), a.recordRepairCommand())
	return c
}

// record makes one entry of the record and saves it. What is stamped lies neither ahead of the clock nor before the case.
func (a *app) record(path string, stamped bool, enter func(*measure.File, time.Time) error) (*measure.File, time.Time, error) {
	if stamped {
		return a.enterSafety(path, enter)
	}
	f, err := a.loadToChange(path)
	if err != nil {
		return nil, time.Time{}, err
	}
	if err := enter(f, time.Time{}); err != nil {
		return nil, time.Time{}, err
	}
	return f, time.Time{}, f.Save()
}

func (a *app) recordStepCommand() *cobra.Command {
	var by, note string
	c := &cobra.Command{
		Use:   "step CASE STEP " + strings.Join(stepResults, "|"),
		Short: "a step of the work that leaves no reading",
		Long: "Records how a step ended: " + strings.Join(measure.StepWords(), ", ") + ". " +
			"failed and not-possible say why with --note. The newest entry of a step counts; a step that failed stays open. " +
			"drivemend status CASE shows which steps are open and what each waits for.",
		Example: "drivemend record step pump fault-log-read not-possible --note 'control board dead'",
		Args:    takes(3, 3),
		RunE: func(_ *cobra.Command, args []string) error {
			return a.recordStep(args[0], args[1], args[2], measure.StepEntry{By: by, Note: note})
		},
	}
	c.Flags().StringVar(&by, "by", "", "`WHO` did it; can be left out of reports")
	c.Flags().StringVar(&note, "note", "", "what was found, or why not, in `WORDS`")
	return a.timed(c)
}

func (a *app) recordStep(path, step, result string, s measure.StepEntry) error {
	s.Step, s.Result = strings.ToLower(step), strings.ToLower(result)
	switch {
	case !slices.Contains(measure.StepWords(), s.Step):
		return wrongInput(fmt.Sprintf("there is no step %q in the record", step), nearHints(s.Step, measure.StepWords(), "the steps are "+strings.Join(measure.StepWords(), ", "))...)
	case !slices.Contains(stepResults, s.Result):
		return wrongInput(fmt.Sprintf("a step does not end %q", result), nearHints(s.Result, stepResults, "it ends "+orWords(stepResults))...)
	case s.Result == "not-fitted" && !safety.MayLack(s.Step):
		return wrongInput(s.Step+" cannot be not-fitted: there is no board without it",
			"where it cannot be done, say why: drivemend record step CASE "+s.Step+" not-possible --note 'why'; nothing was changed")
	case s.Note == "" && (s.Result == "failed" || s.Result == "not-possible"):
		return wrongCommand(s.Step+" "+s.Result+" needs its reason", "add --note 'what was found, or why it cannot be done'")
	}
	base, err := a.base()
	if err != nil {
		return err
	}
	f, at, err := a.record(path, true, func(f *measure.File, at time.Time) error {
		if err := tooEarly(base, f.Case, s, at); err != nil {
			return err
		}
		s.At = at
		return f.AddStep(s)
	})
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "recorded: %s %s\nat %s\n", s.Step, s.Result, at.Format(time.RFC3339))
	last := len(f.Case.Steps) - 1
	then := safety.AsOf(f.Case, at)
	a.lacked("kept, and marked as done outside its hold point:", safety.OutsideStep(f.Case, last, diagnose.EvidenceOf(base, then)))
	if s.Step == measure.StepHandedOver && s.Result == "done" {
		a.lacked("kept; what still stood before it:", statusOf(base, then, at, s.Step).Missing)
	}
	a.follows(s, at)
	return nil
}

// statusOf tells how a step of the record stands at a moment.
func statusOf(base *knowledge.Base, c *measure.Case, at time.Time, step string) safety.RecordStatus {
	record := safety.Record(c, at, diagnose.EvidenceOf(base, c))
	return record[slices.IndexFunc(record, func(r safety.RecordStatus) bool { return r.Step.ID == step })]
}

// tooEarly refuses a follow-up that counts for nothing yet, in words: when the board was handed over and when the
// follow-up is due.
func tooEarly(base *knowledge.Base, c *measure.Case, s measure.StepEntry, at time.Time) error {
	if s.Step != measure.StepFollowedUp || s.Result != "done" {
		return nil
	}
	then := safety.AsOf(c, at)
	due, over := statusOf(base, then, at, measure.StepFollowedUp).Due, statusOf(base, then, at, measure.StepHandedOver).Last
	switch {
	case due.IsZero() || over == nil:
		return wrongInput("followed up on "+at.Format(time.DateOnly)+": the board is not on record as handed over by then",
			"enter the hand-over first, with its time: drivemend record step CASE "+measure.StepHandedOver+" done --at TIME; nothing was changed")
	case at.Before(due):
		return wrongInput(fmt.Sprintf("followed up on %s: the board was handed over on %s, and counts as followed up from %s on", at.Format(time.DateOnly), over.At.Format(time.DateOnly), due.Format(time.DateOnly)),
			"ask again then; if the repair did not hold, the result is failed with --note; nothing was changed")
	}
	return nil
}

// lacked says what an entry lacked; it is kept all the same.
func (a *app) lacked(what string, missing []safety.Missing) {
	if len(missing) == 0 {
		return
	}
	fmt.Fprintln(a.out, what)
	for _, m := range missing {
		a.wrapped(fmt.Sprintf("point %d: %s", m.Point, m.Text), "  ", "    ")
	}
}

// follows says what an entry leads to: when the follow-up is due, or that a failed step stays open.
func (a *app) follows(s measure.StepEntry, at time.Time) {
	switch {
	case s.Result == "failed" && s.Step == measure.StepFollowedUp:
		fmt.Fprintln(a.out, "the repair did not hold: take the board up again, and enter what was found")
	case s.Result == "failed":
		fmt.Fprintln(a.out, "it stays open: mend what was found, then record it again")
	case s.Step == measure.StepHandedOver && s.Result == "done":
		fmt.Fprintf(a.out, "the follow-up is due on %s: drivemend record step CASE %s done\n", safety.FollowUpDue(at).Format(time.DateOnly), measure.StepFollowedUp)
	}
}

func (a *app) recordFaultCodeCommand() *cobra.Command {
	var code measure.FaultCode
	c := &cobra.Command{
		Use:     "fault-code CASE CODE",
		Short:   "an entry of the board's own fault memory",
		Long:    "Records one entry of the board's own fault memory, as shown. Read all of it before anything is cleared.",
		Example: "drivemend record fault-code pump F07 --text 'over-current at deceleration' --count 3 --shown-at '5198 h'",
		Args:    takes(2, 2),
		RunE: func(c *cobra.Command, args []string) error {
			code.Code = args[1]
			if c.Flags().Changed("count") && code.Count < 1 {
				return wrongCommand("--count is how often it is recorded: 1 or more", "leave it out where the board does not say")
			}
			f, _, err := a.record(args[0], false, func(f *measure.File, _ time.Time) error { return f.AddFaultCode(code) })
			return a.told(err, f, "fault code "+code.Code, measure.StepFaultLogRead)
		},
	}
	c.Flags().StringVar(&code.Text, "text", "", "what the manual says of it, in `WORDS`")
	c.Flags().IntVar(&code.Count, "count", 0, "how often it is recorded, a `NUMBER`")
	c.Flags().StringVar(&code.At, "shown-at", "", "when, as the board shows it: its clock or its hours, in `WORDS`")
	c.Flags().StringVar(&code.Note, "note", "", "anything worth keeping, in `WORDS`")
	return c
}

func (a *app) recordSettingCommand() *cobra.Command {
	var s measure.Setting
	c := &cobra.Command{
		Use:     "setting CASE NAME VALUE",
		Short:   "a setting of the drive as found",
		Long:    "Records one setting of the drive as it was found, to be restored and compared after the repair.",
		Example: "drivemend record setting pump P012 '8 kHz' --note 'switching frequency'",
		Args:    takes(3, 3),
		RunE: func(_ *cobra.Command, args []string) error {
			s.Name, s.Value = args[1], args[2]
			f, _, err := a.record(args[0], false, func(f *measure.File, _ time.Time) error { return f.AddSetting(s) })
			return a.told(err, f, "setting "+s.Name+" = "+s.Value, measure.StepSettingsSaved)
		},
	}
	c.Flags().StringVar(&s.Note, "note", "", "anything worth keeping, in `WORDS`")
	return c
}

func (a *app) recordRepairCommand() *cobra.Command {
	var r measure.Repair
	var done string
	c := &cobra.Command{
		Use:     "repair CASE PART",
		Short:   "one part's share of an earlier repair",
		Long:    "Records what an earlier repair did to one part, as the board names it; it need not be a switch. What is built now goes under rebuild.",
		Example: "drivemend record repair pump Q2 --done 2026-03-14 --work replaced --was 'type A' --fitted 'type B' --because shorted",
		Args:    takes(2, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			r.Part = args[1]
			day, err := a.day("--done", done)
			if err != nil {
				return err
			}
			r.Done = day
			f, _, err := a.record(args[0], false, func(f *measure.File, _ time.Time) error { return f.AddRepair(r) })
			return a.told(err, f, "repair of "+r.Part, "")
		},
	}
	c.Flags().StringVar(&r.Position, "position", "", "the `POSITION` it serves")
	c.Flags().StringVar(&done, "done", "", "`DAY` of the repair, 2026-03-14")
	c.Flags().StringVar(&r.By, "by", "", "`WHO` did it; can be left out of reports")
	c.Flags().StringVar(&r.Work, "work", "", "what was done: `replaced`, reworked, adjusted, bridged, removed or added")
	c.Flags().StringVar(&r.Was, "was", "", "the `TYPE` or value it had")
	c.Flags().StringVar(&r.Fitted, "fitted", "", "the `TYPE` or value that was put in")
	c.Flags().StringVar(&r.Because, "because", "", "why, in `WORDS`")
	c.Flags().StringVar(&r.Note, "note", "", "anything worth keeping, in `WORDS`")
	return c
}

// day reads a day that has come; without a text none is stated.
func (a *app) day(flag, text string) (time.Time, error) {
	if text == "" {
		return time.Time{}, nil
	}
	day, err := time.Parse(time.DateOnly, text)
	if err != nil {
		return day, wrongCommand(fmt.Sprintf("%s %q is no day", flag, text), "write year, month and day: "+a.env.now().Format(time.DateOnly))
	}
	if text > a.env.now().Format(time.DateOnly) {
		return day, wrongInput(flag+" "+text+" lies in the future", "give the day on which it was done")
	}
	return day, nil
}

// told says what was recorded, unless it was not, and which step of the record it belongs to.
func (a *app) told(err error, f *measure.File, what, step string) error {
	if err != nil {
		return err
	}
	fmt.Fprintln(a.out, "recorded: "+ask.Clean(what))
	if step != "" {
		a.untilAll(f, step)
	}
	return nil
}

// untilAll says how a step is closed whose single things are being recorded, while it stands open.
func (a *app) untilAll(f *measure.File, step string) {
	if !slices.ContainsFunc(f.Case.Steps, func(s measure.StepEntry) bool { return s.Step == step }) {
		fmt.Fprintf(a.out, "when all are recorded: drivemend record step %s %s done\n", quoted(f.Path), step)
	}
}
