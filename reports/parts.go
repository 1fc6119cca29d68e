package reports

import (
	"fmt"
	"strings"

	"drivemend/diagnose"
)

// partGroup is parts that print with the same chance.
type partGroup struct {
	names  []string
	chance string
}

// partGroups gathers the parts by what is printed of their chance, the likeliest first.
func partGroups(parts []diagnose.PartChance) []partGroup {
	var groups []partGroup
	for _, p := range byChance(parts) {
		chance := percent(p.Probability)
		if k := len(groups) - 1; k >= 0 && groups[k].chance == chance {
			groups[k].names = append(groups[k].names, p.Part)
			continue
		}
		groups = append(groups, partGroup{[]string{p.Part}, chance})
	}
	return groups
}

// all gives the group with every name.
func (g partGroup) all() string { return strings.Join(g.names, " ") + " " + g.chance }

// partWords lists the parts of a fault with their chances, the likeliest first and by name, equal ones together; no
// more than most are named, of parts that are all alike none: "Q2 98 %; Q1 Q3 31 %; 6 others 29 %".
func partWords(parts []diagnose.PartChance, most int) string {
	var out []string
	groups := partGroups(parts)
	if len(groups) == 1 && len(parts) > max(most, 2) {
		return fmt.Sprintf("all %d parts %s", len(parts), groups[0].chance)
	}
	for i, g := range groups {
		if len(g.names) > most {
			if i == 0 && most > 0 {
				out = append(out, strings.Join(g.names[:most], " ")+fmt.Sprintf(" and %d more %s", len(g.names)-most, g.chance))
				i++
			}
			return strings.Join(append(out, othersOf(groups[i:])...), "; ")
		}
		most -= len(g.names)
		out = append(out, g.all())
	}
	return strings.Join(out, "; ")
}

// othersOf counts the parts of the groups that are not named: "6 others 29 %", "8 others up to 29 %".
func othersOf(groups []partGroup) []string {
	if len(groups) == 0 {
		return nil
	}
	n := 0
	for _, g := range groups {
		n += len(g.names)
	}
	text := count(n, "other", "others") + " "
	if len(groups) > 1 {
		text += "up to "
	}
	return []string{text + groups[0].chance}
}

// namedAtLeast is how many parts of the likeliest group a narrow column names even where that takes further lines.
const namedAtLeast = 6

// partNumbers is partWords in a column headed in per cent, with as many names as one line of it holds; the likeliest
// parts are named all the same, unless all are alike: "Q2 98; Q1 Q3 31; 6 others 29", "all 18 parts 93".
func partNumbers(parts []diagnose.PartChance, width int) string {
	groups := partGroups(parts)
	words := func(most int) string { return strings.ReplaceAll(plain(partWords(parts, most)), " %", "") }
	if len(groups) == 0 {
		return ""
	}
	least := min(len(groups[0].names), namedAtLeast)
	for most := len(parts); most >= least; most-- {
		if text := words(most); columns(text) <= width {
			return text
		}
	}
	if len(groups) == 1 {
		return words(min(least, len(parts)-1))
	}
	return words(least)
}
