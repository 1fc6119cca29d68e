package reports

import (
	"strconv"
	"strings"

	"drivemend/measure"
)

// conditions are the statements made before steps that need more than a dead board, as they stand in the case.
func (r Report) conditions() section {
	s := section{ID: "conditions", Title: "Conditions stated before powered steps"}
	t := table{Caption: "What was stated before power, scope, injection and insulation tester, and when; what is not listed was not stated, or stated as no", Heads: []string{"Before", "Stated", "Conditions", "Note"}, Numeric: make([]bool, 4)}
	for _, b := range r.Case.Safety.Before {
		text := strings.Join(Conditions(b), "; ")
		if text == "" {
			text = "none"
		}
		t.Rows = append(t.Rows, cells(beforeName(b.Step), moment(b.At), text, b.Note))
	}
	s.tabulateAny(t)
	return s
}

// beforeNames are the steps that conditions are stated before, in words.
var beforeNames = map[string]string{
	measure.BeforeControlPower: "control supply on, bus disconnected", measure.BeforeLowBus: "low, current-limited bus", measure.BeforeFull: "full bus",
	measure.BeforeDoublePulse: "double pulse", measure.BeforeInjection: "injection", measure.BeforeInsulation: "insulation tester", measure.BeforeScope: "scope",
}

func beforeName(step string) string {
	if name, known := beforeNames[step]; known {
		return name
	}
	return step
}

// Conditions names the conditions that a statement says are kept.
func Conditions(b measure.Before) []string {
	var out []string
	say := func(holds bool, text string) {
		if holds {
			out = append(out, text)
		}
	}
	say(b.Motor != "", "motor "+stepName(b.Motor))
	say(b.BrakeResistor != "", "brake resistor "+b.BrakeResistor)
	say(b.Fuse.Unit != "" || b.Fuse.Text != "", "fuse "+readingOr(b.Fuse))
	say(b.Bank != "", "capacitors "+stepName(b.Bank))
	say(b.Guard, "guard")
	say(b.RemoteOff, "supply off in reach")
	say(b.Glasses, "glasses")
	say(b.SecondPerson, "second person")
	say(b.BusDisconnected, "bus disconnected")
	say(b.Shield, "shield")
	say(b.ElectronicsDisconnected, "electronics disconnected")
	say(b.SourcesOff, "other sources off")
	say(b.GatesHeld, "gates held")
	say(b.LimitSet, "limit set before connecting")
	say(b.Attended, "attended")
	say(b.Probe != "", probeWords(b))
	return out
}

// probeWords is what a scope's reference is, as stated: "probe with earth clip on the live node, supply isolated, earth clips on the board: 1".
func probeWords(b measure.Before) string {
	if b.Probe != "earth-clip" {
		return "probe " + stepName(b.Probe)
	}
	text := "probe with earth clip"
	if b.ClipOn != "" {
		text += " on the " + stepName(b.ClipOn)
	}
	if b.Supply != "" {
		text += ", supply " + stepName(b.Supply)
	}
	if b.EarthClips > 0 {
		text += ", earth clips on the board: " + strconv.Itoa(b.EarthClips)
	}
	return text
}
