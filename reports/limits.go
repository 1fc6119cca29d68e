package reports

import (
	"strings"

	"drivemend/diagnose/safety"
)

var limitColumns = []column{{width: 1}, {title: "limit", width: 21}, {title: "source", width: 16}, {title: "this board"}, {title: "stands", width: 6}, {title: "read", width: 11}}

// sourceColumn is the column of the sources.
const sourceColumn = 2

// writeLimits puts the lines of all sources side by side, hazard by hazard, the lowest marked; then what is not drawn for
// this board, and the sources in full.
func writeLimits(s *screen, limits []safety.Limit) {
	if len(limits) == 0 {
		return
	}
	s.head("LIMITS", "source by source; * the lowest for its hazard here, and gone by")
	s.grid(limitColumns, nil)
	apart := map[string][]string{}
	var hazards []string
	for rest := limits; len(rest) > 0; {
		var group, held []safety.Limit
		group, rest = oneHazard(rest)
		for _, l := range group {
			if !l.Apart {
				held = append(held, l)
				continue
			}
			if len(apart[l.Hazard]) == 0 {
				hazards = append(hazards, l.Hazard)
			}
			line, _, _ := strings.Cut(l.Threshold, ":") // of a chart the column alone
			apart[l.Hazard] = append(apart[l.Hazard], line)
		}
		writeHazard(s, held)
	}
	writeApart(s, hazards, apart)
	s.head("SOURCES", "of these limits")
	writeSources(s, limits)
}

// writeApart names the lines that are not drawn for a board like this one.
func writeApart(s *screen, hazards []string, apart map[string][]string) {
	var out []string
	for _, h := range hazards {
		out = append(out, h+" "+strings.Join(apart[h], " / "))
	}
	if len(out) > 0 {
		s.hang(neutral, " ", "Drawn for other voltages or sources than this board's: "+strings.Join(out, "; ")+".")
	}
}

// oneHazard splits off the lines of the first hazard; they stand together.
func oneHazard(limits []safety.Limit) (group, rest []safety.Limit) {
	n := 0
	for n < len(limits) && limits[n].Hazard == limits[0].Hazard {
		n++
	}
	return limits[:n], limits[n:]
}

func writeHazard(s *screen, group []safety.Limit) {
	if len(group) == 0 {
		return
	}
	if word := strings.ToUpper(group[0].Hazard); sameAnswer(group) {
		s.hang(strong, word+"  ", group[0].Answers)
	} else {
		s.line(strong, word)
	}
	for _, l := range group {
		s.add(limitColumns, limitRow(l))
	}
}

// sameAnswer tells whether all lines of a hazard answer one question; what each answers by itself stands in the JSON.
func sameAnswer(group []safety.Limit) bool {
	for _, l := range group {
		if l.Answers != group[0].Answers {
			return false
		}
	}
	return true
}

func limitRow(l safety.Limit) []entry {
	mark, stands := "-", entry{"below", neutral}
	switch {
	case l.Unknown:
		stands = entry{"?", caution}
	case l.Above:
		stands = entry{"ABOVE", caution}
	}
	if l.Lowest {
		mark = "*"
		if l.Above {
			stands.Tone = danger
		}
	}
	return []entry{{Text: mark}, {Text: l.Threshold}, {Text: l.Short}, {Text: l.Board}, stands, {Text: string(l.Read)}}
}

func writeSources(s *screen, limits []safety.Limit) {
	seen := map[string]bool{}
	for _, l := range limits {
		if !seen[l.Short] {
			seen[l.Short] = true
			s.hang(neutral, " "+pad(l.Short, limitColumns[sourceColumn].width)+" ", l.Source)
		}
	}
}
