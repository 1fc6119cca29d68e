package reports

import (
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure"
)

// NetlistMark begins every netlist that is written here, so that one can be told from any other file.
const NetlistMark = "* drivemend netlist"

// NetlistEdges are the words by which an edge can be asked for; the empty word asks for the one that decides.
var NetlistEdges = []string{turnOff, turnOn, allOff, cutShape, "short-circuit"}

// ErrNoFigures tells that a margin has no edge at all; its needs say why.
var ErrNoFigures = errors.New("no edge of this board can be worked out, so there is no circuit to write")

// NetlistChoice is the edge that a netlist is written of.
type NetlistChoice struct {
	Board string // as found, or rebuild
	Edge  *stress.Edge
	of    *stress.Figures
}

// Words says in a line what was chosen.
func (n NetlistChoice) Words() string {
	return fmt.Sprintf("%s, %s, at %s, %s, peak %s", n.Board, edgeAndShape(n.Edge), n.Edge.Position, atEdge(n.Edge), volts(n.Edge.Peak))
}

// ChooseEdge picks the edge of the rebuild, or of the board as found where no rebuild has figures: the one with the
// highest peak at the highest bus and worst current, or the one that a word of NetlistEdges names. Of the edges that
// do not decide, those at nominal bus and running current are kept. The errors: no figures (ErrNoFigures), or no such
// edge on this board.
func ChooseEdge(m *stress.Margin, word string) (NetlistChoice, error) {
	n := NetlistChoice{Board: "rebuild", of: m.Rebuild}
	if n.of == nil {
		n.Board, n.of = "as found", m.AsFound
	}
	if n.of == nil || n.of.Highest == nil {
		return n, ErrNoFigures
	}
	kept := keptEdges(n.of)
	var words []string
	for _, k := range kept {
		if n.Edge == nil && (word == "" || k.word == word) {
			n.Edge = k.edge
		}
		if !slices.Contains(words, k.word) {
			words = append(words, k.word)
		}
	}
	if n.Edge == nil {
		return n, fmt.Errorf("no edge %s is kept of the board %s; there are: %s", word, n.Board, strings.Join(words, ", "))
	}
	return n, nil
}

type keptEdge struct {
	word string
	edge *stress.Edge
}

// keptEdges are the edges whose circuit figures keep, the one that decides first.
func keptEdges(f *stress.Figures) []keptEdge {
	out := []keptEdge{{f.Highest.Name, f.Highest}}
	for _, e := range f.Edges {
		out = append(out, keptEdge{e.Name, e})
	}
	if f.Cut != nil {
		out = append(out, keptEdge{cutShape, f.Cut})
	}
	if f.ShortCircuit != nil {
		out = append(out, keptEdge{"short-circuit", f.ShortCircuit})
	}
	return out
}

// Netlist writes the circuit of an edge as a file that ngspice -b runs as it stands, with a head that says what it is
// and which peak it should find. An edge whose circuit was not kept is an error.
func Netlist(w io.Writer, c *measure.Case, m *stress.Margin, n NetlistChoice) error {
	deck, err := n.Edge.Netlist("circuit")
	if err != nil {
		return err
	}
	var b strings.Builder
	b.WriteString(NetlistMark + "\n")
	board := c.Board
	if n.Board == "rebuild" && c.Rebuild != nil {
		board = c.Rebuild.Board
	}
	for _, f := range []fact{
		{"case", m.Case}, {"board", n.Board + ": " + boardLine(board)}, {"network", networkWords(n.of.Network)},
		{"edge", edgeAndShape(n.Edge) + ", seen at " + n.Edge.Position}, {"bus, current", atEdge(n.Edge)},
		{"peak", fmt.Sprintf("%.6g V, rated %s at the coldest junction", n.Edge.Peak, volts(n.of.Rated))},
		{"run", "ngspice -b FILE prints its own as: peak ="},
		{"values", "the middle of each interval; what was assumed, drivemend margin lists"},
	} {
		for i, line := range fold(plain(f.Text), netlistWidth) {
			name := f.Name + ":"
			if i > 0 {
				name = ""
			}
			b.WriteString("* " + pad(name, 14) + line + "\n")
		}
	}
	b.WriteString(steadying + deck)
	_, err = io.WriteString(w, b.String())
	return err
}

// steadying hangs 10 fF on every node. Where only inductances and diodes meet, ngspice otherwise cuts its steps down to
// nothing; peaks move by less than a thousandth of a percent.
const steadying = "* 10 fF at every node keep the steps of ngspice from shrinking to nothing\n.options cshunt=1e-14\n"

// netlistWidth is how many columns a line of the head takes.
const netlistWidth = 90
