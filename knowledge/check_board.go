package knowledge

import (
	"fmt"
	"slices"
	"strings"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// parallelPath is the one path of a condition that no board key has: the most parts that stand in parallel in any
// position.
const parallelPath = "positions.parallel"

// checkConditions warns of conditions that no board can state, because key, word or unit do not exist: they would
// hold for every board without anybody noticing.
func (c *collector) checkConditions(file string, line int, id string, list []Condition) {
	for _, one := range list {
		at := id + ".applies." + one.Path
		if one.Path == parallelPath {
			if one.Op == "" {
				c.warn(file, line, at, "is a count; expected a comparison", "write '>= 2'")
			}
			continue
		}
		key, known := measure.LookupKey(one.Path)
		switch {
		case !known:
			c.warnPath(file, line, at, one.Path)
		case one.Op == "":
			c.warnWords(file, line, at, key, one.Words)
		default:
			c.warnNumber(file, line, at, key, one)
		}
	}
}

// warnPath adds a warning about a path that is no board key.
func (c *collector) warnPath(file string, line int, at, path string) {
	hint := ""
	if near := measure.NearestKey(path); near != "" {
		hint = "did you mean " + near + "?"
	}
	c.warn(file, line, at, "there is no board key "+path+", so no case can state it", hint)
}

// warnWords adds a warning about words that a board key never has.
func (c *collector) warnWords(file string, line int, at string, key measure.Key, words []string) {
	allowed := key.Words
	switch key.Kind {
	case measure.KindYesNo:
		allowed = []string{"yes", "no", "unknown"}
	case measure.KindWord:
	default:
		c.warn(file, line, at, fmt.Sprintf("is a %s; expected a comparison", key.Kind), "write '>= 2' or '>= 60 V', in quotes")
		return
	}
	for _, w := range words {
		if !slices.Contains(allowed, w) {
			c.warn(file, line, at, w+" is none of its words: "+strings.Join(allowed, ", "), suggest(w, allowed))
		}
	}
}

// warnNumber adds a warning about a comparison with what is no number of this unit.
func (c *collector) warnNumber(file string, line int, at string, key measure.Key, one Condition) {
	want := key.Unit
	switch key.Kind {
	case measure.KindCount, measure.KindRatio:
		want = ""
	case measure.KindQuantity:
	default:
		c.warn(file, line, at, fmt.Sprintf("is a %s; expected its words", key.Kind), "")
		return
	}
	if one.Unit != want && !(want == "" && (one.Unit == quantity.Count || one.Unit == quantity.Ratio)) {
		c.warn(file, line, at, "is compared without its unit or with another", "write '"+one.Op+" "+quantity.Format(one.Number, key.Unit)+"'")
	}
}

// checkAnsweredBy warns of a board key that can never answer the test.
func (c *collector) checkAnsweredBy(t Test) {
	if t.AnsweredBy == nil {
		return
	}
	at := t.ID + ".answered_by." + t.AnsweredBy.Path
	key, known := measure.LookupKey(t.AnsweredBy.Path)
	if !known {
		c.warnPath(t.File, t.Line, at, t.AnsweredBy.Path)
		return
	}
	words := make([]string, 0, len(t.AnsweredBy.Results))
	for w := range t.AnsweredBy.Results {
		words = append(words, w)
	}
	slices.Sort(words)
	c.warnWords(t.File, t.Line, at, key, words)
}
