package main

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"drivemend/measure"
)

// keyText is a value as it goes under a key of the case: a word in small letters where the key knows it so, and a
// number of parallel parts as that many names.
func keyText(b measure.Board, path, text string) (string, error) {
	if position, ok := partsOf(path); ok {
		return partsText(b, position, text)
	}
	if k, ok := measure.LookupKey(path); ok && slices.Contains(k.Words, strings.ToLower(strings.TrimSpace(text))) {
		return strings.ToLower(strings.TrimSpace(text)), nil
	}
	return text, nil
}

// partsOf gives the position whose parts a key names.
func partsOf(path string) (position string, ok bool) {
	position, ok = strings.CutPrefix(strings.TrimPrefix(path, "board."), "positions.")
	if !ok {
		return "", false
	}
	return strings.CutSuffix(position, ".parts")
}

// partsText names as many parts as a number says, Q1, Q2 and on, and leaves out what other positions hold. Names of
// one's own are taken as they are.
func partsText(b measure.Board, position, text string) (string, error) {
	n, err := strconv.Atoi(strings.Trim(text, " []"))
	if err != nil {
		return text, nil
	}
	if n < 1 || n > mostParallel {
		return "", wrongInput(fmt.Sprintf("positions.%s.parts: %d parts in parallel cannot be", position, n),
			fmt.Sprintf("give their number, from 1 to %d, or their names: Q1 Q2 Q3", mostParallel))
	}
	taken := map[string]bool{}
	for _, p := range b.Positions() {
		if p.Name != position && b.Stated("positions."+p.Name+".parts") {
			for _, part := range p.Parts {
				taken[part] = true
			}
		}
	}
	var names []string
	for i := 1; len(names) < n; i++ {
		if name := fmt.Sprintf("Q%d", i); !taken[name] {
			names = append(names, name)
		}
	}
	return strings.Join(names, ", "), nil
}
