package reports

import "strings"

// findingState is how sure the cause is: inferred, reproduced, or repair held 30 days, which the dates must bear out.
func (r Report) findingState() string {
	if o := r.Case.Outcome; o != nil {
		switch o.ConfirmedBy {
		case "held-30-days":
			if proved, _ := heldOf(r.Case, r.At); proved {
				return "repair held 30 days"
			}
		case "reproduced":
			return "reproduced"
		}
	}
	return "inferred"
}

func (r Report) finding() section {
	s := section{ID: "finding", Title: "How sure the cause is, and what we ask for"}
	switch state := r.findingState(); state {
	case "inferred":
		s.say(caution, "INFERRED.", "The cause follows from "+r.basis()+" "+r.unconfirmed()+r.statedOnly())
	case "reproduced":
		s.say(normal, "REPRODUCED.", "The failure was reproduced with this cause: "+r.outcomeCauses()+".")
	default:
		_, record := heldOf(r.Case, r.At)
		s.say(normal, "REPAIR HELD 30 DAYS.", "The rebuilt board has run since, with this cause removed: "+r.outcomeCauses()+". By the record "+record+".")
	}
	if r.findingState() != "repair held 30 days" {
		if t, text := followUpWords(r.record(), r.At); text != "" {
			s.say(t, "FOLLOW-UP.", capital(text)+".")
		}
	}
	if text := r.outcomeWords(); text != "" {
		s.say(neutral, "As the case was closed.", text)
	}
	if r.disagrees() {
		s.say(caution, "NOTE.", "From the answers alone the rule base puts another cause first; see the three questions below.")
	}
	s.say(mandatory, "THE ONE CHANGE WE ASK FOR.", r.changeTitle()+". "+r.changeBecause())
	return s
}

// basis says on what an inferred cause rests: the answers that vote, and how many entries of the case do not.
func (r Report) basis() string {
	if r.Ranking == nil {
		return answers(r.Case) + " and the rule base."
	}
	voting, others := map[int]bool{}, 0
	for _, f := range r.Ranking.Findings {
		if f.Observation < 0 {
			others++
			continue
		}
		voting[f.Observation] = true
	}
	text := count(len(voting), "answer", "answers")
	if others > 0 {
		text += ", " + count(others, "finding", "findings") + " from the values of the board"
	}
	text += " and the rule base."
	if rest := len(r.Case.Observations) - len(voting); rest > 0 {
		text += " " + count(rest, "further entry does", "further entries do") + " not count; each stands with its reason under: " + leftOutTitle + "."
	}
	return text
}

// unconfirmed says what an inferred cause lacks. A repair that held proves nothing of a cause that the outcome does not
// rest on it.
func (r Report) unconfirmed() string {
	if held, record := heldOf(r.Case, r.At); held {
		return "The repair held (" + record + "), but the outcome does not say that this confirms the cause."
	}
	return "Nothing on record has confirmed it yet."
}

// statedOnly is what the outcome says without proof of it on record.
func (r Report) statedOnly() string {
	o := r.Case.Outcome
	if o == nil {
		return ""
	}
	switch o.ConfirmedBy {
	case "plausible":
		return " It was judged plausible when the case was closed: " + r.outcomeCauses() + "."
	case "held-30-days":
		return " The repair is " + confirmedWords(r.Case, r.At) + "; the cause named: " + r.outcomeCauses() + "."
	}
	return ""
}

func (r Report) outcomeCauses() string {
	o := r.Case.Outcome
	if o == nil || len(o.Causes) == 0 {
		return "not named in the case"
	}
	var out []string
	for _, id := range o.Causes {
		out = append(out, r.causeTitle(id))
	}
	return strings.Join(out, " together with ")
}

// outcomeWords is the outcome as the case states it, layer by layer.
func (r Report) outcomeWords() string {
	o := r.Case.Outcome
	if o == nil {
		return ""
	}
	var faults []string
	for _, id := range o.Faults {
		faults = append(faults, r.eventTitle(id))
	}
	var parts []string
	add := func(name, text string) {
		if text != "" {
			parts = append(parts, name+" "+text)
		}
	}
	add("Broken:", strings.Join(faults, ", "))
	add("parts:", strings.Join(o.Parts, ", "))
	add("killed by:", r.eventTitle(o.Stress))
	if len(o.Causes) > 0 {
		add("let happen by:", r.outcomeCauses())
	}
	if !o.Closed.IsZero() {
		add("closed", day(o.Closed))
	}
	if len(parts) == 0 {
		return ""
	}
	return strings.Join(parts, "; ") + "."
}
