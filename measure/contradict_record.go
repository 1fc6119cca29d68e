package measure

import (
	"fmt"
	"slices"
	"time"
)

// HeldDays is how many days a repair must have held to count as confirmed; the word held-30-days and the step followed-up
// go by it. Judgement.
const HeldDays = 30

// checkRecord holds the entries of the record against each other.
func (r *reader) checkRecord(root *entry) {
	r.checkLinks(root)
	r.checkOpened(root)
	r.checkSettings(root)
	r.checkBefore(root)
	r.checkFollowUp(root)
	r.checkHeld(root)
	r.checkBrakeTested(root)
}

// checkLinks proves that no link was removed before it was fitted.
func (r *reader) checkLinks(root *entry) {
	for _, e := range root.at("safety").items("link") {
		fitted, removed := e.child("fitted"), e.child("removed")
		if known(fitted) && known(removed) && removed.time.Before(fitted.time) {
			r.conflict(removed, fitted, "the link would have been removed before it was fitted", "")
		}
	}
}

// known tells whether a time is stated and could be read.
func known(e *entry) bool { return e != nil && e.good && !e.time.IsZero() }

// day gives the calendar day of a time as it was written: it was entered at the bench of the case.
func day(t time.Time) time.Time {
	return time.Date(t.Year(), t.Month(), t.Day(), 0, 0, 0, 0, time.UTC)
}

// dated are the lists whose entries cannot be older than the case, with the key of their time. Pictures and captures
// can: the owner may have brought them.
var dated = []struct{ list, key string }{
	{"safety.isolation", "at"}, {"safety.dead_checks", "at"}, {"safety.link", "fitted"}, {"safety.link", "removed"},
	{"safety.energised", "at"}, {"safety.before", "at"}, {"observations", "at"}, {"bring_up", "at"}, {"steps", "at"},
}

// checkOpened holds every dated entry against the day the case was opened.
func (r *reader) checkOpened(root *entry) {
	opened := root.child("opened")
	if !known(opened) {
		return
	}
	late := []*entry{root.at("outcome.closed"), root.at("rebuild.done")}
	for _, d := range dated {
		for _, e := range root.at(d.list).children() {
			if e.word("seen") != "on-arrival" { // what others saw, they may have seen before
				late = append(late, e.child(d.key))
			}
		}
	}
	for _, e := range late {
		if known(e) && day(e.time).Before(opened.time) {
			r.conflict(e, opened, "it lies before the day the case was opened", "")
		}
	}
	for _, e := range root.items("repairs") {
		if done := e.child("done"); known(done) && done.time.After(opened.time) {
			r.conflict(done, opened, "an earlier repair was done before the case was opened",
				"correct one of the two; what is done in this case stands under rebuild")
		}
	}
}

// checkSettings proves that no setting was found with two values.
func (r *reader) checkSettings(root *entry) {
	first := map[string]*entry{}
	for _, e := range root.items("settings") {
		name, value := e.word("name"), e.child("value")
		if name == "" || value == nil || !value.good {
			continue
		}
		if before, ok := first[name]; ok && before.text != value.text {
			r.conflict(value, before, "the setting "+name+" was found with one value", "keep the one that was found")
			continue
		}
		first[name] = value
	}
}

// checkBefore proves that a statement of conditions holds what belongs to its step, and that what it says of the probe
// fits together.
func (r *reader) checkBefore(root *entry) {
	for _, e := range root.at("safety.before").children() {
		step := e.child("step")
		if step == nil || !step.good {
			continue
		}
		for _, c := range e.below {
			takes := beforeTakes[c.name]
			if len(takes) > 0 && !slices.Contains(takes, step.text) && c.node.Value != "" {
				r.fault(c.node, c.path, fmt.Sprintf("%s contradicts %s %s: this condition belongs to %s", c.shown(), step.path, step.text, either(takes)),
					"state it in an entry of its own for that step")
			}
		}
		probe, clips, clip := e.child("probe"), e.child("earth_clips"), e.child("clip_on")
		if n, ok := e.amount("earth_clips"); ok && clips.numeric() && n.Value == 0 && e.word("probe") == "earth-clip" {
			r.conflict(clips, probe, "the probe's own earth clip is one", "")
		}
		if clip != nil && clip.good && e.word("probe") == "differential" {
			r.conflict(clip, probe, "a differential probe has no earth clip", "")
		}
	}
}

