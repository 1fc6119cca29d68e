package reports

import (
	"io"
	"slices"
	"sort"
	"strconv"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Margin prints what decides: the peaks of the board as found and of the rebuild with their verdicts, what follows from
// them, what they rest on, and what was assumed or is missing.
func Margin(w io.Writer, m *stress.Margin, style Style) error {
	s := newScreen(style)
	writeDeciding(s, m)
	return s.write(w)
}

// MarginInFull prints what decides and, under a heading of its own, the edges in numbers, what the network goes
// through and what the absolute corner would need. The case gives the PWM frequency for the watts; nil gives none.
func MarginInFull(w io.Writer, c *measure.Case, m *stress.Margin, style Style) error {
	s := newScreen(style)
	writeDeciding(s, m)
	writeDetails(s, boardsOf(c, m))
	writeIdle(s, m.Assumed)
	return s.write(w)
}

func writeDeciding(s *screen, m *stress.Margin) {
	s.ends(strong, "MARGIN", m.Case, ratedWords(m))
	writeFigures(s, m)
	for _, b := range boardsOf(nil, m) {
		writeVerdict(s, m, b)
	}
	writeAssumed(s, m.Assumed)
	writeNeeds(s, m.Needs)
}

func ratedWords(m *stress.Margin) string {
	if m.Rated == 0 {
		return "rating not known"
	}
	return "allowed " + volts(m.Allowed) + ": 80 % of " + volts(m.Rated)
}

// topologyKey is the need under which stress names a board whose topology is not stated, or none that is worked out.
const topologyKey = "board.topology"

// topologyWords says of a board without figures why its topology has none; "" where that is not the reason.
func topologyWords(m *stress.Margin) string {
	if m.AsFound != nil || m.Rebuild != nil {
		return ""
	}
	for _, n := range m.Needs {
		if n.Key == topologyKey {
			return topologyNeed(n)
		}
	}
	return ""
}

// topologyNeed is the reason without the mark that it holds for the whole margin.
func topologyNeed(n stress.Need) string {
	return strings.Join(n.For[:max(len(n.For)-1, 0)], "; ")
}

// marginNameWidth is the column of the names of the rows.
const marginNameWidth = 28

func marginColumns(title string, boards []marginBoard) []column {
	cols := []column{{title: title, width: marginNameWidth}, {title: boards[0].name}}
	if len(boards) > 1 {
		cols = append(cols, column{title: boards[1].name, width: 25})
	}
	return cols
}

func writeFigures(s *screen, m *stress.Margin) {
	if m.AsFound == nil && m.Rebuild == nil {
		if topologyWords(m) == "" {
			s.line(caution, "Too little is known to work out the edges; what is missing stands below.")
		}
		return
	}
	boards := boardsOf(nil, m)
	cols := marginColumns("peak at the chip", boards)
	s.grid(cols, rowsOf(peakRows(boards), boards))
	s.add(cols, rowsOf(followRows, boards)...)
	if m.Rebuild == nil {
		s.say(neutral, noRebuild(m))
	}
}

func writeVerdict(s *screen, m *stress.Margin, b marginBoard) {
	f := b.f
	if f == nil {
		return
	}
	s.blank()
	s.hang(verdictTone(f.Verdict), pad(b.name, 10)+" ", verdictWords(f.Verdict)+" ("+percentileWords(f)+")."+restWords(m, f))
	for _, d := range dangersOf(f) {
		s.item(danger, d.Name, d.Text)
	}
	for _, r := range f.Rests {
		s.item(caution, "rests on", r)
	}
	if len(f.LiftedBy) > 0 {
		s.say(mandatory, " "+liftWords(f)+" "+strings.Join(f.LiftedBy, ", ")+".")
	}
}

// dangersOf are what kills a board whatever its verdict on the peak.
func dangersOf(f *stress.Figures) []fact {
	var out []fact
	if f.Avalanche != nil && f.Avalanche.EveryCycle {
		text := "by these figures the switch breaks down in every PWM cycle; no such board is within, whatever its rated energy"
		if len(f.LiftedBy) > 0 {
			text += "; they rest on assumed values, see below"
		}
		out = append(out, fact{"avalanche", text})
	}
	if p := f.PumpUp; p != nil {
		text := "its tie is open: the edges pump it up to " + volts(p.End)
		if p.EndsBy == stress.StopBreakdown {
			text += ", where the switch breaks down"
		}
		out = append(out, fact{"reservoir", text + "; the peaks above hold for the first edge only"})
	}
	return out
}

// liftWords introduces the answers that the verdict lacks: they lift one that is held down for want of them; a worse
// one they only make surer.
func liftWords(f *stress.Figures) string {
	if f.Verdict == stress.Thin {
		return "It may be lifted by stating"
	}
	return "It would be surer with"
}

// writeDetails writes the edges in numbers, what the network goes through and the corners.
func writeDetails(s *screen, boards []marginBoard) {
	rows := detailRows(boards)
	if len(rows) == 0 {
		return
	}
	s.blank()
	s.head("DETAILS", "of the switch position above, at nominal bus and running current"+wattWords(boards))
	s.grid(marginColumns("edge", boards), rows)
	if rows := rowsOf(dutyRows, boards); len(rows) > 0 {
		s.grid(marginColumns("network, each cycle", boards), rows)
	}
	for _, b := range boards {
		if b.f != nil && b.f.Worst.Peak > 0 {
			s.hang(strong, "corner "+pad(b.name, 8)+" ", volts(b.f.Worst.Peak)+" would need "+cornerWords(b.f.Worst.Corner))
		}
	}
}

func detailRows(boards []marginBoard) [][]entry {
	var rows [][]entry
	for _, name := range edgeNames(boards) {
		rows = append(rows, rowsOf(edgeRows(name, boards), boards)...)
	}
	return rows
}

// wattWords says at which frequency the watts hold, or why there are none.
func wattWords(boards []marginBoard) string {
	var all []string
	for _, b := range boards {
		text := quantity.Format(b.hertz, quantity.Hertz)
		if b.hertz <= 0 {
			return "; watts need pwm.frequency"
		}
		if !slices.Contains(all, text) {
			all = append(all, text)
		}
	}
	return "; watts at " + strings.Join(all, " and ")
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

// Assumed values that move the peak by less than this stand at the end of the details, where there are several.
const (
	nothingMoved = 0.5 // V
	worthFolding = 3
)

// byWeight parts the assumed values into those that stand on the screen, what moves the peak most first, and those that
// do not move it.
func byWeight(assumed []stress.Assumed) (movers, idle []stress.Assumed) {
	sorted := byMove(assumed)
	k := slices.IndexFunc(sorted, func(a stress.Assumed) bool { return a.MovesPeak < nothingMoved })
	if k < 0 || len(sorted)-k < worthFolding {
		return sorted, nil
	}
	return sorted[:k], sorted[k:]
}

// writeAssumed lists the assumed values, what moves the peak most first; the reasons stand once below.
func writeAssumed(s *screen, assumed []stress.Assumed) {
	if len(assumed) == 0 {
		return
	}
	s.head("ASSUMED", "not known to be true of this board")
	movers, idle := byWeight(assumed)
	var rows [][]entry
	var reasons []string
	for _, a := range movers {
		k := slices.Index(reasons, a.Why)
		if k < 0 {
			k = len(reasons)
			reasons = append(reasons, a.Why)
		}
		rows = append(rows, []entry{{Text: a.Key}, {Text: between(a.Value)}, {Text: moves(a.MovesPeak)}, {Text: letter(k)}})
	}
	if len(rows) > 0 {
		s.grid([]column{{title: "key"}, {title: "taken as", width: 29}, {title: "moves", width: 6, right: true}, {title: "why", width: 3, right: true}}, rows)
	}
	for k, why := range reasons {
		s.hang(neutral, " "+letter(k)+"  ", why)
	}
	if len(idle) > 0 {
		s.say(neutral, strconv.Itoa(len(idle))+" more move it by less than 1 V each: drivemend margin lists them at its end.")
	}
}

// writeIdle lists the assumed values that do not move the peak, by their reasons.
func writeIdle(s *screen, assumed []stress.Assumed) {
	_, idle := byWeight(assumed)
	if len(idle) == 0 {
		return
	}
	s.head("ASSUMED", "moving the peak by less than 1 V each")
	for _, a := range idle {
		s.hang(neutral, "   ", a.Key+" "+between(a.Value)+": "+a.Why)
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
			s.hang(caution, "topology  ", topologyNeed(n))
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
