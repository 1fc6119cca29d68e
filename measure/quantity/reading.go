package quantity

import (
	"fmt"
	"strings"
	"unicode"
)

// overTexts are the ways in which meters show that the value lies above their range.
var overTexts = []string{"over range", "over-range", "overrange", "over load", "overload", "overflow",
	"o.l.", "o.l", ".ol", "ol", "0.l.", "0.l", ".0l", "0l", "∞"}

// limitTexts stand before the limit of a one-sided reading.
var limitTexts = []struct {
	text string
	kind ReadingKind
}{
	{">=", Above}, {">", Above}, {"above ", Above}, {"over ", Above}, {"more than ", Above}, {"at least ", Above},
	{"<=", Below}, {"<", Below}, {"below ", Below}, {"under ", Below}, {"less than ", Below}, {"at most ", Below},
}

// ParseReading reads what an instrument showed: a quantity as Parse reads it, "OL" or "over range" (with a unit or
// without), "> 20 MΩ" or "above 20 MΩ", "< 0.2 Ω" or "below 0.2 Ω", or one word of letters and hyphens
// ("shorted"), which is accepted for every unit and given in lower case. want may be Any or "". Errors are as in Parse.
func ParseReading(text string, want Unit) (Reading, error) {
	p, err := newParser(text, want)
	if err != nil {
		return Reading{}, err
	}
	p.word = true
	r, err := p.reading()
	if err != nil {
		return Reading{}, err
	}
	r.Text = text
	return r, nil
}

func (p *parser) reading() (Reading, error) {
	if r, found, err := p.overRange(); found || err != nil {
		return r, err
	}
	if kind, found := p.limitSign(); found {
		return p.limit(kind)
	}
	if isWord(strings.ToLower(p.s)) {
		return p.wordReading()
	}
	q, err := p.quantity()
	if err != nil {
		return Reading{}, err
	}
	kind := Between
	if q.Exact() {
		kind = Point
	}
	return Reading{Kind: kind, Value: q.Value, Low: q.Low, High: q.High, Unit: q.Unit}, nil
}

// overRange takes OL in its many forms, alone or with a unit behind it.
func (p *parser) overRange() (Reading, bool, error) {
	lower := strings.ToLower(p.s)
	for _, text := range overTexts {
		if !strings.HasPrefix(lower, text) || len(lower) != len(p.s) {
			continue
		}
		rest := scanner{p.s, len(text)}
		rest.space()
		if rest.done() {
			return Reading{Kind: Over, Unit: p.want}, true, nil
		}
		symbol, named := rest.unit()
		if !named || !rest.done() {
			continue
		}
		if p.want != Any && symbol.unit != p.want {
			return Reading{}, true, p.fault(fmt.Sprintf("is in %s, wanted is %s", describe(symbol.unit), describe(p.want)), "write OL")
		}
		return Reading{Kind: Over, Unit: symbol.unit}, true, nil
	}
	return Reading{}, false, nil
}

func (p *parser) limitSign() (ReadingKind, bool) {
	lower := strings.ToLower(p.s)
	for _, l := range limitTexts {
		if strings.HasPrefix(lower, l.text) && len(lower) == len(p.s) {
			p.pos = len(l.text)
			p.space()
			return l.kind, true
		}
	}
	return Point, false
}

// limit reads the single value behind > or <.
func (p *parser) limit(kind ReadingKind) (Reading, error) {
	q, err := p.quantity()
	if err != nil {
		return Reading{}, err
	}
	if !q.Exact() {
		return Reading{}, p.fault("has a limit that is itself an interval", "write one limit, like > 20 MΩ, or the interval alone")
	}
	return Reading{Kind: kind, Value: q.Value, Low: q.Value, High: q.Value, Unit: q.Unit}, nil
}

// isWord tells whether a text is one word of letters and hyphens.
func isWord(text string) bool {
	letters := 0
	for _, r := range text {
		if !unicode.IsLetter(r) && r != '-' {
			return false
		}
		if r != '-' {
			letters++
		}
	}
	return letters > 0 && text[0] != '-' && text[len(text)-1] != '-'
}

// wordReading refuses the words that only look like one: a unit without a number, and what is no number.
func (p *parser) wordReading() (Reading, error) {
	word := alike.Replace(strings.ToLower(p.s)) // the small Μ is one more micro sign
	_, asWritten := spellings[p.s]
	if _, isUnit := spellings[word]; isUnit || asWritten {
		return Reading{}, p.fault("is a unit without a number", p.example())
	}
	switch word {
	case "nan", "inf", "infinity", "infinite":
		return Reading{}, p.fault("is no reading", "write OL if the meter showed over range, else leave it out")
	}
	return Reading{Kind: Word, Unit: Any, Word: word}, nil
}

// String prints the reading in its canonical form: "5 kΩ", "> 20 MΩ", "OL", "shorted". ParseReading reads it back.
func (r Reading) String() string {
	switch r.Kind {
	case Above:
		return "> " + Format(r.Low, r.Unit)
	case Below:
		return "< " + Format(r.High, r.Unit)
	case Over:
		return "OL"
	case Word:
		return r.Word
	}
	return Quantity{Value: r.Value, Low: r.Low, High: r.High, Unit: r.Unit}.String()
}
