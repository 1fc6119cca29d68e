package quantity

import (
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// alikes pairs each sign that looks like one of ours with ours, for all the code points a keyboard or a data sheet
// gives.
var alikes = []string{"\u2126", "Ω", "\u03bc", "µ", "\u212a", "K", "\u2103", "°C", "\u00ba", "°",
	"\u2212", "-", "\u2010", "-", "\u2011", "-", "\u22c5", "·", "\u2219", "·",
	"\u200b", "", "\u2060", "", "\ufeff", "", "≥", ">=", "≤", "<="}

// alike puts our sign for each of them.
var alike = strings.NewReplacer(alikes...)

// plainText gives the text with one code point for each sign and one kind of space.
func plainText(text string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsSpace(r) {
			return ' '
		}
		return r
	}, alike.Replace(text))
}

// shorten gives the text as messages quote it.
func shorten(text string) string {
	const most = 40
	if utf8.RuneCountInString(text) <= most {
		return text
	}
	return string([]rune(text)[:most]) + "…"
}

// decimal is a number as written: sign, digits and point, and a power of ten.
type decimal struct {
	text     string
	exponent int
}

// si gives the value in the SI unit. It tells why a number cannot be held: "" if it can.
func (d decimal) si(s scale) (value float64, fault string) {
	value, _ = strconv.ParseFloat(d.text+"e"+strconv.Itoa(d.exponent+s.exponent), 64)
	value *= s.factor
	switch {
	case math.IsInf(value, 0):
		return 0, "is too large to compute with"
	case value == 0 && strings.ContainsAny(d.text, "123456789"):
		return 0, "is too small to compute with"
	case value == 0:
		return 0, "" // no negative zero
	}
	return value, ""
}

// whole tells whether the number has no part behind the point.
func (d decimal) whole() bool {
	value, fault := d.si(scale{0, 1})
	return fault == "" && value == math.Trunc(value)
}

// scanner walks over a plain text.
type scanner struct {
	s   string
	pos int
}

func (p *scanner) rest() string { return p.s[p.pos:] }

func (p *scanner) done() bool { return p.pos >= len(p.s) }

func (p *scanner) space() {
	for !p.done() && p.s[p.pos] == ' ' {
		p.pos++
	}
}

// take moves over a literal text if it stands here.
func (p *scanner) take(literal string) bool {
	if !strings.HasPrefix(p.rest(), literal) {
		return false
	}
	p.pos += len(literal)
	return true
}

// takeAny moves over the first of the literals that stands here.
func (p *scanner) takeAny(literals ...string) bool {
	for _, l := range literals {
		if p.take(l) {
			return true
		}
	}
	return false
}

func digitAt(s string, i int) bool { return i >= 0 && i < len(s) && s[i] >= '0' && s[i] <= '9' }

// sign takes a sign and gives "-" or "".
func (p *scanner) sign() string {
	if p.take("-") {
		return "-"
	}
	p.take("+")
	return ""
}

// number takes digits, grouped by threes with spaces or not, with a decimal point and a power of ten.
func (p *scanner) number() (decimal, bool) {
	digits := p.digits()
	if !digitAt(p.s, p.pos) && strings.HasPrefix(p.rest(), ".") && digitAt(p.s, p.pos+1) {
		p.pos++
		digits += "." + p.run()
	}
	if digits == "" {
		return decimal{}, false
	}
	return decimal{digits, p.power()}, true
}

func (p *scanner) run() string {
	start := p.pos
	for digitAt(p.s, p.pos) {
		p.pos++
	}
	return p.s[start:p.pos]
}

// digits takes a run of digits and the groups of exactly three that follow it after single spaces.
func (p *scanner) digits() string {
	digits := p.run()
	if len(digits) == 0 || len(digits) > 3 || digits[0] == '0' {
		return digits
	}
	for strings.HasPrefix(p.rest(), " ") {
		group := p.rest()[1:]
		if !digitAt(group, 0) || !digitAt(group, 1) || !digitAt(group, 2) || digitAt(group, 3) {
			return digits
		}
		digits += group[:3]
		p.pos += 4
	}
	return digits
}

// power takes e±digits; powers beyond any float64 are cut to one that overflows or vanishes.
func (p *scanner) power() int {
	rest := p.rest()
	if rest == "" || (rest[0] != 'e' && rest[0] != 'E') {
		return 0
	}
	at := 1
	if len(rest) > 1 && (rest[1] == '-' || rest[1] == '+') {
		at = 2
	}
	if !digitAt(rest, at) {
		return 0
	}
	p.pos += at
	power, err := strconv.Atoi(p.run())
	if err != nil || power > 9999 {
		power = 9999
	}
	if rest[1] == '-' {
		return -power
	}
	return power
}

// bounded tells whether a unit that ends here ends: nothing follows that would carry it on.
func bounded(rest string) bool {
	r, size := utf8.DecodeRuneInString(rest)
	if size == 0 {
		return true
	}
	if r == '/' || r == '·' {
		next, _ := utf8.DecodeRuneInString(rest[size:])
		return !unicode.IsLetter(next)
	}
	return !unicode.IsLetter(r) && !unicode.IsDigit(r) && !strings.ContainsRune("%°²^⁻¹_", r)
}

// unit takes the longest spelling of a unit that stands here.
func (p *scanner) unit() (spelling, bool) {
	ends := make([]int, 0, spellingLength+1)
	for i := range p.rest() {
		if ends = append(ends, i); len(ends) > spellingLength {
			break
		}
	}
	if len(ends) <= spellingLength {
		ends = append(ends, len(p.rest()))
	}
	for n := len(ends) - 1; n > 0; n-- {
		text := p.rest()[:ends[n]]
		if s, found := spellings[text]; found && bounded(p.rest()[ends[n]:]) {
			p.pos += ends[n]
			return s, true
		}
	}
	return spelling{}, false
}

// nextWord gives what stands here up to the next space, for messages.
func (p *scanner) nextWord() string {
	word, _, _ := strings.Cut(p.rest(), " ")
	return word
}
