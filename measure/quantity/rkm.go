package quantity

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"
)

// The letter of an RKM code (IEC 60062) stands at the place of the decimal point and gives the multiplier. The
// standard's milli letter for resistors, L, is left out: 0L is how many meters show over range.
var rkmExponent = map[Unit]map[rune]int{
	Ohm:   {'R': 0, 'Ω': 0, 'k': 3, 'K': 3, 'M': 6, 'G': 9},
	Farad: {'p': -12, 'n': -9, 'u': -6, 'µ': -6, 'm': -3, 'F': 0},
	Henry: {'p': -12, 'n': -9, 'u': -6, 'µ': -6, 'm': -3, 'H': 0},
}

// rkmUnits is the order in which messages name the units that have codes.
var rkmUnits = []Unit{Ohm, Farad, Henry}

func hasCode(unit Unit) bool { return unit == Any || rkmExponent[unit] != nil }

// codeLetter tells whether a letter occurs in codes of the unit.
func codeLetter(letter rune, unit Unit) bool {
	for _, u := range rkmUnits {
		if _, found := rkmExponent[u][letter]; found && (unit == u || unit == Any) {
			return true
		}
	}
	return false
}

// codeInfix takes "4k7" or "k47": the letter between digits, or before them.
func (p *scanner) codeInfix() (digits decimal, letter rune, found bool) {
	start := p.pos
	before := p.run()
	letter, size := utf8.DecodeRuneInString(p.rest())
	if size == 0 || !codeLetter(letter, Any) || !digitAt(p.s, p.pos+size) {
		p.pos = start
		return decimal{}, 0, false
	}
	p.pos += size
	after := p.run()
	if before == "" {
		before = "0"
	}
	return decimal{before + "." + after, 0}, letter, true
}

// codeSuffix takes the letter of "47R", "100n" or "4.7 k": alone, with nothing that would make it a unit.
func (p *scanner) codeSuffix(want Unit) (letter rune, found bool) {
	letter, size := utf8.DecodeRuneInString(p.rest())
	if size == 0 || !codeLetter(letter, Any) || !bounded(p.rest()[size:]) {
		return 0, false
	}
	ahead := scanner{p.s, p.pos + size}
	ahead.space()
	symbol, follows := ahead.unit()
	symbolFollows := follows && symbol.plain && rkmExponent[symbol.unit] != nil
	if !symbolFollows && !p.readsAsCode(letter, want) {
		return 0, false
	}
	p.pos += size
	return letter, true
}

// readsAsCode tells whether a lone letter is a code letter and not the unit of the same letter: for resistance K
// is kilo, elsewhere kelvin; where the unit is open, only a K that touches its number stays in doubt.
func (p *scanner) readsAsCode(letter rune, want Unit) bool {
	_, isUnit := spellings[string(letter)]
	switch {
	case !hasCode(want):
		return false
	case want == Any:
		return !isUnit || letter == 'K' && digitAt(p.s, p.pos-1)
	default:
		return !isUnit || codeLetter(letter, want)
	}
}

// FormatRKM prints resistance, capacitance or inductance as an RKM code of IEC 60062 with at most four significant
// digits: 4K7, R47, 2n2, 4u7. Resistance from 0.1 mΩ (and 0R for a link) to 999.9 GΩ, capacitance from 0.01 pF,
// inductance from 0.01 pH; anything else is an error.
func FormatRKM(value float64, unit Unit) (string, error) {
	letters, found := rkmLetters[unit]
	if !found {
		return "", fmt.Errorf("no RKM code for %s; codes are for Ω, F and H", describe(unit))
	}
	if value == 0 && unit == Ohm {
		return "0R", nil
	}
	if !(value > 0) || math.IsInf(value, 0) {
		return "", fmt.Errorf("no RKM code for %s; the value must be above zero", Format(value, unit))
	}
	_, digits, exponent := significant(value)
	chosen := letters[0]
	for _, l := range letters {
		if l.exponent <= exponent || unit == Ohm && l.exponent <= 0 {
			chosen = l
		}
	}
	places := exponent - chosen.exponent
	if places < zerosBefore || places > 2 {
		return "", fmt.Errorf("no RKM code for %s; write it with its unit", Format(value, unit))
	}
	return placeLetter(placePoint(digits, places), chosen.letter), nil
}

type rkmLetter struct {
	exponent int
	letter   string
}

var rkmLetters = map[Unit][]rkmLetter{
	Ohm:   {{0, "R"}, {3, "K"}, {6, "M"}, {9, "G"}},
	Farad: {{-12, "p"}, {-9, "n"}, {-6, "u"}, {-3, "m"}, {0, "F"}},
	Henry: {{-12, "p"}, {-9, "n"}, {-6, "u"}, {-3, "m"}, {0, "H"}},
}

// placeLetter puts the letter at the place of the decimal point.
func placeLetter(number, letter string) string {
	whole, part, _ := strings.Cut(number, ".")
	if n, _ := strconv.Atoi(whole); n == 0 {
		whole = ""
	}
	return whole + letter + part
}
