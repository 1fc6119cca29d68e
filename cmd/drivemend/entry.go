package main

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"drivemend/diagnose"
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
	word := strings.ToLower(strings.TrimSpace(text))
	switch {
	case t.Result(word) != nil:
		o.Result = word
		return o, nil
	case word == "skipped" || word == "later":
		o.Answer = word
		return o, nil
	case t.Unit == "":
		return o, noResult(t, text)
	}
	r, err := readingOf(t, text)
	if err == nil {
		o.Reading = &r
	}
	return o, err
}

// noResult says which results a test has, the one that is spelt most like what was typed first.
func noResult(t *knowledge.Test, text string) error {
	var hints []string
	if near := nearestOf(text, resultIDs(t)); near != "" {
		hints = append(hints, "did you mean "+near+"?")
	}
	allowed := "its results are " + strings.Join(resultIDs(t), ", ")
	if t.Unit != "" {
		allowed = "give a reading in " + string(t.Unit) + ", or one of: " + strings.Join(resultIDs(t), ", ")
	}
	if t.Unit == "" && strings.ContainsAny(text, "0123456789") {
		hints = append(hints, "it takes no number; keep yours beside the result that it shows: drivemend enter CASE "+t.ID+" "+strings.Join(resultIDs(t), "|")+" --note "+noteText(text))
	}
	return wrongInput(fmt.Sprintf("%s has no result %q", t.ID, strings.TrimSpace(text)), append(hints, allowed, "what they mean: drivemend rules show "+t.ID)...)
}

// noteText is a text as it is typed behind a flag.
func noteText(text string) string {
	return "'" + strings.ReplaceAll(strings.TrimSpace(text), "'", "") + "'"
}

// mostTimes is the highest bare number that is taken as a ratio: a part that shows more than five times its right value
// is told in per cent, as meters show it. Judgement.
const mostTimes = 5

// ambiguousRatio refuses a bare number that may be meant in per cent, and names both readings.
func ambiguousRatio(unit quantity.Unit, text string) error {
	m := bareNumber.FindStringSubmatch(text)
	if unit != quantity.Ratio || m == nil {
		return nil
	}
	number := strings.TrimSpace(strings.TrimPrefix(text, m[1]))
	v, err := strconv.ParseFloat(number, 64)
	if err != nil || math.Abs(v) <= mostTimes {
		return nil
	}
	sign := strings.TrimLeft(m[1]+" ", " ")
	percent := func(v float64) string { return "'" + sign + strconv.FormatFloat(v, 'g', 12, 64) + " %'" }
	return wrongInput(fmt.Sprintf("%q can be read in two ways", text), "write "+percent(v)+" where the meter shows per cent, or "+percent(100*v)+" for "+number+" times the right value")
}

// readingOf reads what an instrument showed in the unit of a test, as it can stand in a case file.
func readingOf(t *knowledge.Test, text string) (quantity.Reading, error) {
	if err := ambiguousRatio(t.Unit, strings.TrimSpace(text)); err != nil {
		return quantity.Reading{}, err
	}
	text = withTestUnit(t.Unit, strings.TrimSpace(text))
	r, err := quantity.ParseReading(text, t.Unit)
	if err != nil {
		return r, wrongInput(err.Error(), "or give a result by name: "+strings.Join(resultIDs(t), ", "))
	}
	if r.Kind == quantity.Word {
		return r, noResult(t, text)
	}
	// In a case file a reading carries its unit; a code such as 4k7 is written out.
	if alone, err := quantity.ParseReading(r.Text, quantity.Any); err != nil || alone.Unit != r.Unit {
		r.Text = r.String()
		if _, err := quantity.ParseReading(r.Text, quantity.Any); err != nil {
			return r, wrongInput(fmt.Sprintf("%q needs its unit", text), "write it with its unit, such as "+sampleReading(t.Unit))
		}
	}
	return r, nil
}

// within names the flag in front of what is wrong with its value.
func within(flag string, err error) error {
	if f, ok := err.(*failure); ok {
		return &failure{f.status, flag + ": " + f.message, f.hints}
	}
	return err
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

// boardsOf gives the boards a reading can be taken at: as found, and as rebuilt.
func boardsOf(c *measure.Case) []measure.Board {
	if c.Rebuild == nil {
		return []measure.Board{c.Board}
	}
	return []measure.Board{c.Board, c.Rebuild.Board}
}

// placesOf names the positions of some boards and their parts, each once.
func placesOf(boards []measure.Board) (positions, parts []string) {
	add := func(list *[]string, name string) {
		if !slices.Contains(*list, name) {
			*list = append(*list, name)
		}
	}
	for _, b := range boards {
		for _, p := range b.Positions() {
			add(&positions, p.Name)
			for _, part := range p.Parts {
				add(&parts, part)
			}
		}
	}
	return positions, parts
}

// place puts an observation at a part or a position of one of the boards, and says what there is if that is none of it.
func place(boards []measure.Board, t *knowledge.Test, o *measure.Observation, part, position string) error {
	positions, parts := placesOf(boards)
	switch {
	case part != "" && !slices.Contains(parts, part):
		return noSuch("part", part, nearestOf(part, parts), "this board has "+strings.Join(parts, ", "))
	case position != "" && !slices.Contains(positions, position):
		return noSuch("position", position, nearestOf(position, positions), "this board has "+strings.Join(positions, ", "))
	case part == "" && position == "" && t.Per != "" && len(positions) > 1:
		return wrongCommand(t.ID+" is taken at a place of the board", "add --position "+strings.Join(positions, "|")+", or --part "+strings.Join(parts, "|"))
	case part == "" && position == "" && t.Per != "":
		position = positions[0]
	case part != "" && position != "" && !slices.ContainsFunc(boards, func(b measure.Board) bool { return b.PositionOf(part) == position }):
		return wrongInput(part + " is in position " + boards[0].PositionOf(part) + ", not in " + position)
	}
	o.Part, o.Position = part, position
	return nil
}

// mostNear is how many tests a wrong name is answered with.
const mostNear = 4

// testsWith gives the tests whose id or title hold the words of a name, those with most of them first, at most mostNear.
func testsWith(base *knowledge.Base, name string) []*knowledge.Test {
	split := func(s string) []string {
		return strings.FieldsFunc(strings.ToLower(s), func(r rune) bool { return strings.ContainsRune("-_ ./,", r) })
	}
	hits := map[int][]*knowledge.Test{}
	words, most := split(name), 0
	for i := range base.Tests {
		t := &base.Tests[i]
		if t.Computed != "" {
			continue
		}
		known, n := append(split(t.ID), split(t.Title)...), 0
		for _, w := range words {
			if len(w) > 2 && nearestOf(w, known) != "" {
				n++
			}
		}
		hits[n], most = append(hits[n], t), max(most, n)
	}
	var out []*knowledge.Test
	for n := most; n > 0 && len(out) < mostNear; n-- {
		out = append(out, hits[n]...)
	}
	return out[:min(len(out), mostNear)]
}

// nearestOf gives the name that is spelt most like another, letters in capitals and punctuation left aside: one letter
// in three may differ. "" when none is so near.
func nearestOf(name string, names []string) string {
	name = bareName(name)
	best, least := "", len([]rune(name))/3+1
	for _, n := range names {
		if d := measure.Distance(name, bareName(n)); d < least {
			best, least = n, d
		}
	}
	return best
}

// bareName is a name without capitals and punctuation.
func bareName(s string) string {
	return strings.Map(func(r rune) rune {
		if r == '-' || r == '_' || r == '.' || r == ' ' {
			return -1
		}
		return r
	}, strings.ToLower(s))
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
