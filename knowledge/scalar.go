package knowledge

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
	"unicode"

	"gopkg.in/yaml.v3"
)

// pair is one key of a group and its value; the value's path ends in the key.
type pair struct {
	key   string
	at    spot // the key itself
	value spot
}

// pairs gives the keys of a group in file order and reports what is no group, a key that stands twice, a key that
// is no word, and a key without a value.
func (d *decoder) pairs(s spot) []pair {
	if !s.given() {
		return nil
	}
	if s.node.Kind != yaml.MappingNode {
		d.add(s, "is "+describe(s.node)+"; expected keys with values", "write {key: value}")
		return nil
	}
	var list []pair
	seen := map[string]int{}
	previous := ""
	for i := 0; i+1 < len(s.node.Content); i += 2 {
		key, value := s.node.Content[i], s.node.Content[i+1]
		if key.Kind != yaml.ScalarNode {
			d.add(spot{s.file, s.path, key}, "a key is "+describe(key)+"; expected a word", "")
			continue
		}
		name := shorten(key.Value)
		at := spot{s.file, join(s.path, name), key}
		if first, twice := seen[key.Value]; twice {
			d.add(at, "the key stands twice, first on line "+strconv.Itoa(first), "keep one of the two")
			continue
		}
		seen[key.Value] = key.Line
		if isNull(value) {
			d.add(at, "has no value", commaHint(previous, name))
			continue
		}
		list = append(list, pair{key: key.Value, at: at, value: spot{s.file, join(s.path, name), value}})
		previous = value.Value
	}
	return list
}

// digits matches what a decimal comma inside braces leaves behind.
var digits = regexp.MustCompile(`^[0-9]+$`)

// commaHint recognises {p: 0,47}, which YAML reads as p: 0 and an empty key 47.
func commaHint(before, key string) string {
	if digits.MatchString(before) && digits.MatchString(key) {
		return "a decimal comma? write " + before + "." + key
	}
	return "give a value or take the key out"
}

// fields gives the values of a group by key and reports keys outside the allowed ones.
func (d *decoder) fields(s spot, allowed ...string) map[string]spot {
	found := map[string]spot{}
	for _, p := range d.pairs(s) {
		if !contains(allowed, p.key) {
			hint := suggest(p.key, allowed)
			d.meant[p.at.node] = closest(p.key, allowed)
			if hint == "" {
				hint = "allowed: " + strings.Join(allowed, ", ")
			}
			d.add(p.at, "unknown key", hint)
			continue
		}
		found[p.key] = p.value
	}
	return found
}

// wanted says what belongs under a key that is missing.
var wanted = map[string]string{
	"role":    "latent, trigger or sufficient",
	"share":   "{dc: ..., mains: ..., repeat: ...}",
	"dc":      "a share, 0 where the cause cannot be",
	"mains":   "a share, 0 where the cause cannot be",
	"repeat":  "a share, 0 where the cause cannot be",
	"repair":  "the id of a repair",
	"leak":    "the probability without any listed parent",
	"p":       "a number or [low, mid, high]",
	"grade":   "judgement, read, second-hand, memory or computed",
	"title":   "a text",
	"text":    "a text",
	"minutes": "a number above 0",
	"nominal": "{result: probability, ...}",
	"present": "{result: probability, ...}",
	"absent":  "{result: probability, ...}",
	"median":  "a value with its unit",
	"times":   "one sigma as a factor above 1",
}

// need reports those of the keys that a group gives neither right nor misspelt.
func (d *decoder) need(s spot, keys ...string) {
	var missing []string
	var hints []string
	for _, k := range keys {
		if s.node.Kind == yaml.MappingNode && !d.tried(s, k) {
			missing = append(missing, k)
			hints = append(hints, k+": "+wanted[k])
		}
	}
	switch len(missing) {
	case 0:
	case 1:
		d.add(s, "the key "+missing[0]+" is missing", "add "+hints[0])
	default:
		d.add(s, "the keys "+strings.Join(missing, ", ")+" are missing", "add "+strings.Join(hints, "; "))
	}
}

