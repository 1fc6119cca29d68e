package main

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// bareNumber is a reading typed without its unit.
var bareNumber = regexp.MustCompile(`^([<>]|above|below)?\s*[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$`)

// answerTo reads what was typed for a test: a result by name, skipped or later, or a reading. A number without a unit
// gets the unit of the test. The error says what may be typed.
func answerTo(t *knowledge.Test, text string) (measure.Observation, error) {
	o := measure.Observation{Test: t.ID}
	text = strings.TrimSpace(text)
	word := strings.ToLower(text)
	switch {
	case t.Result(word) != nil:
		o.Result = word
		return o, nil
	case word == "skipped" || word == "later":
		o.Answer = word
		return o, nil
	case t.Unit == "":
		return o, wrongInput(fmt.Sprintf("%s has no result %q", t.ID, text), "its results are "+strings.Join(resultIDs(t), ", "))
	}
	text = withTestUnit(t.Unit, text)
	r, err := quantity.ParseReading(text, t.Unit)
	if err != nil {
		return o, wrongInput(err.Error(), "or give a result by name: "+strings.Join(resultIDs(t), ", "))
	}
	if r.Kind == quantity.Word {
		return o, wrongInput(fmt.Sprintf("%s has no result %q", t.ID, text), "give a reading in "+string(t.Unit)+", or one of: "+strings.Join(resultIDs(t), ", "))
	}
	// In a case file a reading carries its unit; a code such as 4k7 is written out.
	if alone, err := quantity.ParseReading(r.Text, quantity.Any); err != nil || alone.Unit != r.Unit {
		r.Text = r.String()
		if _, err := quantity.ParseReading(r.Text, quantity.Any); err != nil {
			return o, wrongInput(fmt.Sprintf("%q needs its unit", text), "write it with its unit, such as "+sampleReading(t.Unit))
		}
	}
	o.Reading = &r
	return o, nil
}

// sampleReading is how a reading of a unit is written in full.
func sampleReading(unit quantity.Unit) string {
	if unit == quantity.Ratio {
		return "98 % or 100 % to 200 %"
	}
	return "3 " + string(unit)
}

// withTestUnit puts the unit of a test behind a bare number. A ratio is written in per cent: in a case file a bare
// number is refused.
func withTestUnit(unit quantity.Unit, text string) string {
	m := bareNumber.FindStringSubmatch(text)
	switch {
	case m == nil || unit == quantity.Count:
		return text
	case unit != quantity.Ratio:
		return text + " " + string(unit)
	}
	number := strings.TrimSpace(strings.TrimPrefix(text, m[1]))
	v, err := strconv.ParseFloat(number, 64)
	if err != nil {
		return text
	}
	return strings.TrimSpace(m[1] + " " + strconv.FormatFloat(100*v, 'g', 12, 64) + " %")
}

func resultIDs(t *knowledge.Test) []string {
	var ids []string
	for _, r := range t.Results {
		ids = append(ids, r.ID)
	}
	return ids
}

// place puts an observation at a part or a position of the board, and says what the board has if that is none of it.
func place(b measure.Board, t *knowledge.Test, o *measure.Observation, part, position string) error {
	var parts, positions []string
	for _, p := range b.Positions() {
		positions = append(positions, p.Name)
		parts = append(parts, p.Parts...)
	}
	switch {
	case part != "" && !slices.Contains(parts, part):
		return noSuch("part", part, nearestOf(part, parts), "this board has "+strings.Join(parts, ", "))
	case position != "" && !slices.Contains(positions, position):
		return noSuch("position", position, nearestOf(position, positions), "this board has "+strings.Join(positions, ", "))
	case part == "" && position == "" && t.Per != "" && len(positions) > 1:
		return wrongCommand(t.ID+" is taken at a place of the board", "add --position "+strings.Join(positions, "|")+", or --part "+strings.Join(parts, "|"))
	case part == "" && position == "" && t.Per != "":
		position = positions[0]
	case part != "" && position != "" && b.PositionOf(part) != position:
		return wrongInput(part + " is in position " + b.PositionOf(part) + ", not in " + position)
	}
	o.Part, o.Position = part, position
	return nil
}

// nearestOf gives the name that equals another but for case and punctuation, "" when none does.
func nearestOf(name string, names []string) string {
	bare := func(s string) string {
		return strings.Map(func(r rune) rune {
			if r == '-' || r == '_' || r == '.' || r == ' ' {
				return -1
			}
			return r
		}, strings.ToLower(s))
	}
	for _, n := range names {
		if bare(n) == bare(name) {
			return n
		}
	}
	return ""
}

// echo says how an observation was taken: "0.4 Ω at Q2: shorted 98 %, leaky 2 %".
func echo(t *knowledge.Test, b measure.Board, o measure.Observation) string {
	text := o.Result + o.Answer
	if o.Reading != nil {
		text = o.Reading.Text
	}
	switch {
	case o.Part != "":
		text += " at " + o.Part
	case o.Position != "":
		text += " at " + o.Position
	}
	if o.Reading != nil {
		if shares := sharesText(diagnose.ReadAs(t, b, o)); shares != "" {
			text += ": " + shares
		}
	} else if r := t.Result(o.Result); r != nil && r.Means != "" {
		text += ": " + r.Means
	}
	return text
}

// sharesText prints what a reading fits: "shorted 98 %, leaky 2 %".
func sharesText(shares []diagnose.Share) string {
	var words []string
	for _, s := range shares {
		switch p := 100 * s.P; {
		case p > 99:
			words = append(words, s.Result+" >99 %")
		case p >= 0.5:
			words = append(words, fmt.Sprintf("%s %.0f %%", s.Result, p))
		}
	}
	return strings.Join(words, ", ")
}

// afterwards says what stands against an observation that was just kept: that it does not count in the ranking, or
// that it was taken outside its hold point.
func (k *chain) afterwards(r *diagnose.Ranking) []string {
	var lines []string
	last := len(k.c.Observations) - 1
	o := k.c.Observations[last]
	if o.Answer == "" {
		for _, u := range r.Unbound {
			if u.Observation == last {
				lines = append(lines, "kept, but not counted in the ranking: "+u.Why)
			}
		}
	}
	t := k.base.Test(o.Test)
	if t == nil {
		return lines
	}
	if yes, missing := safety.OutsideHoldPoint(k.c, o, diagnose.WorkOf(t), k.evidence()); yes {
		lines = append(lines, "kept, and marked as taken outside its hold point:")
		for _, m := range missing {
			lines = append(lines, fmt.Sprintf("  point %d: %s", m.Point, m.Text))
		}
	}
	return lines
}
