package knowledge

import (
	"fmt"
	"regexp"
	"strconv"
	"strings"

	"drivemend/measure/quantity"
	"gopkg.in/yaml.v3"
)

// Holds tells whether a board fulfils the condition. The lookup gives what the case states for a path: a word or
// an SI number; a path it does not know counts as fulfilled.
func (c Condition) Holds(lookup func(path string) (word string, number float64, known bool)) bool {
	word, number, known := lookup(c.Path)
	if !known {
		return true
	}
	switch c.Op {
	case ">=":
		return number >= c.Number
	case "<=":
		return number <= c.Number
	case ">":
		return number > c.Number
	case "<":
		return number < c.Number
	case "=":
		return number == c.Number
	}
	return contains(c.Words, word)
}

// Applies tells whether all of an entry's conditions hold.
func Applies(conditions []Condition, lookup func(path string) (word string, number float64, known bool)) bool {
	for _, c := range conditions {
		if !c.Holds(lookup) {
			return false
		}
	}
	return true
}

// boardKey is the form of a board path: words with points between them.
var boardKey = regexp.MustCompile(`^[a-z][a-z0-9_]*(\.[a-z][a-z0-9_]*)*$`)

// comparison is a comparison sign and what follows it.
var comparison = regexp.MustCompile(`^(>=|<=|>|<|=)\s*(.+)$`)

// boardWordForm is the form of a word that a board key may have.
var boardWordForm = regexp.MustCompile(`^[a-z][a-z0-9_-]*$`)

// conditions reads an `applies` group in file order.
func (d *decoder) conditions(s spot) []Condition {
	var list []Condition
	for _, p := range d.pairs(s) {
		c := Condition{Path: d.boardPath(p.at, p.key)}
		if d.condition(p.value, &c) && c.Path != "" {
			list = append(list, c)
		}
	}
	return list
}

// condition reads allowed words, a number or a comparison.
func (d *decoder) condition(s spot, c *Condition) bool {
	if s.node.Kind == yaml.SequenceNode {
		for _, item := range d.items(s) {
			if w := d.boardWord(item, d.text(item)); w != "" {
				c.Words = append(c.Words, w)
			}
		}
		if len(s.node.Content) == 0 {
			d.add(s, "is an empty list; expected words", "")
		}
		return len(c.Words) > 0
	}
	text := d.text(s)
	if text == "" {
		return false
	}
	if v, ok := parseNumber(text); ok {
		c.Op, c.Number = "=", v
		return true
	}
	if m := comparison.FindStringSubmatch(text); m != nil {
		c.Op = m[1]
		return d.limit(s, m[2], c)
	}
	if w := d.boardWord(s, text); w != "" {
		c.Words = []string{w}
	}
	return len(c.Words) > 0
}

// limit reads the right side of a comparison: a number, or a value with its unit.
func (d *decoder) limit(s spot, text string, c *Condition) bool {
	if v, ok := parseNumber(text); ok {
		c.Number = v
		return true
	}
	q, err := quantity.Parse(text, quantity.Any)
	if err != nil {
		d.add(s, fmt.Sprintf("%q is no comparison: %v", shorten(s.node.Value), err), "write '>= 2' or '>= 60 V', in quotes")
		return false
	}
	c.Number, c.Unit = q.Value, q.Unit
	return true
}

// boardPath gives a board path without the leading "board.".
func (d *decoder) boardPath(s spot, text string) string {
	bare := strings.TrimPrefix(text, "board.")
	if boardKey.MatchString(bare) {
		return bare
	}
	d.add(s, strconv.Quote(shorten(text))+" is no board key; expected words with points between them, as in switch.kind", "")
	return ""
}

// boardWord gives a word of a board key; true and false are yes and no, as in a case file.
func (d *decoder) boardWord(s spot, text string) string {
	switch text {
	case "":
		return ""
	case "true":
		return "yes"
	case "false":
		return "no"
	}
	if boardWordForm.MatchString(text) {
		return text
	}
	d.add(s, strconv.Quote(shorten(text))+" is no word; expected small letters, as in igbt", "a comparison is written '>= 2', alone and in quotes")
	return ""
}
