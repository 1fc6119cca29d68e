package reports

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"time"
	"unicode"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// num is a figure of an output: nine significant digits; what is not a finite number is null.
type num float64

// MarshalJSON writes the number, or null.
func (n num) MarshalJSON() ([]byte, error) {
	x := float64(n)
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return []byte("null"), nil
	}
	rounded, err := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 9, 64), 64)
	if err != nil {
		return nil, err
	}
	return json.Marshal(rounded + 0) // adding zero turns −0 into 0
}

// some gives a number that may be missing; zero stands for missing where the result types say so.
func some(x float64) *num {
	if x == 0 {
		return nil
	}
	n := num(x)
	return &n
}

// orNull gives a text that may be missing.
func orNull(s string) *string {
	if s == "" {
		return nil
	}
	return &s
}

// instant gives a time in RFC 3339 that may be missing.
func instant(t time.Time) *string {
	if t.IsZero() {
		return nil
	}
	return orNull(t.Format(time.RFC3339))
}

// list gives an empty list instead of none.
func list[T any](xs []T) []T {
	if xs == nil {
		return []T{}
	}
	return xs
}

// writeJSON writes one object, indented by two blanks. Characters that a terminal would obey are written as escapes.
func writeJSON(w io.Writer, v any) error {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(v); err != nil {
		return err
	}
	var out strings.Builder
	for _, r := range b.String() {
		if r != '\n' && (unicode.IsControl(r) || r < 0x10000 && unicode.Is(unicode.Cf, r)) {
			fmt.Fprintf(&out, `\u%04x`, r)
		} else {
			out.WriteRune(r)
		}
	}
	_, err := io.WriteString(w, out.String())
	return err
}

type needJSON struct {
	Key string   `json:"key"`
	For []string `json:"for"`
}

func needsJSON(needs []stress.Need) []needJSON {
	out := []needJSON{}
	for _, n := range needs {
		out = append(out, needJSON{n.Key, list(n.For)})
	}
	return out
}

type lineJSON struct {
	ID          string     `json:"id"`
	Title       string     `json:"title"`
	Role        *string    `json:"role,omitempty"`
	Probability num        `json:"probability"`
	Low         *num       `json:"low"`
	High        *num       `json:"high"`
	Leads       *num       `json:"leads"`
	Prior       *num       `json:"prior,omitempty"`
	Parts       []partJSON `json:"parts,omitzero"`
}

type partJSON struct {
	Part        string `json:"part"`
	Probability num    `json:"probability"`
}

type findingJSON struct {
	Test     string   `json:"test"`
	Result   string   `json:"result"`
	Part     *string  `json:"part"`
	Position *string  `json:"position"`
	Source   string   `json:"source"`
	Seen     *string  `json:"seen"`
	DB       num      `json:"db"`
	AloneDB  num      `json:"alone_db"`
	Assumed  []string `json:"assumed"`
	Outside  bool     `json:"outside_hold_point"`
}

type unlistedJSON struct {
	Probability num  `json:"probability"`
	Low         *num `json:"low"`
	High        *num `json:"high"`
	Prior       num  `json:"prior"`
}

type unexplainedJSON struct {
	Test   string `json:"test"`
	Result string `json:"result"`
	DB     num    `json:"db"`
}

type unboundJSON struct {
	Observation int    `json:"observation"`
	Why         string `json:"why"`
}

type rankJSON struct {
	Case        string            `json:"case"`
	Setting     string            `json:"setting"`
	About       string            `json:"about"`
	Causes      []lineJSON        `json:"causes"`
	Stresses    []lineJSON        `json:"stresses"`
	Faults      []lineJSON        `json:"faults"`
	Unlisted    unlistedJSON      `json:"unlisted"`
	Fit         *num              `json:"fit"`
	Unexplained []unexplainedJSON `json:"unexplained"`
	Alike       [][]string        `json:"alike"`
	Findings    []findingJSON     `json:"findings"`
	Unbound     []unboundJSON     `json:"unbound"`
	Needs       []needJSON        `json:"needs"`
}

