package quantity

import (
	"regexp"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// beyond are the faults that a pattern does not see.
var beyond = []string{"too large", "is no count", "too small", "larger end first", "longer than", "goes from", "has a tolerance in", "which can be meant in two ways"}

// oddTolerance is a two-sided tolerance, whose signs and units a pattern holds against each other only roughly, a
// letter that touches the word to, or a unit that begins with a digit behind thousands.
var oddTolerance = regexp.MustCompile(`[-+−].*/|\p{L}to|to\p{L}|\d \d{4}`)

// pieces are what quantities and near misses are made of.
var pieces = []string{"1", "4", "47", "0", "310", "123", " ", "\u00a0", "\u202f", ".", "e", "e3", "-", "\u2212", "+", "±", "/", "%", "to", " to ",
	"..", "…", "–", "V", "kV", "Ω", "\u2126", "ohm", "µ", "\u03bc", "u", "m", "k", "K", "\u212a", "M", "R", "p", "n", "F", "nF", "µH", "H", "s", "ns", "h",
	"°C", "\u2103", "K/W", "A", "A/µs", "kg·m²", "rpm", "pieces", "ratio", "x", ","}

// TestPatterns proves that a text matches the pattern of a unit exactly when Parse reads it, faults of size apart.
func TestPatterns(t *testing.T) {
	compiled := map[Unit]*regexp.Regexp{}
	for _, u := range append(Units(), Any) {
		compiled[u] = regexp.MustCompile(Pattern(u))
	}
	rapid.Check(t, func(t *rapid.T) {
		unit := rapid.SampledFrom(append(Units(), Any)).Draw(t, "unit")
		text := drawText(t, unit)
		q, err := Parse(text, unit)
		if unit == Count && err == nil && (!q.Exact() || strings.ContainsAny(text, "±-.…–\u2212toe")) {
			return // a key of a count takes one whole number
		}
		compare(t, compiled[unit].MatchString(text), text, string(unit), err)
	})
}

// drawText draws a text that is a quantity of the unit as often as not.
func drawText(t *rapid.T, unit Unit) string {
	whole := rapid.SampledFrom(pieces)
	if rapid.Bool().Draw(t, "anything") {
		return strings.Join(rapid.SliceOfN(whole, 1, 6).Draw(t, "pieces"), "")
	}
	var fitting []string
	for _, s := range spellingOrder {
		if unit == Any || spellings[s].unit == unit {
			fitting = append(fitting, s)
		}
	}
	number := rapid.SampledFrom([]string{"4", "4.7", ".5", "1 000", "-3", "+ 2", "5e-3", "4k7", "R47", "2n2", "100", "4k", "10 M", "1F", "4n7"})
	symbol := rapid.OneOf(rapid.SampledFrom(fitting), rapid.SampledFrom([]string{"", "", "%", "Ω", "F"}))
	space := rapid.SampledFrom([]string{"", " ", "  ", "\u00a0"})
	join := rapid.SampledFrom([]string{"±", "+/-", " ±", " to ", "to", "..", " - ", "-", "…"})
	text := number.Draw(t, "number") + space.Draw(t, "space") + symbol.Draw(t, "symbol")
	switch rapid.IntRange(0, 3).Draw(t, "form") {
	case 0:
		text += join.Draw(t, "join") + space.Draw(t, "space") + number.Draw(t, "number") + space.Draw(t, "space") + symbol.Draw(t, "symbol")
	case 1:
		text += " -" + number.Draw(t, "number") + symbol.Draw(t, "symbol") + "/+" + number.Draw(t, "number") + symbol.Draw(t, "symbol")
	}
	return text
}

// compare holds what a pattern says against what the parser says.
func compare(t *rapid.T, matches bool, text, unit string, err error) {
	if matches == (err == nil) {
		return
	}
	if err != nil {
		for _, b := range beyond {
			if strings.Contains(err.Error(), b) {
				return
			}
		}
	}
	if matches && oddTolerance.MatchString(text) {
		return
	}
	t.Fatalf("%q as %s: the pattern says %v, the parser %v", text, unit, matches, err)
}

// TestReadingPatterns proves the same of readings.
func TestReadingPatterns(t *testing.T) {
	figure, word, never := ReadingPatterns()
	isFigure, isWord, isNever := regexp.MustCompile(figure), regexp.MustCompile(word), regexp.MustCompile(never)
	starts := append([]string{"", "", "> ", "<", "≥", "above ", "Below ", "OL", "over range ", "0L", "at least "}, overTexts...)
	words := []string{"shorted", "hot", "one-of-bank", "V", "s", "MIN", "ohms", "nan", "Inf", "-a", "a-", "a b", "no", "µF"}
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.SampledFrom(starts).Draw(t, "start") + drawText(t, Any)
		if rapid.Bool().Draw(t, "word") {
			text = rapid.SampledFrom(words).Draw(t, "word")
		}
		r, err := ParseReading(text, Any)
		if (r.Kind == Above || r.Kind == Below) && regexp.MustCompile(`to|\.\.|…|–|[^<>\s]\s*[-±]`).MatchString(text) {
			return // > 4 V to 4 V
		}
		compare(t, isFigure.MatchString(text) || isWord.MatchString(text) && !isNever.MatchString(text), text, "reading", err)
	})
}
