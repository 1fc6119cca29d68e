package reports

import (
	"fmt"
	"io"
	"slices"
	"sort"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure/quantity"
)

// marginRow is one row of the margin: what it is, and how it reads from the figures of a board.
type marginRow struct {
	name string
	cell func(f *stress.Figures) entry
}

func plainCell(text func(f *stress.Figures) string) func(*stress.Figures) entry {
	return func(f *stress.Figures) entry { return entry{Text: text(f)} }
}

// marginRows stand in the order of the question: what is there, what it does, what it may do.
var marginRows = []marginRow{
	{"network", plainCell(func(f *stress.Figures) string { return networkWords(f.Network) })},
	{"position", plainCell(func(f *stress.Figures) string { return f.Position })},
	{"rated, at the coldest junction", plainCell(func(f *stress.Figures) string { return volts(f.Rated) })},
	{"nominal bus, running current", plainCell(func(f *stress.Figures) string { return peakWords(f.Nominal) })},
	{"highest bus, worst current", plainCell(func(f *stress.Figures) string { return peakWords(f.Highest) })},
	{"its 99.9th percentile", plainCell(p999Words)},
	{"cut edge, nominal bus", plainCell(func(f *stress.Figures) string { return peakWords(f.Cut) })},
	{"absolute corner", plainCell(cornerPeak)},
	{"verdict", func(f *stress.Figures) entry {
		return entry{strings.ToUpper(string(f.Verdict)), verdictTone(f.Verdict)}
	}},
}

func peakWords(e *stress.Edge) string {
	if e == nil {
		return "not computed"
	}
	return peakOr(e.Peak) + atEdge(e)
}

func atEdge(e *stress.Edge) string {
	if e.Bus <= 0 {
		return ""
	}
	return fmt.Sprintf(" at %s, %s", volts(e.Bus), quantity.Format(e.Current, quantity.Ampere))
}

func peakOr(v float64) string {
	if v == 0 {
		return "not computed"
	}
	return volts(v)
}

func p999Words(f *stress.Figures) string {
	if f.P999.Samples == 0 {
		return "not computed"
	}
	return volts(f.P999.Peak) + ", " + tailWords(f)
}

// tailWords says how a percentile further out than the draws reach was come by.
func tailWords(f *stress.Figures) string {
	return fmt.Sprintf("tail fitted to %d draws", f.P999.Samples)
}

func percentileWords(f *stress.Figures) string {
	if f.P999.Samples == 0 {
		return "percentile not computed"
	}
	return "99.9th percentile, " + tailWords(f)
}

// otherTopologyWords is said of a board whose edges this version does not work out, instead of asking for its topology.
const otherTopologyWords = "not worked out for this topology yet (choppers only)"

// topologyKey is the need under which stress names a board that is no chopper.
const topologyKey = "board.topology"

// otherTopology tells whether a margin is missing because the board is no chopper.
func otherTopology(m *stress.Margin) bool {
	if m.AsFound != nil || m.Rebuild != nil {
		return false
	}
	for _, n := range m.Needs {
		if n.Key == topologyKey {
			return true
		}
	}
	return false
}

func cornerPeak(f *stress.Figures) string {
	text := peakOr(f.Worst.Peak)
	if f.Worst.Peak != 0 && f.Worst.Shape != "" {
		text += ", " + f.Worst.Shape + " edge"
	}
	return text
}

// Margin prints what the switch saw as found and what it will see after the rebuild, what the verdict rests on, and
// what was assumed or is missing.
func Margin(w io.Writer, m *stress.Margin, style Style) error {
	s := newScreen(style)
	s.ends(strong, "MARGIN", m.Case, ratedWords(m))
	writeFigures(s, m)
	writeVerdict(s, "as found", m, m.AsFound)
	writeVerdict(s, "rebuild", m, m.Rebuild)
	writeAssumed(s, m.Assumed)
	writeNeeds(s, m.Needs)
	return s.write(w)
}

func ratedWords(m *stress.Margin) string {
	if m.Rated == 0 {
		return "rating not known"
	}
	return "allowed " + volts(m.Allowed) + ": 80 % of " + volts(m.Rated)
}