// RankJSON writes the ranking. The findings' decibans are for the line r.About; needs are those of the computed
// figures (stress.Spans).
func RankJSON(w io.Writer, r *diagnose.Ranking, needs []stress.Need, beside ...Beside) error {
	return writeJSON(w, rankOf(r, needs, besides(beside)))
}

func rankOf(r *diagnose.Ranking, needs []stress.Need, known Beside) *rankJSON {
	if r == nil {
		return nil
	}
	out := &rankJSON{Case: r.Case, Setting: r.Setting, About: r.About, Alike: list(r.Alike), Needs: needsJSON(needs),
		Causes: linesJSON(r, r.Causes), Stresses: linesJSON(r, r.Stresses), Faults: faultsJSON(r),
		Unlisted: unlistedJSON{Probability: num(r.Unlisted), Prior: num(r.UnlistedPrior)},
		Findings: []findingJSON{}, Unexplained: []unexplainedJSON{}, Unbound: []unboundJSON{}}
	for _, f := range r.Findings {
		out.Findings = append(out.Findings, findingOf(f, known))
	}
	for _, f := range r.Unexplained {
		out.Unexplained = append(out.Unexplained, unexplainedJSON{testID(f), known.shown(f), num(f.Alone)})
	}
	for _, u := range r.Unbound {
		out.Unbound = append(out.Unbound, unboundJSON(u))
	}
	return out
}

func findingOf(f diagnose.Finding, known Beside) findingJSON {
	return findingJSON{Test: testID(f), Result: known.shown(f), Part: orNull(f.Part), Position: orNull(f.Position), Source: f.Source,
		Seen: orNull(f.Seen), DB: num(f.Decibans), AloneDB: num(f.Alone), Assumed: list(f.Assumed), Outside: known.outside(f)}
}

func testID(f diagnose.Finding) string {
	if f.Test == nil {
		return ""
	}
	return f.Test.ID
}

func linesJSON(r *diagnose.Ranking, lines []diagnose.Line) []lineJSON {
	out := []lineJSON{}
	for _, l := range lines {
		j := lineJSON{ID: l.ID, Title: l.Title, Role: orNull(l.Role), Probability: num(l.Probability)}
		if p, ok := priorOf(r, l.ID); ok {
			n := num(p)
			j.Prior = &n
		}
		for _, p := range l.Parts {
			j.Parts = append(j.Parts, partJSON{p.Part, num(p.Probability)})
		}
		out = append(out, j)
	}
	return out
}

// faultsJSON gives every fault a list of parts, empty for a fault that does not sit in the parts.
func faultsJSON(r *diagnose.Ranking) []lineJSON {
	out := linesJSON(r, r.Faults)
	for i := range out {
		out[i].Parts = list(out[i].Parts)
	}
	return out
}

type testJSON struct {
	ID         string   `json:"id"`
	Title      string   `json:"title"`
	Part       *string  `json:"part"`
	Position   *string  `json:"position"`
	Lifted     bool     `json:"lifted"`
	ValueMin   num      `json:"value_min"`
	Bits       num      `json:"bits"`
	Minutes    num      `json:"minutes"`
	Needs      string   `json:"needs"`
	Tool       *string  `json:"tool"`    // with conditions of its own, beside the state of the board
	Carries    []string `json:"carries"` // what its instruction always says
	Must       bool     `json:"must"`
	Serves     bool     `json:"serves"` // the hold points after the rebuild, not the ranking
	Again      *string  `json:"again"`  // a static test that was read and did not pass: what to do
	Allowed    bool     `json:"allowed"`
	BlockedBy  []string `json:"blocked_by"`
	UnlockedBy []string `json:"unlocked_by"`
}

type stopJSON struct {
	Reason string `json:"reason"`
}

type nextJSON struct {
	Case     string     `json:"case"`
	At       *string    `json:"at"`
	PriceMin num        `json:"price_min"`
	Repairs  []string   `json:"repairs"`       // those to be named now
	Held     *string    `json:"repairs_after"` // what comes before any repair
	Tests    []testJSON `json:"tests"`
	Stop     *stopJSON  `json:"stop"`
	Withheld bool       `json:"withheld"`
	Steps    []string   `json:"open_steps"` // of the record, those that may be done now
}

