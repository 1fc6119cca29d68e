package quantity

import (
	"slices"
	"strings"
	"unicode"
)

// The patterns of this file are regular expressions that mean the same in Go and in ECMA 262 with its u flag. They tell
// whether a text is written as Parse and ParseReading want it; sizes and the order of the ends of an interval are
// beyond them.

// Blanks as unicode.IsSpace has them, with the characters without width that plainText takes out.
var (
	blank  = `[\s\v\x85\p{Z}]`
	unseen = alikesOf("")
	gap    = `[\s\v\x85\p{Z}` + unseen + `]*`
	gaps   = `[\s\v\x85\p{Z}` + unseen + `]+`
)

// alikesOf lists the signs that stand for one of ours.
func alikesOf(ours string) string {
	out := ""
	for i := 0; i < len(alikes); i += 2 {
		if alikes[i+1] == ours {
			out += alikes[i]
		}
	}
	return out
}

// literal is the pattern of a text with every sign that looks like one of its own.
func literal(text string) string {
	if others := alikesOf(text); len([]rune(text)) > 1 && others != "" {
		return "(?:" + signs(text) + "|[" + others + "])"
	}
	if rest, ok := strings.CutPrefix(text, "°C"); ok && rest != "" {
		return literal("°C") + signs(rest)
	}
	return signs(text)
}

