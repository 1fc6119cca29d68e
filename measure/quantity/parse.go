package quantity

import (
	"fmt"
	"math"
	"strings"
	"unicode"
	"unicode/utf8"
)

const longestText = 120 // characters

// Parse reads a quantity of the wanted unit: "310 V", "4k7", "120 nH ±20 %", "120 nH -10/+20 %", "4 kΩ to 6 kΩ",
// "4..6 kΩ". With Any the unit is taken from the text, which then must name it. A bare number is read for Count and
// Ratio only. Of an interval without a stated value the middle is the value. Errors are one line: what is wrong,
// what is allowed, what to write.
func Parse(text string, want Unit) (Quantity, error) {
	p, err := newParser(text, want)
	if err != nil {
		return Quantity{}, err
	}
	q, err := p.quantity()
	if err != nil {
		return Quantity{}, err
	}
	q.Text = text
	return q, nil
}

// parser reads one text.
type parser struct {
	scanner
	text string // as written
	want Unit
	word bool // a word would be accepted too
}

func newParser(text string, want Unit) (*parser, error) {
	if want == "" {
		want = Any // the zero Unit wants nothing in particular
	}
	p := &parser{scanner: scanner{s: strings.Trim(plainText(text), " ")}, text: text, want: want}
	if _, known := kindOf(want); !known && want != Any {
		return nil, fmt.Errorf("unknown unit %q; wanted is one of %s", shorten(string(want)), joinUnits())
	}
	switch {
	case !utf8.ValidString(text):
		return nil, p.fault("is not UTF-8 text", "write it anew in a UTF-8 editor")
	case p.s == "":
		return nil, fmt.Errorf("empty where a value belongs; %s", p.example())
	case utf8.RuneCountInString(text) > longestText:
		return nil, p.fault(fmt.Sprintf("is longer than %d characters", longestText), p.example())
	}
	return p, p.commaFault()
}

// term is one number with what stands after it.
type term struct {
	digits decimal
	scale  scale
	unit   Unit   // "" when the text names none
	text   string // the number with its unit
	bare   string // the number alone; of a code, its decimal form
	start  int    // where it stands
	end    int
}

// quantity reads a value with a tolerance, or an interval, to the end of the text.
func (p *parser) quantity() (Quantity, error) {
	first, err := p.term()
	if err != nil {
		return Quantity{}, err
	}
	p.space()
	if p.done() {
		return p.single(first)
	}
	if q, found, err := p.tolerance(first); found || err != nil {
		return q, err
	}
	if p.rangeSign() {
		return p.interval(first)
	}
	return Quantity{}, p.leftover(first)
}

func (p *parser) single(t term) (Quantity, error) {
	v, unit, err := p.value(t)
	return Of(v, unit), err
}

// rangeSign takes what stands between the ends of an interval.
func (p *parser) rangeSign() bool {
	start := p.pos
	if p.take("to") && !p.done() {
		if next, _ := utf8.DecodeRuneInString(p.rest()); !unicode.IsLetter(next) {
			return true
		}
	}
	p.pos = start
	return p.takeAny("...", "..", "…", "–", "—", "-")
}

// interval reads the upper end; an end without a unit takes that of the other one.
func (p *parser) interval(first term) (Quantity, error) {
	p.space()
	second, err := p.term()
	if err != nil {
		return Quantity{}, err
	}
	if p.space(); !p.done() {
		return Quantity{}, p.leftover(second)
	}
	switch {
	case first.unit == "" && second.unit == "" && p.want != Count && p.want != Ratio:
		return Quantity{}, p.missingUnit(second)
	case first.unit == "":
		first.unit, first.scale = second.unit, second.scale
	case second.unit == "":
		return Quantity{}, p.fault("has no unit at its upper end", fmt.Sprintf("write both ends with their unit, like %s", p.intervalExample(first.unit)))
	}
	low, unit, err := p.value(first)
	if err != nil {
		return Quantity{}, err
	}
	high, upper, err := p.value(second)
	switch {
	case err != nil:
		return Quantity{}, err
	case unit != upper:
		return Quantity{}, p.fault(fmt.Sprintf("goes from %s to %s", describe(unit), describe(upper)), "write both ends in one unit")
	case low > high:
		return Quantity{}, p.fault("has its larger end first", fmt.Sprintf("write %s to %s", second.text, first.text))
	}
	return Quantity{Value: low/2 + high/2, Low: low, High: high, Unit: unit}, nil
}

