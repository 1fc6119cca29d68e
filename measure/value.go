package measure

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"
	"unicode/utf8"

	"gopkg.in/yaml.v3"

	"drivemend/measure/quantity"
)

// readScalar checks one value against the kind, unit, range and words of its row.
func (r *reader) readScalar(e *entry) {
	n := e.node
	if n.Kind != yaml.ScalarNode {
		r.fault(n, e.path, "one value belongs here, not "+shape(n), "")
		return
	}
	if e.row.Kind == KindText {
		e.text, e.good, e.stated = n.Value, true, !empty(n)
		return
	}
	if empty(n) || n.Value == "" {
		r.lack(n, e.path, "nothing stands here", "leave the key out while its value is not known")
		return
	}
	if strings.HasPrefix(n.Value, string(foldedMark)) || n.Style&yaml.FoldedStyle != 0 {
		r.fault(n, e.path, overMessage, overHint)
		return
	}
	e.stated = true
	if e.row.MayBeUnknown && n.Value == unknown || e.row.Kind != KindWord && slices.Contains(e.row.Words, n.Value) && n.Value == "none" {
		e.text, e.good = n.Value, true
		return
	}
	var message, hint string
	switch e.row.Kind {
	case KindQuantity, KindRatio, KindCount:
		message, hint = e.readQuantity()
	case KindReading:
		message, hint = e.readReading()
	case KindWord, KindYesNo:
		message, hint = e.readWord()
	case KindName:
		message, hint = e.readName()
	case KindTime, KindDate:
		message, hint = e.readTime()
	}
	if e.good = message == ""; !e.good {
		r.fault(n, e.path, message, hint)
	}
}

// unknown is the word for what was asked and nobody can tell.
const unknown = "unknown"

// bareNumber is a number without a unit.
var bareNumber = regexp.MustCompile(`^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$`)

// readQuantity reads a number with its unit and holds it against the physical range.
func (e *entry) readQuantity() (message, hint string) {
	k := e.row.Key
	text := strings.TrimSpace(e.node.Value)
	if k.Kind == KindQuantity && bareNumber.MatchString(text) {
		return fmt.Sprintf("%s has no unit; expected %s", text, expected(k)), "write the unit: " + sample(text, k.Unit)
	}
	q, err := quantity.Parse(text, k.Unit)
	if err != nil {
		return err.Error(), "expected " + expected(k)
	}
	for _, v := range []float64{q.Value, q.Low, q.High} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return quoted(text) + " is not a finite number", "expected " + expected(k)
		}
	}
	if k.Kind == KindCount && (q.Value != math.Trunc(q.Value) || q.Low != q.Value || q.High != q.Value) {
		return quoted(text) + " is not a whole number", "expected " + expected(k)
	}
	slack := 1e-9 // a limit written in another prefix may differ in its last digit
	if k.Kind != KindQuantity {
		slack = 0
	}
	if (k.Min != 0 || k.Max != 0) && (q.Low < k.Min-slack*math.Abs(k.Min) || q.High > k.Max+slack*math.Abs(k.Max)) {
		return quoted(text) + " is out of the physical range", "expected " + expected(k) + "; check the prefix"
	}
	e.quantity = q
	return "", ""
}

// readReading reads what an instrument showed.
func (e *entry) readReading() (message, hint string) {
	text := strings.TrimSpace(e.node.Value)
	reading, err := quantity.ParseReading(text, e.row.Unit)
	if err != nil {
		return err.Error(), "write what the instrument showed: 0.4 Ω, OL, above 20 MΩ, shorted"
	}
	e.reading = &reading
	return "", ""
}

// readWord reads a word of a closed list.
func (e *entry) readWord() (message, hint string) {
	text := e.node.Value
	if e.row.Kind == KindYesNo {
		switch strings.ToLower(text) {
		case "true", "yes":
			text = "yes"
		case "false", "no":
			text = "no"
		}
	}
	for _, w := range e.row.Words {
		if text == w {
			e.text = text
			return "", ""
		}
	}
	message = quoted(text) + " is none of the words " + strings.Join(e.row.Words, ", ")
	if near := nearest(text, e.row.Words); near != "" {
		return message, "nearest is " + near
	}
	return message, ""
}

// longestID bounds an id, in characters.
const longestID = 200

// readName reads an id or the name of a part.
func (e *entry) readName() (message, hint string) {
	e.text = e.node.Value
	if strings.ContainsAny(e.text, " \t\r\n") {
		return quoted(e.text) + " is not one word", "join it with hyphens"
	}
	if utf8.RuneCountInString(e.text) > longestID {
		return quoted(e.text) + fmt.Sprintf(" is too long for a name: more than %d characters", longestID), ""
	}
	if form := e.row.Form; form != nil && !form.Pattern.MatchString(e.text) {
		return quoted(e.text) + " is not " + form.Said, countOf(utf8.RuneCountInString(e.text), "character") + " stand here; copy the whole sum"
	}
	return "", ""
}

// readTime reads a moment with its offset, or a date.
func (e *entry) readTime() (message, hint string) {
	text := strings.TrimSpace(e.node.Value)
	if e.row.Kind == KindDate {
		t, err := time.Parse(time.DateOnly, text)
		if err != nil {
			return quoted(text) + " is not a date", "expected year-month-day, as 2026-12-01"
		}
		e.time, e.text = t, text
		return "", ""
	}
	t, err := time.Parse(time.RFC3339, text)
	if err != nil {
		return quoted(text) + " is not a time", "expected RFC 3339 with the offset, as 2026-12-01T09:40:00+01:00"
	}
	e.time, e.text = t, text
	return "", ""
}

// nameShape is a name of the user's own: a position.
var nameShape = regexp.MustCompile(`^[a-z0-9]+(-[a-z0-9]+)*$`)

// plainName tells whether a text can name a position.
func plainName(text string) bool { return nameShape.MatchString(text) }

// expected says what belongs under a key: a kind, a unit and a range.
func expected(k Key) string {
	format := func(v float64) string {
		if k.Kind == KindQuantity && k.Unit != quantity.Any {
			return quantity.Format(v, k.Unit)
		}
		return strconv.FormatFloat(v, 'g', 6, 64)
	}
	var what string
	switch k.Kind {
	case KindCount:
		what = "a whole number"
	case KindRatio:
		what = "a number or a percentage"
	default:
		what = "a number with a unit"
		if k.Unit != quantity.Any {
			what = "a number in " + string(k.Unit)
		}
	}
	switch {
	case k.Min == 0 && k.Max == 0:
	case k.Min == k.Max:
		what = format(k.Min)
	default:
		what += " from " + format(k.Min) + " to " + format(k.Max)
	}
	for _, w := range k.Words {
		what += ", or " + w
	}
	return what
}

// sample shows a bare number with the unit it lacks.
func sample(text string, u quantity.Unit) string {
	if u == quantity.Any {
		return text + " V"
	}
	return text + " " + string(u)
}

// quoted puts quotes around what was found, cut to a length that fits a line.
func quoted(text string) string {
	if r := []rune(text); len(r) > 60 {
		text = string(r[:57]) + "..."
	}
	return strconv.Quote(text)
}

// list joins words with commas and a last and.
func list(words []string) string {
	if len(words) < 2 {
		return strings.Join(words, "")
	}
	return strings.Join(words[:len(words)-1], ", ") + " and " + words[len(words)-1]
}

// some lists the keys that may stand at a place.
func some(names []string) string {
	if len(names) == 1 && names[0] == "*" {
		return "a name of your own"
	}
	return strings.Join(names, ", ")
}
