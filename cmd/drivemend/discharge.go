package main

import (
	"fmt"
	"io"
	"time"

	"github.com/spf13/cobra"

	"drivemend/diagnose/safety"
	"drivemend/measure/quantity"
	"drivemend/reports"
)

// bareBus are the figures of a discharge without a case.
type bareBus struct{ bus, capacitance, resistor string }

func (a *app) dischargeCommand() *cobra.Command {
	var bare bareBus
	c := &cobra.Command{
		Use:   "discharge [CASE]",
		Short: "stored energy, resistor, times, what to prove where",
		Long: "Plans how a board is made dead: its stores of energy, the resistor, the times, where each store is proved dead, and the cautions. " +
			"From a case, or from --bus and --capacitance alone. For a case the instruction is given only once its isolation is stated (exit status 3 until then).",
		Example: "drivemend discharge --bus 390V --capacitance 2200uF --resistor 2k2",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return a.dischargeBare(bare)
			}
			if bare.bus != "" || bare.capacitance != "" {
				return wrongCommand("a case brings its own bus and capacitance", "leave --bus and --capacitance out, or leave the case out")
			}
			return a.discharge(args[0], bare.resistor)
		},
	}
	c.Flags().StringVar(&bare.bus, "bus", "", "highest bus `VOLTAGE`, 390V; the worst case when left out")
	c.Flags().StringVar(&bare.capacitance, "capacitance", "", "bus `CAPACITANCE`, 2200uF; the worst case when left out")
	c.Flags().StringVar(&bare.resistor, "resistor", "", "the discharge `RESISTOR` at hand, 2k2; one is chosen when left out")
	return a.figures(a.timed(c))
}

// dischargeBare plans from the command line alone. No hold point can be checked without a case, and the plan begins
// with the isolation.
func (a *app) dischargeBare(bare bareBus) error {
	if bare == (bareBus{}) {
		return wrongCommand("discharge needs a case, or --bus", "drivemend discharge CASE, or drivemend discharge --bus 390V --capacitance 2200uF")
	}
	in := safety.Input{MotorCanTurn: true, BusUnknown: bare.bus == ""}
	for _, f := range []struct {
		flag, text string
		unit       quantity.Unit
		to         *float64
	}{
		{"--bus", bare.bus, quantity.Volt, &in.BusV}, {"--capacitance", bare.capacitance, quantity.Farad, &in.CapacitanceF},
		{"--resistor", bare.resistor, quantity.Ohm, &in.ResistorOhm},
	} {
		if f.text == "" {
			continue
		}
		q, err := quantity.Parse(f.text, f.unit)
		if err != nil {
			return wrongInput(f.flag + ": " + err.Error())
		}
		*f.to = q.Value
		if f.flag == "--bus" {
			*f.to = q.High
		}
		if f.flag == "--capacitance" && q.High > q.Value {
			in.HighestF = q.High
		}
	}
	return a.showDischarge(in)
}

func (a *app) discharge(path, resistor string) error {
	at, err := a.moment()
	if err != nil {
		return err
	}
	k, err := a.chain(path)
	if err != nil {
		return err
	}
	a.remark(k.c, at)
	a.sayAsItStood(at)
	in := safety.InputAt(k.c, at)
	if resistor != "" {
		q, err := quantity.Parse(resistor, quantity.Ohm)
		if err != nil {
			return wrongInput("--resistor: " + err.Error())
		}
		in.ResistorOhm = q.Value
	}
	if d := k.check(safety.NeedDischarge, at); !d.Allowed {
		return a.withhold("how to discharge "+k.c.ID, d)
	}
	if !a.asJSON {
		fmt.Fprintf(a.out, "isolated, as stated; checked for %s\n", at.Format(time.RFC3339))
	}
	return a.showDischarge(in)
}

// withhold says what an instruction waits for. For a program that reads JSON the words go to standard error.
func (a *app) withhold(what string, d safety.Decision) error {
	if !a.asJSON {
		if err := reports.Withheld(a.out, what, d.Missing, d.At, a.style()); err != nil {
			return err
		}
		return errWithheld
	}
	f := &failure{status: exitWithheld, message: "withheld: " + what}
	for _, m := range d.Missing {
		f.hints = append(f.hints, m.Text+": "+m.Unlock)
	}
	return f
}

func (a *app) showDischarge(in safety.Input) error {
	p, err := safety.Discharge(in)
	if err != nil {
		return wrongInput(err.Error())
	}
	err = a.show(func(w io.Writer) error { return reports.DischargeJSON(w, p) },
		func(w io.Writer) error { return reports.Discharge(w, p, a.style()) })
	if err == nil && len(p.Withheld) > 0 {
		return errWithheld // both outputs say why
	}
	return err
}