// tried tells whether a group has a key, or an unknown one that was most likely meant for it.
func (d *decoder) tried(s spot, key string) bool {
	for i := 0; i+1 < len(s.node.Content); i += 2 {
		if n := s.node.Content[i]; n.Value == key || d.meant[n] == key {
			return true
		}
	}
	return false
}

// items gives the members of a list.
func (d *decoder) items(s spot) []spot {
	if !s.given() {
		return nil
	}
	if s.node.Kind != yaml.SequenceNode {
		d.add(s, "is "+describe(s.node)+"; expected a list", "write it in square brackets")
		return nil
	}
	list := make([]spot, len(s.node.Content))
	for i, n := range s.node.Content {
		list[i] = spot{s.file, fmt.Sprintf("%s[%d]", s.path, i+1), n}
	}
	return list
}

// text gives a text without the spaces around it; "" when absent or reported.
func (d *decoder) text(s spot) string {
	if !s.given() {
		return ""
	}
	if s.node.Kind != yaml.ScalarNode || isNull(s.node) {
		d.add(s, "is "+describe(s.node)+"; expected a text", "")
		return ""
	}
	text := strings.TrimSpace(s.node.Value)
	for _, r := range text {
		if unicode.IsControl(r) && r != '\n' && r != '\t' {
			d.add(s, fmt.Sprintf("holds the control character %U", r), "take it out")
			return ""
		}
	}
	if text == "" {
		d.add(s, "is an empty text", "give a text or take the key out")
	}
	return text
}

// texts gives a list of texts.
func (d *decoder) texts(s spot) []string {
	var list []string
	for _, item := range d.items(s) {
		if t := d.text(item); t != "" {
			list = append(list, t)
		}
	}
	return list
}

// word gives one of the allowed words; what names them in the message.
func (d *decoder) word(s spot, what string, allowed []string) string {
	text := d.text(s)
	if text == "" || contains(allowed, text) {
		return text
	}
	d.add(s, fmt.Sprintf("%s is no %s; expected %s", describe(s.node), what, strings.Join(allowed, ", ")), suggest(text, allowed))
	return ""
}

// name gives an id, here or of another entry.
func (d *decoder) name(s spot) string {
	text := d.text(s)
	if text == "" || kebab.MatchString(text) {
		return text
	}
	d.add(s, describe(s.node)+" is no id; expected small letters and digits with hyphens between words", "")
	return ""
}

// yes gives a yes or no.
func (d *decoder) yes(s spot) bool {
	if s.given() && s.node.Kind == yaml.ScalarNode && (s.node.Value == "true" || s.node.Value == "false") {
		return s.node.Value == "true"
	}
	return d.word(s, "answer", []string{"yes", "no"}) == "yes"
}

// plainNumber is what counts as a number: no hexadecimal, no infinity, no underscore.
var plainNumber = regexp.MustCompile(`^[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?$`)

// parseNumber reads a finite number.
func parseNumber(text string) (float64, bool) {
	if !plainNumber.MatchString(text) {
		return 0, false
	}
	v, err := strconv.ParseFloat(text, 64)
	return v, err == nil && !math.IsInf(v, 0)
}

// number gives a number, or reports and gives false.
func (d *decoder) number(s spot) (float64, bool) {
	if s.node.Kind == yaml.ScalarNode && s.node.Style&(yaml.SingleQuotedStyle|yaml.DoubleQuotedStyle) == 0 {
		if v, ok := parseNumber(s.node.Value); ok {
			return v, true
		}
	}
	hint := ""
	if _, ok := parseNumber(strings.Replace(s.node.Value, ",", ".", 1)); ok {
		hint = "write " + strings.Replace(s.node.Value, ",", ".", 1) + " without quotes"
	}
	d.add(s, "is "+describe(s.node)+"; expected a number", hint)
	return 0, false
}

// minutes gives a time above zero; 0 when absent or reported.
func (d *decoder) minutes(s spot) float64 {
	if !s.given() {
		return 0
	}
	v, ok := d.number(s)
	if ok && v <= 0 {
		d.add(s, fmt.Sprintf("is %g; expected minutes above 0", v), "")
		return 0
	}
	return v
}

// join adds a key to a path.
func join(path, key string) string {
	if path == "" {
		return key
	}
	return path + "." + key
}
