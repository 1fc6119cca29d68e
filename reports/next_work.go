package reports

import (
	"time"

	"drivemend/diagnose/safety"
)

// needWords says what state of the board a test needs.
func needWords(need safety.Need) string {
	switch need {
	case safety.NeedQuestion:
		return "asking and looking only, nothing is touched"
	case safety.NeedDead:
		return "a dead board, every store of energy proved"
	case safety.NeedControlPower:
		return "control supply on, bus disconnected"
	case safety.NeedLowBus:
		return "a low, current-limited bus"
	case safety.NeedFull:
		return "the full bus"
	}
	return string(need)
}

// toolWords says under which conditions of its own a tool is put to the board; "" for a tool without.
func toolWords(tool safety.Tool) string {
	switch tool {
	case safety.NoTool:
		return ""
	case safety.ToolScope:
		return "scope, with its probe as stated"
	case safety.ToolInjection:
		return "current injection, attended"
	case safety.ToolInsulation:
		return "insulation tester, electronics disconnected"
	case safety.ToolDoublePulse:
		return "double pulse, behind a shield"
	}
	return string(tool)
}

// workWords says what state of the board and what tool a test needs.
func workWords(w safety.Work) string { return joined("; ", needWords(w.Need), toolWords(w.Tool)) }

// writeConditions says on what the permission for a work rests, and the cautions that always stand beside it.
func writeConditions(s *screen, known Beside, w safety.Work, at time.Time, plan *safety.Plan) {
	s.item(strong, "needs", workWords(w)+": allowed at this moment")
	for _, b := range safety.StandsOn(known.Case, w, at) {
		s.item(strong, "stated", clockAt(b.At, at)+" for "+beforeName(b.Step)+": "+joined("; ", append(Conditions(b), b.Note)...))
	}
	if w.Need != safety.NeedQuestion && plan != nil {
		s.item(caution, "caution", storedWords(plan, w.Need))
	}
	for _, text := range safety.Carries(w) {
		s.item(caution, "caution", text)
	}
}

func storedWords(p *safety.Plan, need safety.Need) string {
	text := "this board can hold " + mostEnergy(p) + " at up to " + volts(p.BusV)
	if need.Powered() {
		return text + ", and keeps it when power goes off"
	}
	return text + ", and the charge comes back: a dead check lives 10 minutes"
}