// NextJSON writes the tests in order of value, and why to stop. Repairs are named as on the terminal: none while
// something comes before them.
func NextJSON(w io.Writer, n *diagnose.Suggestion, beside ...Beside) error {
	return writeJSON(w, nextOf(n, besides(beside)))
}

func nextOf(n *diagnose.Suggestion, known Beside) *nextJSON {
	if n == nil {
		return nil
	}
	out := &nextJSON{Case: n.Case, At: instant(n.At), PriceMin: num(n.Price), Repairs: list(n.Repair), Withheld: n.Withheld(), Tests: []testJSON{}, Steps: list(openSteps(known.Record))}
	if before := repairHeld(n, known); before != "" && len(n.Repair) > 0 {
		out.Repairs, out.Held = []string{}, &before
	}
	for _, c := range n.Tests {
		out.Tests = append(out.Tests, testOf(c))
	}
	if n.Stop != "" {
		out.Stop = &stopJSON{n.Stop}
	}
	return out
}

func testOf(c diagnose.Candidate) testJSON {
	w := diagnose.WorkOf(c.Test)
	return testJSON{ID: c.Test.ID, Title: c.Test.Title, Part: orNull(c.Part), Position: orNull(c.Position), Lifted: c.Lifted,
		ValueMin: num(c.Value), Bits: num(c.Bits), Minutes: num(c.Minutes), Needs: c.Test.Needs, Tool: orNull(string(w.Tool)), Carries: list(safety.Carries(w)),
		Must: c.Test.Must, Serves: c.Serves, Again: orNull(c.Again), Allowed: c.Allowed, BlockedBy: list(c.BlockedBy), UnlockedBy: list(c.UnlockedBy)}
}

type ruleJSON struct {
	Kind  string `json:"kind"`
	ID    string `json:"id"`
	Title string `json:"title"`
	Note  string `json:"note"`
}

// RulesJSON writes the entries of a kind, of every kind for "".
func RulesJSON(w io.Writer, b *knowledge.Base, kind knowledge.Kind) error {
	out := struct {
		Hash  string     `json:"hash"`
		Rules []ruleJSON `json:"rules"`
	}{b.Hash, []ruleJSON{}}
	for _, r := range rulesOf(b, kind) {
		out.Rules = append(out.Rules, ruleJSON{string(r.kind), r.id, r.title, r.note})
	}
	return writeJSON(w, out)
}

type keyJSON struct {
	Path    string        `json:"path"`
	Kind    string        `json:"kind"`
	Unit    *string       `json:"unit"`
	Min     *num          `json:"min"`
	Max     *num          `json:"max"`
	Words   []string      `json:"words"`
	Typical []typicalJSON `json:"typical"`
	Help    string        `json:"help"`
	Users   []string      `json:"users"`
	Must    bool          `json:"required"`
}

type typicalJSON struct {
	For    *string `json:"for"`
	Text   string  `json:"text"`
	Source string  `json:"source"`
}

// KeysJSON writes case keys; min and max are in the SI unit, null where there is no limit.
func KeysJSON(w io.Writer, keys []measure.Key) error {
	out := struct {
		Keys []keyJSON `json:"keys"`
	}{[]keyJSON{}}
	for _, k := range keys {
		j := keyJSON{Path: k.Path, Kind: string(k.Kind), Unit: orNull(string(k.Unit)), Words: list(k.Words), Help: k.Help, Users: list(k.Users), Must: k.Required, Typical: []typicalJSON{}}
		if k.Min != k.Max {
			low, high := num(k.Min), num(k.Max)
			j.Min, j.Max = &low, &high
		}
		for _, t := range k.Typical {
			j.Typical = append(j.Typical, typicalJSON{orNull(t.For), t.Text, t.Source})
		}
		out.Keys = append(out.Keys, j)
	}
	return writeJSON(w, out)
}
