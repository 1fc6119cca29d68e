package quantity

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// fault makes the error for this text.
func (p *parser) fault(wrong, fix string) error {
	return fmt.Errorf("%q %s; %s", shorten(p.text), wrong, fix)
}

// example says how a value of the wanted unit is written.
func (p *parser) example() string {
	switch p.want {
	case Any:
		return "write a number with its unit, like 310 V"
	case Count:
		return "write a whole number, like 3"
	case Ratio:
		return "write a number or per cent, like 0.8 or 80 %"
	}
	return "write it like " + p.withUnits("4.7")
}

// withUnits gives a number with each usual unit of the wanted kind.
func (p *parser) withUnits(number string) string {
	return p.rewritten(term{bare: number, start: len(p.s), end: len(p.s)}, len(p.s))
}

// rewritten gives the text from a place on, with each usual unit of the wanted kind behind a term's number.
func (p *parser) rewritten(t term, from int) string {
	k, _ := kindOf(p.want)
	var list []string
	for _, u := range k.usual {
		list = append(list, p.s[from:t.start]+strings.TrimSpace(t.bare+" "+u)+p.s[t.end:])
	}
	return orList(list)
}

// orList joins alternatives: "a, b or c".
func orList(list []string) string {
	if n := len(list); n > 1 {
		return strings.Join(list[:n-1], ", ") + " or " + list[n-1]
	}
	return strings.Join(list, "")
}

// commaFault finds a comma between digits: a decimal comma, or thousands, which cannot be told apart.
func (p *parser) commaFault() error {
	for i := range p.s {
		if p.s[i] != ',' || !digitAt(p.s, i+1) {
			continue
		}
		pointed := strings.Replace(p.s, ",", ".", 1)
		if strings.HasPrefix(pointed, ".") {
			pointed = "0" + pointed
		}
		fix := "write " + shorten(pointed)
		if digitAt(p.s, i+3) && !digitAt(p.s, i+4) && i > 0 && p.s[:i] != "0" {
			fix += ", or " + shorten(strings.Replace(p.s, ",", "", 1)) + " if the comma parts thousands"
		}
		return p.fault("has a decimal comma", fix)
	}
	return nil
}

// codeFix names the units that a code without one could have.
func (p *parser) codeFix(t term, letter rune) string {
	var list []string
	for _, u := range rkmUnits {
		exponent, found := rkmExponent[u][letter]
		if value, fault := t.digits.si(scale{exponent, 1}); found && fault == "" {
			list = append(list, p.s[:t.start]+Format(value, u)+p.s[t.end:])
		}
	}
	if letter == 'K' {
		list = append(list, p.s[:t.start]+t.bare+" K"+p.s[t.end:])
	}
	return "write " + orList(list)
}

// letterFix shows what was probably meant; a small m beside resistance may be milli or mega.
func (p *parser) letterFix(number string, unit Unit) string {
	if unit == Ohm {
		return fmt.Sprintf("write %s mΩ, %s kΩ or %s MΩ", number, number, number)
	}
	return fmt.Sprintf("write p, n, u or m before %s", unit)
}

func (p *parser) noNumber() error {
	if p.done() {
		return p.fault("ends where a number belongs", p.example())
	}
	word := strings.TrimRight(strings.ToLower(p.nextWord()), ".")
	for _, vague := range []string{"about", "approx", "approximately", "ca", "circa", "around"} {
		if word == vague || strings.HasPrefix(word, "~") || strings.HasPrefix(word, "≈") {
			return p.fault("does not say how wide the doubt is", "write a tolerance or an interval, like 5 kΩ ±20 % or 4 kΩ to 6 kΩ")
		}
	}
	fix := p.example()
	if strings.ContainsAny(p.rest()[:1], "<>") {
		return p.fault("is a limit where a value belongs", "write the value, or an interval like "+p.intervalExample(p.want))
	}
	if p.word {
		fix += ", OL, or one word with hyphens"
	}
	return p.fault(fmt.Sprintf("has %q where a number belongs", shorten(p.nextWord())), fix)
}

// unknownUnit complains about letters behind a number that are no unit, and about nothing else.
func (p *parser) unknownUnit(t term) error {
	ahead := scanner{p.s, p.pos}
	ahead.space()
	word := ahead.nextWord()
	first, _ := utf8.DecodeRuneInString(word)
	if first == '/' {
		first, _ = utf8.DecodeRuneInString(word[1:])
	}
	if (&parser{scanner: ahead}).rangeSign() || !unicode.IsLetter(first) && first != '°' {
		return nil
	}
	t.end = ahead.pos + len(word)
	fix := p.example()
	if near := resembling(word, p.want); len(near) > 0 {
		for i, n := range near {
			near[i] = t.bare + " " + n
		}
		fix = "capitals matter, write " + orList(near)
	} else if !strings.ContainsAny(word, "0123456789") && p.want != Any && p.want != Count && p.want != Ratio {
		fix = "write " + p.rewritten(t, 0)
	}
	return p.fault(fmt.Sprintf("has an unknown unit %q", shorten(word)), fix)
}

func (p *parser) leftover(t term) error {
	return p.fault(fmt.Sprintf("has %q left over after %s", shorten(p.rest()), t.text), p.example())
}

func (p *parser) missingUnit(t term) error {
	if p.want == Any {
		return p.fault("has no unit", fmt.Sprintf("write it with its unit, like %s V; a count as %s pieces, a ratio in per cent", t.bare, t.bare))
	}
	return p.fault(fmt.Sprintf("has no unit, wanted is %s", describe(p.want)), "write "+p.rewritten(t, 0))
}

func (p *parser) wrongUnit(t term) error {
	wrong := fmt.Sprintf("is in %s, wanted is %s", describe(t.unit), describe(p.want))
	if t.unit == Count || t.unit == Ratio {
		wrong = fmt.Sprintf("is %s, wanted is %s", describe(t.unit), describe(p.want))
	}
	switch {
	case p.want == Ratio:
		return p.fault(wrong, "write what was read over what it should be, like 0.98 or 98 %")
	case t.end < len(p.s):
		return p.fault(wrong, p.example())
	}
	return p.fault(wrong, "write "+p.rewritten(t, 0))
}
