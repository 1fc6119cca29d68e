package reports

import (
	"fmt"
	"strings"

	"drivemend/diagnose"
	"drivemend/knowledge"
)

// worthAsking is the chance from which a change is asked for on the strength of the answers alone. Judgement.
const worthAsking = 0.25

// change gives the cause whose removal is asked for, and its repair: the cause of the outcome, else the most probable
// one that a design can change, if it stands out enough; nil when none does.
func (r Report) change() (*knowledge.Cause, *knowledge.Repair) {
	if r.Base == nil {
		return nil, nil
	}
	id := ""
	if o := r.Case.Outcome; o != nil && len(o.Causes) > 0 {
		id = o.Causes[0]
	} else if r.Ranking != nil {
		id = leadingOfDesign(r.Ranking.Causes)
	}
	cause := r.Base.Cause(id)
	if cause == nil {
		return nil, nil
	}
	return cause, r.Base.Repair(cause.Repair)
}

// leadingOfDesign passes over triggers: what merely happened that day no design can take away.
func leadingOfDesign(causes []diagnose.Line) string {
	for _, l := range causes {
		if l.Probability >= worthAsking && l.Role != "trigger" {
			return l.ID
		}
	}
	return ""
}

func (r Report) changeTitle() string {
	cause, repair := r.change()
	switch {
	case cause == nil:
		return "None yet: " + r.noneStandsOut()
	case repair == nil:
		return "Remove this cause: " + cause.Title
	}
	return repair.Title
}

func (r Report) noneStandsOut() string {
	if r.Ranking == nil || len(r.Ranking.Causes) == 0 {
		return "the causes were not ranked"
	}
	return "no cause that a design can change reaches " + percent(worthAsking) + " (leading: " + r.Ranking.Causes[0].Title + ", " + percent(r.Ranking.Causes[0].Probability) + "). First the tests that are open"
}

// changeBecause says what the change removes, and what the rebuild as a whole, not this change alone, does to the peak.
func (r Report) changeBecause() string {
	cause, _ := r.change()
	if cause == nil {
		return ""
	}
	text := "It removes: " + cause.Title
	if l, ok := lineOf(r.Ranking, cause.ID); ok {
		text += " (" + percent(l.Probability) + ")"
	}
	if m := r.Margin; m != nil && m.AsFound != nil && m.Rebuild != nil {
		text += fmt.Sprintf(". %s the peak falls from %s to %s (%s; rating %s)", capital(r.allChanges()),
			volts(m.AsFound.P999.Peak), volts(m.Rebuild.P999.Peak), percentileWords(m.Rebuild), volts(m.Rebuild.Rated))
		if m.Rebuild.P999.Peak >= m.AsFound.P999.Peak {
			text = strings.Replace(text, "the peak falls from", "the peak goes from", 1)
		}
	}
	return text + "."
}

// allChanges names everything that the rebuild changes: its peak rests on all of it together.
func (r Report) allChanges() string {
	if r.Margin == nil || r.Margin.Rebuild == nil {
		return ""
	}
	parts := []string{"network " + networkWords(r.Margin.Rebuild.Network)}
	if rebuild := r.Case.Rebuild; rebuild != nil {
		for _, key := range rebuild.Keys {
			before, after := valueWords(r.Case.Board, key), valueWords(rebuild.Board, key)
			if key == "snubber" || strings.HasPrefix(key, "snubber.") || before == after {
				continue
			}
			parts = append(parts, keyWords(key)+" "+before+" → "+after)
		}
	}
	if len(parts) == 1 {
		return "with the rebuild as stated (" + parts[0] + ")"
	}
	return "with all changes of the rebuild together (" + strings.Join(parts, ", ") + ")"
}

// rebuildShort is allChanges where the change asked for, on the same page, has named them.
func (r Report) rebuildShort() string {
	if cause, _ := r.change(); cause != nil && r.Margin.AsFound != nil {
		return "with all changes of the rebuild together"
	}
	return r.allChanges()
}

// keyWords is a key of the board in a word or two where it is one of those a rebuild changes most.
func keyWords(key string) string {
	switch key {
	case "loop.inductance":
		return "loop"
	case "gate.turn_off_resistance":
		return "gate"
	}
	return key
}

// capital gives a phrase with a capital in front.
func capital(text string) string {
	if text == "" {
		return ""
	}
	return strings.ToUpper(text[:1]) + text[1:]
}
