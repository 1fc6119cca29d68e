package main

import (
	"fmt"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

func (a *app) safeCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "safe",
		Short: "enter the safety history: isolation, dead checks, link, conditions",
		Long:  "Enters the safety history of a case, which the hold points are checked against. Only what is stated in full counts.",
		Args:  takes(0, 0),
		RunE: func(*cobra.Command, []string) error {
			return wrongCommand("safe needs a word", "drivemend safe isolation, dead-check, link, energised or before")
		},
	}
	c.AddCommand(a.isolationCommand(), a.deadCheckCommand(), a.linkCommand(), a.energisedCommand(), a.beforeCommand())
	return c
}

func (a *app) isolationCommand() *cobra.Command {
	var locked bool
	var motor, other string
	c := &cobra.Command{
		Use:     "isolation CASE",
		Short:   "the board is cut off from every source",
		Long:    "States that the board is cut off: the isolator locked, the motor unplugged or its shaft locked, every other source off.",
		Example: "drivemend safe isolation pump --locked --motor unplugged --other-sources none",
		Args:    takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			if motor == "" || other == "" {
				return wrongCommand("an isolation is stated in full", "--locked --motor unplugged|shaft-locked|connected --other-sources none, or each by name with off")
			}
			return a.safe(args[0], func(f *measure.File, at time.Time) error {
				return f.Isolate(measure.Isolation{Locked: locked, Motor: strings.ToLower(motor), OtherSources: other, At: at})
			})
		},
	}
	c.Flags().BoolVar(&locked, "locked", false, "the isolator is open, locked and tagged")
	c.Flags().StringVar(&motor, "motor", "", "`unplugged`, shaft-locked or connected")
	c.Flags().StringVar(&other, "other-sources", "", "`none`, or each by name with off: '24 V supply off'")
	return a.timed(c)
}

func (a *app) deadCheckCommand() *cobra.Command {
	var dc, ac string
	var proved bool
	c := &cobra.Command{
		Use:     "dead-check CASE POINT",
		Short:   "voltage read at a store of energy",
		Long:    "Enters the voltage read at one store of energy, DC and AC. It counts for 10 minutes, and only with a meter proved on a known source before and after. drivemend status names the points of a board.",
		Example: "drivemend safe dead-check pump bus --dc 212 --ac 0.3 --proved",
		Args:    takes(2, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			d := measure.DeadCheck{Point: args[1], MeterProved: proved}
			if dc == "" {
				return wrongCommand("a dead check needs its reading", "--dc 212 --ac 0.3, and --proved if the meter was proved before and after")
			}
			var err error
			if d.DC, err = volts("--dc", dc); err != nil {
				return err
			}
			if ac != "" {
				if d.AC, err = volts("--ac", ac); err != nil {
					return err
				}
			}
			return a.safe(args[0], func(f *measure.File, at time.Time) error {
				if err := knownPoint(f.Case.Board, d.Point); err != nil {
					return err
				}
				d.At = at
				return f.Check(d)
			})
		},
	}
	c.Flags().StringVar(&dc, "dc", "", "DC `VOLTS`")
	c.Flags().StringVar(&ac, "ac", "", "AC `VOLTS`; without them the check proves nothing")
	c.Flags().BoolVar(&proved, "proved", false, "the meter was proved on a known source before and after")
	return a.timed(c)
}

// volts reads a voltage; a bare number is taken in volts.
func volts(what, text string) (quantity.Quantity, error) {
	if text = strings.TrimSpace(text); bareNumber.MatchString(text) {
		text += " V"
	}
	q, err := quantity.Parse(text, quantity.Volt)
	if err != nil {
		return q, wrongInput(what + ": " + err.Error())
	}
	return q, nil
}

// knownPoint refuses a dead check at a place this board does not have: it would prove nothing.
func knownPoint(b measure.Board, point string) error {
	var points []string
	for _, s := range safety.Stores(b) {
		if s.Point == point {
			return nil
		}
		points = append(points, s.Point)
	}
	return noSuch("store of energy", point, nearestOf(point, points), "this board has "+strings.Join(points, ", "))
}

func (a *app) linkCommand() *cobra.Command {
	return a.timed(&cobra.Command{
		Use:   "link CASE fitted|removed",
		Short: "a shorting link across the bus",
		Long:  "Says that a shorting link was fitted, or came off. While it is fitted no meter step is given; after it came off every store is checked again.",
		Args:  takes(2, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			word := strings.ToLower(args[1])
			if word != "fitted" && word != "removed" {
				return wrongCommand(fmt.Sprintf("a link is fitted or removed, not %q", args[1]))
			}
			return a.safe(args[0], func(f *measure.File, at time.Time) error {
				if word == "fitted" {
					return fitLink(f, at)
				}
				return f.RemoveLink(at)
			})
		},
	})
}

// fitLink keeps that a link is on. A second one while the first is on record as fitted would have to come off twice.
func fitLink(f *measure.File, at time.Time) error {
	for _, l := range f.Case.Safety.Links {
		if l.Removed.IsZero() {
			return wrongInput("a shorting link is on record as fitted since "+l.Fitted.Format(time.RFC3339)+" and not as removed",
				"did it come off meanwhile? say when: drivemend safe link CASE removed --at TIME; nothing was changed")
		}
	}
	return f.FitLink(at)
}

func (a *app) energisedCommand() *cobra.Command {
	return a.timed(&cobra.Command{
		Use:   "energised CASE powered-step|source|shaft",
		Short: "energy was put into the board",
		Long:  "Says that the board had, or may have had, energy put into it: a powered step, a source reconnected, a shaft turned. It ends the isolation and every dead check.",
		Args:  takes(2, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			return a.safe(args[0], func(f *measure.File, at time.Time) error {
				return f.Energise(measure.Energised{What: strings.ToLower(args[1]), At: at})
			})
		},
	})
}

// safe makes one entry of the safety history and says what is missing from then on.
func (a *app) safe(path string, enter func(*measure.File, time.Time) error) error {
	f, at, err := a.enterSafety(path, enter)
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "entered at %s\n", at.Format(time.RFC3339))
	return a.status(f.Path)
}

// enterSafety makes one entry of the safety history and saves it.
func (a *app) enterSafety(path string, enter func(*measure.File, time.Time) error) (*measure.File, time.Time, error) {
	at, err := a.stamp()
	if err != nil {
		return nil, at, err
	}
	f, err := a.loadToChange(path)
	if err != nil {
		return nil, at, err
	}
	if err := notBefore(f.Case, at); err != nil {
		return nil, at, err
	}
	if err := enter(f, at); err != nil {
		return nil, at, err
	}
	return f, at, f.Save()
}