// either joins words with commas and a last or.
func either(words []string) string {
	if n := len(words); n > 1 {
		return some(words[:n-1]) + " or " + words[n-1]
	}
	return some(words)
}

// stepEntries gives the readable entries of one step of the record that ended in one of the results.
func stepEntries(root *entry, step string, results ...string) []*entry {
	var out []*entry
	for _, e := range root.items("steps") {
		if e.word("step") == step && slices.Contains(results, e.word("result")) && known(e.child("at")) {
			out = append(out, e)
		}
	}
	return out
}

// newest gives the entry with the latest time, of equal ones the last; nil without any.
func newest(entries []*entry) *entry {
	var out *entry
	for _, e := range entries {
		if out == nil || !e.when("at").Before(out.when("at")) {
			out = e
		}
	}
	return out
}

// checkFollowUp proves that nothing is followed up before it was handed over, and nothing that held before its days
// are over.
func (r *reader) checkFollowUp(root *entry) {
	handed := stepEntries(root, StepHandedOver, "done")
	for _, e := range stepEntries(root, StepFollowedUp, "done", "failed") {
		at := e.child("at")
		earlier := slices.DeleteFunc(slices.Clone(handed), func(h *entry) bool { return h.when("at").After(at.time) })
		last := newest(earlier)
		switch {
		case last == nil && len(handed) > 0:
			r.conflict(at, handed[0].child("at"), "nothing is followed up before it was handed over", "")
		case last != nil && e.word("result") == "done" && days(last.when("at"), at.time) < HeldDays:
			r.conflict(at, last.child("at"), fmt.Sprintf("the board was handed over %s before, and counts as followed up after %d",
				countOf(days(last.when("at"), at.time), "day"), HeldDays), "enter it when the days are over; if it failed before, the result is failed")
		}
	}
}

// days counts the calendar days between two times as they were written.
func days(from, to time.Time) int { return int(day(to).Sub(day(from)) / (24 * time.Hour)) }

// checkHeld holds the word that a repair held for its days against what the record says of them.
func (r *reader) checkHeld(root *entry) {
	word, closed := root.at("outcome.confirmed_by"), root.at("outcome.closed")
	if word == nil || word.text != "held-30-days" {
		return
	}
	if last := newest(stepEntries(root, StepFollowedUp, "done", "failed")); last.word("result") == "failed" {
		r.conflict(word, last.child("result"), "the follow-up found that the repair did not hold", "")
	}
	for _, from := range []*entry{root.at("rebuild.done"), newest(stepEntries(root, StepHandedOver, "done")).child("at")} {
		if known(from) && known(closed) && days(from.time, closed.time) < HeldDays {
			r.fault(word.node, word.path, fmt.Sprintf("held-30-days contradicts %s %s with %s %s: there are fewer than %d days between them",
				from.path, from.shown(), closed.path, closed.shown(), HeldDays), "close the case when the days are over, or write reproduced or plausible")
		}
	}
}

// checkBrakeTested holds the record of the brake resistor against whether there is a brake.
func (r *reader) checkBrakeTested(root *entry) {
	s := stack{layers: []layer{{root.child("rebuild"), true, true}, {root.child("board"), true, true}}}
	fitted := s.find("stages.brake.fitted")
	for _, e := range root.items("steps") {
		result := e.child("result")
		if e.word("step") != StepBrakeResistorTested || result == nil {
			continue
		}
		switch {
		case result.text == "not-fitted" && fitted.word() == "yes":
			r.conflict(result, fitted.entry, "there is a brake resistor to test", "")
		case result.text == "done" && fitted.word() == "no":
			r.conflict(result, fitted.entry, "there is no brake resistor to test", "")
		}
	}
	for _, e := range root.at("safety.before").children() {
		if c := e.child("brake_resistor"); e.word("brake_resistor") == "connected" && fitted.word() == "no" {
			r.conflict(c, fitted.entry, "there is no brake resistor to connect", "")
		}
	}
}
