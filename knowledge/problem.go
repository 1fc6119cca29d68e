package knowledge

import (
	"fmt"
	"sort"

	"drivemend/measure"
	"gopkg.in/yaml.v3"
)

// maxProblems is how many faults one load reports.
const maxProblems = 20

// Problem is one fault of a rule file, in the shape that case files use.
type Problem = measure.Problem

// Problems is an error that lists faults in the order of the files, at most twenty; when there are more, a last
// entry without a place says how many.
type Problems = measure.Problems

// spot is a place in a rule file: a node and the dotted path that leads to it.
type spot struct {
	file string
	path string
	node *yaml.Node // nil where the key is absent
}

// given tells whether the place exists in the file.
func (s spot) given() bool { return s.node != nil }

// line gives the line of the spot, 0 when it has none.
func (s spot) line() int {
	if s.node == nil {
		return 0
	}
	return s.node.Line
}

// collector gathers problems from all steps of a load.
type collector struct {
	list       Problems
	files      []string // in reading order
	unreadable bool     // a file could not be taken in, so ids may be missing only for that
}

// enter notes that a file is being read; problems are ordered by it.
func (c *collector) enter(file string) { c.files = append(c.files, file) }

// add records a problem at a spot.
func (c *collector) add(s spot, message, hint string) {
	p := Problem{File: s.file, Key: s.path, Message: message, Hint: hint}
	if s.node != nil {
		p.Line, p.Column = s.node.Line, max(s.node.Column, 1)
	}
	c.list = append(c.list, p)
}

// err gives the first twenty problems in the order of the files, or nil.
func (c *collector) err() error {
	if len(c.list) == 0 {
		return nil
	}
	sorted := c.sorted()
	if more := len(sorted) - maxProblems; more > 0 {
		sorted = append(sorted[:maxProblems], Problem{Message: fmt.Sprintf("%d more; mend these first", more)})
	}
	return sorted
}

// sorted gives all problems in the order of the files, then line, then column.
func (c *collector) sorted() Problems {
	rank := map[string]int{}
	for i, f := range c.files {
		if _, seen := rank[f]; !seen {
			rank[f] = i
		}
	}
	sorted := append(Problems(nil), c.list...)
	sort.SliceStable(sorted, func(i, j int) bool {
		a, b := sorted[i], sorted[j]
		switch {
		case rank[a.File] != rank[b.File]:
			return rank[a.File] < rank[b.File]
		case a.Line != b.Line:
			return a.Line < b.Line
		}
		return a.Column < b.Column
	})
	return sorted
}
