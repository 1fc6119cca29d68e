package knowledge

import "drivemend/measure"

// Kind names one of the lists of a base in a question for the nearest id.
type Kind string

// The kinds of entries that are named by an id.
const (
	KindCause   Kind = "cause"
	KindEvent   Kind = "event"
	KindTest    Kind = "test"
	KindRepair  Kind = "repair"
	KindCaution Kind = "caution"
	KindSource  Kind = "source"
)

// Cause gives the cause with an id, nil when there is none.
func (b *Base) Cause(id string) *Cause {
	return byID(b.Causes, id, func(c *Cause) string { return c.ID })
}

// Event gives the stress, fault or sign with an id, nil when there is none.
func (b *Base) Event(id string) *Event {
	return byID(b.Events, id, func(e *Event) string { return e.ID })
}

// Test gives the test with an id, nil when there is none.
func (b *Base) Test(id string) *Test { return byID(b.Tests, id, func(t *Test) string { return t.ID }) }

// Repair gives the repair with an id, nil when there is none.
func (b *Base) Repair(id string) *Repair {
	return byID(b.Repairs, id, func(r *Repair) string { return r.ID })
}

// Caution gives the caution with an id, nil when there is none.
func (b *Base) Caution(id string) *Caution {
	return byID(b.Cautions, id, func(c *Caution) string { return c.ID })
}

// Source gives the source with an id, nil when there is none.
func (b *Base) Source(id string) *Source {
	return byID(b.Sources, id, func(s *Source) string { return s.ID })
}

// Result gives the result of a test with an id, nil when there is none.
func (t *Test) Result(id string) *Result {
	return byID(t.Results, id, func(r *Result) string { return r.ID })
}

// Nearest gives the id of a kind that is spelt most like the given one, "" when none is close.
func (b *Base) Nearest(kind Kind, id string) string { return closest(id, b.IDs(kind)) }

// has tells whether there is an entry of a kind with an id.
func (b *Base) has(kind Kind, id string) bool {
	switch kind {
	case KindCause:
		return b.Cause(id) != nil
	case KindEvent:
		return b.Event(id) != nil
	case KindTest:
		return b.Test(id) != nil
	case KindRepair:
		return b.Repair(id) != nil
	case KindCaution:
		return b.Caution(id) != nil
	case KindSource:
		return b.Source(id) != nil
	}
	return false
}

// IDs gives the ids of a kind in base order.
func (b *Base) IDs(kind Kind) []string {
	switch kind {
	case KindCause:
		return idsOf(b.Causes, func(c *Cause) string { return c.ID })
	case KindEvent:
		return idsOf(b.Events, func(e *Event) string { return e.ID })
	case KindTest:
		return idsOf(b.Tests, func(t *Test) string { return t.ID })
	case KindRepair:
		return idsOf(b.Repairs, func(r *Repair) string { return r.ID })
	case KindCaution:
		return idsOf(b.Cautions, func(c *Caution) string { return c.ID })
	case KindSource:
		return idsOf(b.Sources, func(s *Source) string { return s.ID })
	}
	return nil
}

func byID[T any](list []T, id string, of func(*T) string) *T {
	for i := range list {
		if of(&list[i]) == id {
			return &list[i]
		}
	}
	return nil
}

func idsOf[T any](list []T, of func(*T) string) []string {
	ids := make([]string, len(list))
	for i := range list {
		ids[i] = of(&list[i])
	}
	return ids
}

func contains(list []string, word string) bool {
	for _, one := range list {
		if one == word {
			return true
		}
	}
	return false
}

// closest gives the first of the words with the least edit distance to the given one, "" when even that differs
// in more than a third of the letters.
func closest(word string, words []string) string {
	best, bestDistance := "", max(1, len([]rune(word))/3)+1
	for _, w := range words {
		if d := measure.Distance(word, w); d < bestDistance {
			best, bestDistance = w, d
		}
	}
	return best
}

// suggest words the nearest valid word as a question, "" when none is near.
func suggest(word string, words []string) string {
	if near := closest(word, words); near != "" {
		return "did you mean " + near + "?"
	}
	return ""
}