// signs is the pattern of a text sign by sign.
func signs(text string) string {
	var b strings.Builder
	for _, r := range text {
		others := alikesOf(string(r))
		switch {
		case r == ' ':
			b.WriteString(blank)
		case others != "":
			b.WriteString(class(string(r)))
		case strings.ContainsRune(`\^$.|?*+()[]{}/`, r):
			b.WriteString(`\` + string(r))
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// class is the pattern of one of several signs.
func class(text string) string {
	var b strings.Builder
	for _, r := range text {
		for _, c := range string(r) + alikesOf(string(r)) {
			if c == '-' || c == '^' || c == ']' || c == '\\' {
				b.WriteByte('\\')
			}
			b.WriteRune(c)
		}
	}
	return "[" + b.String() + "]"
}

// anyOf is the pattern of one of several; empty ones are none.
func anyOf(patterns ...string) string {
	return "(?:" + strings.Join(slices.DeleteFunc(patterns, func(p string) bool { return p == "" }), "|") + ")"
}

// The parts every pattern is made of.
var (
	minus    = class("-")
	signed   = class("-+") + "?" + gap
	unsigned = `(?:\+` + class("-+") + "?)?" + gap // of a tolerance: a second plus changes nothing
	digits   = `(?:[1-9]\d{0,2}(?:` + blank + `\d{3})+|\d+)`
	number   = `(?:` + digits + `(?:\.\d+)?|\.\d+)(?:[eE]` + class("-+") + `?\d+)?`
)

// pattern holds the parts of the pattern of one unit, or of all.
type pattern struct {
	number string // a number with its unit, or a code
	own    string // the same, of the units that a value before a tolerance may take over
	share  string // what else a tolerance may be: a share of the value, kelvins beside degrees
	bare   string // a number without a unit where that is enough
	digit  bool   // a code may end in a digit
}

// spellingsOf gives the pattern of every spelling of a unit.
func spellingsOf(k kind) string {
	var symbols, others []string
	for _, s := range k.symbols {
		symbols = append(symbols, literal(s))
	}
	for _, o := range k.others {
		others = append(others, literal(o.text))
	}
	if len(symbols) > 0 {
		others = append(others, optionalClass(k.prefixes)+anyOf(symbols...))
	}
	return anyOf(others...)
}

func optionalClass(text string) string {
	if text == "" {
		return ""
	}
	return class(text) + "?"
}

// patternOf makes the parts of one unit.
func patternOf(k kind) pattern {
	p := pattern{number: number + gap + spellingsOf(k)}
	switch {
	case rkmExponent[k.unit] != nil:
		p.number, p.digit = coded(k, true), true
	case k.unit == Count || k.unit == Ratio:
		p.bare = number
	}
	p.own, p.share = p.number, shareOf(k, gap)
	return p
}

// shareOf is what a tolerance of a unit may be given in beside that unit.
func shareOf(k kind, beforeKelvin string) string {
	ratios, _ := kindOf(Ratio)
	kelvins, _ := kindOf(Kelvin)
	switch {
	case k.unit == Celsius:
		return number + beforeKelvin + spellingsOf(kelvins)
	case k.unit.relative():
		return number + gap + spellingsOf(ratios)
	}
	return ""
}

// coded is a number with a unit that has codes. Alone tells whether a code may stand without the unit.
func coded(k kind, alone bool) string {
	var letters, marks, prefixes string // marks: the letters that are codes when the unit follows
	for _, letter := range "RΩkKMGpnuµmFH" {
		_, code := rkmExponent[k.unit][letter]
		_, prefixed := spellings[string(letter)+string(k.unit)]
		if code {
			letters += string(letter)
		}
		if code || prefixed {
			marks += string(letter)
		}
		if prefixed {
			prefixes += string(letter)
		}
	}
	var symbols []string
	for _, s := range k.symbols {
		symbols = append(symbols, literal(s))
	}
	unit := anyOf(symbols...)
	behind := gap + anyOf(class(prefixes)+gap, class(marks)+gaps) + "?" + unit
	inside := class(marks) + `\d+` + gap + unit
	if alone {
		behind, inside = anyOf(behind, gap+class(letters)), anyOf(inside, class(letters)+`\d+`)
	}
	return anyOf(number+behind, `\d*`+inside)
}

// everyUnit makes the parts of a quantity whose unit the text names. A K that touches its number may be kilo.
func everyUnit() pattern {
	var units, codes, shares []string
	for _, k := range kinds {
		switch {
		case rkmExponent[k.unit] != nil:
			codes = append(codes, coded(k, false))
		case k.unit == Ratio:
		case k.unit == Kelvin:
			codes = append(codes, number+anyOf(gaps+class("K"), gap+class(k.prefixes)+class("K")))
		default:
			units = append(units, spellingsOf(k))
		}
		if share := shareOf(k, gaps); k.unit != Celsius {
			shares = append(shares, share)
		}
	}
	slices.Sort(shares)
	p := pattern{own: anyOf(append(codes, number+gap+anyOf(units...))...), share: anyOf(slices.Compact(shares)...)}
	ratios, _ := kindOf(Ratio) // 5 ±3 % has no unit
	p.number = anyOf(p.own, number+gap+spellingsOf(ratios))
	return p
}

// tail is what may follow a value: a tolerance, or the upper end of an interval. The word to needs a blank before it
// where a letter stands.
func (p pattern) tail(even, bare, before string) string {
	side := unsigned + anyOf(p.number, p.share, number)
	last := unsigned + anyOf(p.number, p.share, bare)
	return anyOf(gap+anyOf(`±`, `\+/`+minus, `\+`+minus)+gap+unsigned+even,
		gap+class("-+")+side+gap+`/`+gap+class("-+")+last,
		anyOf(gap+anyOf(`\.\.\.?`, `…`, `–`, `—`, minus), before+`to`)+gap+signed+anyOf(p.number, bare))
}

// whole is the pattern of a whole quantity, without its ends. Behind a value without a unit a tolerance or the upper
// end of an interval names it.
func (p pattern) whole() string {
	before := gaps
	if p.digit {
		before = gap
	}
	return signed + anyOf(p.number+p.tail(anyOf(p.number, p.share), "", before)+"?",
		number+p.tail(anyOf(p.own, p.bare), p.bare, gap), p.bare)
}

// Pattern gives the regular expression of the texts that Parse reads as a quantity of a unit, Any of each unit; a
// count stands for itself, without a tolerance. What it lets pass beyond Parse: numbers too large or too small, the
// larger end first, a letter that touches the word to, both sides of a tolerance with one sign or without the unit of the value, and with Any two ends or
// a tolerance in different units. It refuses a character without width inside a number or a unit, which Parse overlooks.
func Pattern(unit Unit) string {
	k, known := kindOf(unit)
	switch {
	case unit == Count:
		return "^" + gap + `\+?` + gap + digits + `(?:\.0+)?(?:[eE]\+?\d+)?(?:` + gap + spellingsOf(k) + ")?" + gap + "$"
	case known:
		return "^" + gap + patternOf(k).whole() + gap + "$"
	}
	return "^" + gap + everyUnit().whole() + gap + "$"
}

// ReadingPatterns gives the regular expressions of the texts that ParseReading reads as any unit: figure for numbers,
// limits and over range; word for words, of which none may match never. Of figure the same holds as of Pattern; behind
// a limit it takes one number, no interval, not even one of no width.
func ReadingPatterns() (figure, word, never string) {
	every := everyUnit()
	var over, limits, units []string
	for _, t := range overTexts {
		over = append(over, anyCase(t))
	}
	for _, l := range limitTexts {
		limits = append(limits, anyCase(l.text))
	}
	limits = append(limits, "["+alikesOf(">=")+alikesOf("<=")+"]")
	for _, k := range kinds {
		units = append(units, spellingsOf(k))
	}
	figure = anyOf(anyOf(over...)+anyOf(gap+anyOf(units...))+"?", anyOf(limits...)+gap+signed+every.number, every.whole())
	word = `\p{L}(?:[\p{L}` + strings.Trim(minus, "[]") + `]*\p{L})?`
	return "^" + gap + figure + gap + "$", "^" + gap + word + gap + "$", "^" + gap + anyOf(noWords()...) + gap + "$"
}

// noWords are the patterns of what looks like a word and is none: units, and what is no number.
func noWords() []string {
	var out []string
	for _, s := range append(slices.Clone(spellingOrder), "nan", "inf", "infinity", "infinite") {
		switch {
		case !isWord(s):
		case s == strings.ToLower(s):
			out = append(out, anyCase(s))
		default:
			out = append(out, literal(s))
		}
	}
	return out
}

// anyCase is the pattern of a text in capitals and small letters.
func anyCase(text string) string {
	var b strings.Builder
	for _, r := range text {
		if upper := unicode.ToUpper(r); upper != r && r < 0x80 {
			b.WriteString("[" + string(r) + string(upper) + "]")
		} else {
			b.WriteString(signs(string(r)))
		}
	}
	return b.String()
}