// term reads one number: an RKM code, or digits with a code letter or a unit behind them.
func (p *parser) term() (term, error) {
	start := p.pos
	sign := p.sign()
	p.space()
	digits, letter, coded := p.codeInfix()
	if !coded {
		var found bool
		if digits, found = p.number(); !found {
			return term{}, p.noNumber()
		}
	}
	digits.text = sign + digits.text
	t := term{digits: digits, scale: scale{0, 1}, bare: p.s[start:p.pos], start: start}
	space := p.pos
	p.space()
	if !coded {
		letter, coded = p.codeSuffix(p.want)
	}
	symbol, found := p.unitAfter(coded, letter)
	if !found && !coded {
		p.pos = space
	}
	t.text, t.end = p.s[start:p.pos], p.pos
	switch {
	case coded:
		t.bare = digits.text
		return p.decode(t, letter, symbol, found)
	case found:
		t.unit, t.scale = symbol.unit, symbol.scale
		return t, nil
	}
	return t, p.unknownUnit(t)
}

// unitAfter takes the unit behind a number or a code.
func (p *parser) unitAfter(coded bool, letter rune) (spelling, bool) {
	start := p.pos
	p.space()
	if symbol, found := p.unit(); found {
		return symbol, true
	}
	p.pos = start
	return spelling{}, false
}

// decode gives a code its multiplier and its unit.
func (p *parser) decode(t term, letter rune, symbol spelling, named bool) (term, error) {
	unit := p.want
	if named {
		unit = symbol.unit
	}
	number := strings.TrimPrefix(t.digits.text, "-")
	switch {
	case named && (!symbol.plain || rkmExponent[unit] == nil):
		return term{}, p.fault("has a code letter and a unit that do not go together", "write 4k7, 4k7 Ω or 4.7 kΩ")
	case unit == Any:
		return term{}, p.fault("is a code without a unit", p.codeFix(t, letter))
	case rkmExponent[unit] == nil:
		return term{}, p.fault(fmt.Sprintf("is a code, and codes are for Ω, F and H; wanted is %s", describe(unit)), p.example())
	}
	exponent, found := rkmExponent[unit][letter]
	if prefixed, known := spellings[string(letter)+string(unit)]; named && !found && known {
		exponent, found = prefixed.scale.exponent, true
	}
	if !found {
		return term{}, p.fault(fmt.Sprintf("has the letter %c, which is no code for %s", letter, describe(unit)), p.letterFix(number, unit))
	}
	t.unit, t.scale = unit, scale{exponent, 1}
	return t, nil
}

// value takes a term to the SI unit and checks it against the wanted one.
func (p *parser) value(t term) (float64, Unit, error) {
	unit := t.unit
	switch {
	case unit == "" && (p.want == Count || p.want == Ratio):
		unit = p.want
	case unit == "":
		return 0, "", p.missingUnit(t)
	case p.want != Any && unit != p.want:
		return 0, "", p.wrongUnit(t)
	}
	v, fault := t.digits.si(t.scale)
	if fault != "" {
		return 0, "", p.fault(fault, p.example())
	}
	if unit == Count && (v < 0 || !t.digits.whole()) {
		return 0, "", p.fault("is no count", "write a whole number from 0 up, like 3")
	}
	return v, unit, nil
}

// within makes a quantity from a value and its distances, all finite.
func (p *parser) within(v, below, above float64, unit Unit) (Quantity, error) {
	q := Quantity{Value: v, Low: v - below, High: v + above, Unit: unit}
	if math.IsInf(q.Low, 0) || math.IsInf(q.High, 0) {
		return Quantity{}, p.fault("has an interval too large to compute with", p.example())
	}
	return q, nil
}
