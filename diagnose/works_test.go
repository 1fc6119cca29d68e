package diagnose

import (
	"regexp"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

var (
	deadOnly   = []safety.Need{safety.NeedDead}
	underPower = []safety.Need{safety.NeedControlPower, safety.NeedLowBus, safety.NeedFull}
	unpowered  = []safety.Need{safety.NeedQuestion, safety.NeedDead}
)

// spokenWork is what words in the question or the instruction of a test say about the work that it is: the states of the
// board it can be done in, and the tool. It is written from what is done at the bench, and knows no labels.
type spokenWork struct {
	words *regexp.Regexp
	needs []safety.Need
	tool  safety.Tool // NoTool: says nothing of the tool
}

func spoken(words string, needs []safety.Need, tool safety.Tool) spokenWork {
	return spokenWork{regexp.MustCompile(`(?i)` + words), needs, tool}
}

// spokenWorks: of several rows that match, the states are those that all of them allow, the tool is that of the first.
var spokenWorks = []spokenWork{
	spoken(`\b(double|single) pulses?\b`, []safety.Need{safety.NeedLowBus, safety.NeedFull}, safety.ToolDoublePulse),
	spoken(`\b(insulation tester|megger)\b|\b(500|1000) V for one minute`, deadOnly, safety.ToolInsulation),
	spoken(`\binject|\b(pass|feed)\b[^.;]*\b(\d+ A\b|coil)|\b\d+ A or more\b|set the limit of|(raise|rising)[^.;]*\bvoltage until\b`,
		[]safety.Need{safety.NeedDead, safety.NeedControlPower, safety.NeedLowBus}, safety.ToolInjection),
	spoken(`\b(oscillo)?scope\b|\bprobe\b|\brogowski\b|\btrigger\b`, underPower, safety.ToolScope),
	spoken(`\b(ohms?|diode|continuity|capacitance|resistance) range\b|\bcontinuity\b|\blow-ohm\b|\b(esr|lcr) meter\b|\bnanofarads\b|\bread the resistor\b|measure it out of circuit`, deadOnly, safety.NoTool),
	spoken(`\bcamera\b`, underPower, safety.NoTool),
	spoken(`\bbus disconnected\b|\bPWM running\b|\bgates? (is |are )?(running|switching)\b|\bcontrol supply on\b`, []safety.Need{safety.NeedControlPower}, safety.NoTool),
	spoken(`\blow bus\b|\b\d+ V bus through\b`, []safety.Need{safety.NeedLowBus}, safety.NoTool),
	spoken(`\brun at steady load\b|\bshorten the ramp\b`, []safety.Need{safety.NeedFull}, safety.NoTool),
}

// unitNeeds: what can only be read on a dead board, whatever the words.
var unitNeeds = map[quantity.Unit][]safety.Need{quantity.Ohm: deadOnly, quantity.Farad: deadOnly, quantity.Henry: deadOnly}

// worksSpoken gives the states and the tool that the words of a test allow. Words without a measurement are a question
// or a look.
func worksSpoken(t *knowledge.Test) ([]safety.Need, safety.Tool) {
	var needs []safety.Need
	tool, matched := safety.NoTool, false
	take := func(allowed []safety.Need) {
		if !matched {
			needs, matched = slices.Clone(allowed), true
			return
		}
		needs = slices.DeleteFunc(needs, func(n safety.Need) bool { return !slices.Contains(allowed, n) })
	}
	for _, s := range spokenWorks {
		if !s.words.MatchString(t.Ask) && !s.words.MatchString(t.How) {
			continue
		}
		take(s.needs)
		if tool == safety.NoTool {
			tool = s.tool
		}
	}
	if allowed, known := unitNeeds[t.Unit]; known {
		take(allowed)
	}
	if !matched {
		return unpowered, safety.NoTool
	}
	return needs, tool
}

// fits tells whether a work is what the words of a test say.
func fits(t *knowledge.Test, w safety.Work) bool {
	needs, tool := worksSpoken(t)
	return slices.Contains(needs, w.Need) && w.Tool == tool
}

// TestWorksAreWhatTheWordsSay compares the work of every test of the base with the words a technician reads, and proves
// that each kind of mislabelling would be seen.
func TestWorksAreWhatTheWordsSay(t *testing.T) {
	base := loadBase(t)
	seen := map[safety.Work]int{}
	for i := range base.Tests {
		x := &base.Tests[i]
		w := WorkOf(x)
		seen[w]++
		if !fits(x, w) {
			needs, tool := worksSpoken(x)
			t.Errorf("%s is labelled %s with tool %q, but its words say %v with tool %q:\n%s\n%s", x.ID, w.Need, w.Tool, needs, tool, x.Ask, x.How)
		}
		for _, wrong := range mislabelled(w) {
			if fits(x, wrong) {
				t.Errorf("%s: nothing would be said if it were labelled %s with tool %q", x.ID, wrong.Need, wrong.Tool)
			}
		}
	}
	for _, w := range safety.Works() {
		exists := w.Work.Need != safety.NeedDeadCheck && w.Work.Need != safety.NeedDischarge && w.Work != safety.Work{Need: safety.NeedFull, Tool: safety.ToolDoublePulse}
		if exists && w.Work.Tool != safety.NoTool && seen[w.Work] == 0 {
			t.Errorf("no test is %q, so nothing is proved of it", w.Title)
		}
	}
}

// mislabelled gives works that a test of this work must not pass for: a tool that is forgotten or taken for another, and
// a step at the board taken for a question, or for one of less power.
func mislabelled(w safety.Work) []safety.Work {
	var out []safety.Work
	for _, tool := range append(safety.Tools(), safety.NoTool) {
		if tool != w.Tool {
			out = append(out, safety.Work{Need: w.Need, Tool: tool})
		}
	}
	if w.Need.Powered() || w.Tool != safety.NoTool {
		out = append(out, safety.Work{Need: safety.NeedQuestion, Tool: w.Tool}, safety.Work{Need: safety.NeedQuestion})
	}
	return out
}

// TestMeterReadingsAreNoQuestions: what is read through leads on a dead board would be seen if it were labelled a
// question, at full power, or done without its dead board.
func TestMeterReadingsAreNoQuestions(t *testing.T) {
	base := loadBase(t)
	meters := 0
	for i := range base.Tests {
		x := &base.Tests[i]
		if x.Instrument != "meter" || x.Needs != "dead" {
			continue
		}
		meters++
		for _, need := range []safety.Need{safety.NeedQuestion, safety.NeedDeadCheck, safety.NeedControlPower, safety.NeedLowBus, safety.NeedFull} {
			if fits(x, safety.Work{Need: need}) {
				t.Errorf("%s: nothing would be said if it needed %s", x.ID, need)
			}
		}
	}
	if meters < 25 {
		t.Errorf("only %d tests are read with a meter on a dead board", meters)
	}
}

// TestInjectionsFitTheirConditions: a test that passes a current says what has to be stated before it.
func TestInjectionsFitTheirConditions(t *testing.T) {
	base := loadBase(t)
	for i := range base.Tests {
		x := &base.Tests[i]
		if WorkOf(x).Tool != safety.ToolInjection {
			continue
		}
		for _, words := range []string{"every (other )?source off", "gates? .*held to", "[Ss]et the limit of .*on its open output.*(connect it|feed the coil)", "Stay with it, stop at 40 K rise"} {
			if !regexp.MustCompile(words).MatchString(x.How) {
				t.Errorf("%s does not say %q: %s", x.ID, words, x.How)
			}
		}
		if !slices.Contains(x.Cautions, "limit-before-connecting") {
			t.Errorf("%s lacks the caution limit-before-connecting", x.ID)
		}
	}
}

// TestEveryWorkHasItsPlace: the states in which the rule base lets an instrument be used are those of the hold points, and
// no test of the base is one that can never be given.
func TestEveryWorkHasItsPlace(t *testing.T) {
	base := loadBase(t)
	placeless := func(w safety.Work) bool {
		for _, m := range safety.Check(&measure.Case{}, w, time.Unix(1, 0), safety.Evidence{}).Missing {
			if strings.Contains(m.Text, "has no place in a step") {
				return true
			}
		}
		return false
	}
	for i := range base.Tests {
		if w := WorkOf(&base.Tests[i]); placeless(w) {
			t.Errorf("%s: the tool %s has no place in a step that needs %s", base.Tests[i].ID, w.Tool, w.Need)
		}
	}
	for _, instrument := range knowledge.Instruments() {
		for _, need := range knowledge.NeedsOf(instrument) {
			if w := WorkOf(&knowledge.Test{Needs: need, Instrument: instrument}); placeless(w) {
				t.Errorf("a rule file may use the %s in a step that needs %s, the hold points do not", instrument, need)
			}
		}
	}
}