func writeFigures(s *screen, m *stress.Margin) {
	if otherTopology(m) {
		s.hang(caution, "peak      ", otherTopologyWords)
		return
	}
	if m.AsFound == nil && m.Rebuild == nil {
		s.line(caution, "Too little is known to work out the edge; what is missing stands below.")
		return
	}
	cols := []column{{title: "peak at the chip", width: 30}, {title: "as found"}}
	if m.Rebuild != nil {
		cols = append(cols, column{title: "rebuild", width: 24})
	}
	var rows [][]entry
	for _, r := range marginRows {
		row := []entry{{Text: r.name}, {Text: "not known"}}
		if m.AsFound != nil {
			row[1] = r.cell(m.AsFound)
		}
		if m.Rebuild != nil {
			row = append(row, r.cell(m.Rebuild))
		}
		rows = append(rows, row)
	}
	s.grid(cols, rows)
	if m.Rebuild == nil {
		s.line(neutral, noRebuild(m))
	}
}

func writeVerdict(s *screen, name string, m *stress.Margin, f *stress.Figures) {
	if f == nil {
		return
	}
	s.blank()
	s.hang(verdictTone(f.Verdict), pad(name, 10)+" ", verdictWords(f.Verdict)+"."+restWords(m, f))
	for _, r := range f.Rests {
		s.item(caution, "rests on", r)
	}
	if len(f.LiftedBy) > 0 {
		s.say(mandatory, " "+liftWords(f)+" "+strings.Join(f.LiftedBy, ", ")+".")
	}
	if f.Worst.Peak > 0 {
		s.item(strong, "corner", volts(f.Worst.Peak)+" would need "+cornerWords(f.Worst.Corner))
	}
}

// liftWords introduces the answers that the verdict lacks: they lift one that is held down for want of them; a worse
// one they only make surer.
func liftWords(f *stress.Figures) string {
	if f.Verdict == stress.Thin {
		return "It may be lifted by stating"
	}
	return "It would be surer with"
}

// cornerWords says what would have to be true for the absolute corner.
func cornerWords(corner []stress.Corner) string {
	if len(corner) == 0 {
		return "nothing beyond what is stated"
	}
	var out []string
	for _, c := range corner {
		text := c.Key + " " + quantity.Format(c.Value, c.Unit)
		if c.Assumed {
			text += " (assumed)"
		}
		out = append(out, text)
	}
	return strings.Join(out, ", ")
}

// writeAssumed lists the assumed values, what moves the peak most first; the reasons stand once below.
func writeAssumed(s *screen, assumed []stress.Assumed) {
	if len(assumed) == 0 {
		return
	}
	s.head("ASSUMED", "not known to be true of this board")
	var rows [][]entry
	var reasons []string
	for _, a := range byMove(assumed) {
		k := slices.Index(reasons, a.Why)
		if k < 0 {
			k = len(reasons)
			reasons = append(reasons, a.Why)
		}
		rows = append(rows, []entry{{Text: a.Key}, {Text: between(a.Value)}, {Text: moves(a.MovesPeak)}, {Text: letter(k)}})
	}
	s.grid([]column{{title: "key"}, {title: "taken as", width: 29}, {title: "moves", width: 6, right: true}, {title: "why", width: 3, right: true}}, rows)
	for k, why := range reasons {
		s.hang(neutral, " "+letter(k)+"  ", why)
	}
}

func letter(k int) string { return string(rune('a' + k%26)) }

// byMove sorts assumed values, what moves the peak most first.
func byMove(assumed []stress.Assumed) []stress.Assumed {
	out := append([]stress.Assumed(nil), assumed...)
	sort.SliceStable(out, func(i, j int) bool { return out[i].MovesPeak > out[j].MovesPeak })
	return out
}

func writeNeeds(s *screen, needs []stress.Need) {
	title := "MISSING"
	for _, n := range needs {
		if n.Key == topologyKey {
			s.hang(caution, "topology  ", strings.Join(n.For[:max(len(n.For)-1, 0)], "; "))
			continue
		}
		if title != "" {
			s.head(title, "")
			title = ""
		}
		s.hang(caution, "   ", n.Key+": for "+strings.Join(n.For, "; "))
	}
}

// noRebuild says why there are no figures of a rebuild.
func noRebuild(m *stress.Margin) string {
	if m.Chosen {
		return "The chosen rebuild cannot be worked out: see what is missing below."
	}
	return "No rebuild is chosen yet: drivemend enter CASE rebuild.snubber.kind …"
}
