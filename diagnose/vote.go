package diagnose

import (
	"slices"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// vote is a finding with its likelihoods: over the hypotheses (event < 0), over an event, or over the parts.
type vote struct {
	finding         Finding
	event           int
	rows            *rowSet   // event < 0: the rows of the test, and
	byRow           []float64 // the likelihood under each
	present, absent float64   // event >= 0: the likelihoods when what was looked at is there, and when not
	where           place     // what was looked at
	at              int       // the part or bank
	named           []float64 // onPattern: the likelihood of the answer given each of the patterns
	pattern         *rowSet   // a fault of parts: the rows of its patterns
	places          int       // an event the board has once, looked at in one of so many places; 0: as a whole
	power           float64   // exponent of its group
}

// ofParts tells whether the vote is about a fault that sits in one or more of the parts.
func (vt *vote) ofParts() bool { return vt.pattern != nil }

// vote gives an observation its likelihoods, or says why it cannot.
func (v *view) vote(i int, ob measure.Observation) (vote, string) {
	t := v.test(ob.Test)
	f := Finding{Test: t, Part: ob.Part, Position: ob.Position, Shown: shown(t, ob), Source: "answered", Observation: i, Seen: ob.Seen}
	likely, err := v.resultLikelihoods(t, ob)
	if err != nil {
		return vote{}, err.Error()
	}
	if ob.Reading != nil {
		f.Source = "measured"
	}
	return v.voteFor(f, t, ob, likely, answerError(t, ob.Seen))
}

// voteFor turns the likelihoods of a test's results into a vote; e is the chance that the answer is wrong.
func (v *view) voteFor(f Finding, t *knowledge.Test, ob measure.Observation, likely []float64, e float64) (vote, string) {
	vt := vote{finding: f, event: -1, power: 1}
	switch {
	case t.PatternOf != "":
		vt.finding.Source = "pattern"
		return v.patternVote(vt, t, likely, e)
	case t.Observes == "":
		vt.rows = v.rowsOf(t)
		vt.byRow = nominalVote(vt.rows, likely, e)
		if !(slices.Max(vt.byRow) > 0) {
			return vt, noChance
		}
		return vt, ""
	}
	vt.event = v.eventAt[t.Observes]
	present, absent := v.observing(t, e)
	vt.present, vt.absent = dot(present, likely), dot(absent, likely)
	if !(vt.present > 0 || vt.absent > 0) {
		return vt, noChance
	}
	vt.where, vt.at = v.placeOf(t, ob)
	if v.events[vt.event].Of == "" {
		vt.places = v.placeCount(vt.where)
		return vt, ""
	}
	vt.pattern = v.patternRows(t.Observes)
	if vt.where == onBank {
		vt.finding.Position = v.parts.banks[vt.at].position
	}
	return vt, ""
}

// noChance is why an answer cannot vote: it would make every explanation impossible.
const noChance = "the rule base gives this result no chance on this board"

func nominalVote(set *rowSet, likely []float64, e float64) []float64 {
	stray := e * dot(set.base, likely)
	out := make([]float64, len(set.rows))
	for c, row := range set.rows {
		out[c] = float64((1-e)*dot(row, likely)) + stray
	}
	return out
}

// observing gives the fallible rows of a test of an event.
func (v *view) observing(t *knowledge.Test, e float64) (present, absent []float64) {
	present, absent = make([]float64, len(t.Results)), make([]float64, len(t.Results))
	base, rate := make([]float64, len(t.Results)), v.rates()[v.eventAt[t.Observes]]
	for k, r := range t.Results {
		present[k], absent[k] = t.Present[r.ID].Mid, t.Absent[r.ID].Mid
		base[k] = float64(rate*present[k]) + float64((1-rate)*absent[k])
	}
	return blur(present, base, e), blur(absent, base, e)
}

// patternVote weighs the patterns by an answer that names one; it observes the same set of parts as their readings.
func (v *view) patternVote(vt vote, t *knowledge.Test, likely []float64, e float64) (vote, string) {
	set := v.rowsOf(t)
	vt.event = v.eventAt[v.base.Test(t.PatternOf).Observes]
	vt.pattern, vt.where, vt.named = set, onPattern, make([]float64, len(patterns))
	base := 0.0
	for k, r := range t.Results {
		if p := patternAt(r.ID); p >= 0 {
			vt.named[p] = likely[k]
		}
	}
	for j, k := range set.pattern {
		base += float64(set.base[j] * vt.named[k])
	}
	if base == 0 {
		return vt, "this board cannot show that pattern"
	}
	stray := e * base
	for k, p := range vt.named {
		vt.named[k] = float64((1-e)*p) + stray
	}
	vt.present, vt.absent = stray, stray
	return vt, ""
}

// patternRows gives the pattern rows of a fault of parts. A fault without a pattern test takes every pattern this
// board can show as equally likely, the same under every hypothesis: were it to take the rows of another fault, the
// pattern of the dead parts would vote a second time through its readings.
func (v *view) patternRows(event string) *rowSet {
	for _, t := range v.tests {
		if t.PatternOf != "" && v.base.Test(t.PatternOf).Observes == event {
			return v.rowsOf(t)
		}
	}
	if v.even == nil {
		v.even = v.evenRows()
	}
	return v.even
}

func (v *view) evenRows() *rowSet {
	even := &rowSet{class: make([]int32, len(v.hyps))}
	for _, p := range patterns {
		if v.parts.shows(p) {
			even.add(p)
		}
	}
	even.base = ones(len(even.results))
	for k := range even.base {
		even.base[k] /= float64(len(even.base))
	}
	even.rows = [][]float64{even.base}
	return even
}

func (v *view) resultLikelihoods(t *knowledge.Test, ob measure.Observation) ([]float64, error) {
	if ob.Result != "" || ob.Reading == nil {
		return wordLikelihoods(t, ob.Result)
	}
	likely, _, err := readAgainst(t, ob, v.expected(t, ob))
	return likely, err
}

func shown(t *knowledge.Test, ob measure.Observation) string {
	if ob.Result != "" || ob.Reading == nil {
		return ob.Result
	}
	return effective(t, ob).Text
}

// standing gives the votes nobody has to ask for: computed figures and board keys that answer a test.
func (v *view) standing(answered []vote, computed map[string]stress.Span) []vote {
	done := map[string]bool{}
	for _, vt := range answered {
		done[vt.finding.Test.ID] = true
	}
	var out []vote
	for _, t := range v.tests {
		if t.UsedIn == "prior" || done[t.ID] {
			continue
		}
		if vt, ok := v.computedVote(t, computed); ok {
			out = append(out, vt)
		} else if vt, ok := v.keyVote(t); ok {
			out = append(out, vt)
		}
	}
	return out
}

func (v *view) computedVote(t *knowledge.Test, computed map[string]stress.Span) (vote, bool) {
	c, ok := computed[t.Computed]
	if t.Computed == "" || !ok {
		return vote{}, false
	}
	r := quantity.Reading{Kind: quantity.Between, Low: c.Low, High: c.High, Unit: t.Unit}
	if c.Low == c.High {
		r.Kind, r.Value = quantity.Point, c.Low
	}
	likely, err := readingLikelihoods(t, r, exactly, 0, v.expected(t, measure.Observation{}))
	if err != nil {
		return vote{}, false
	}
	f := Finding{Test: t, Shown: computedText(c, t.Unit), Source: "computed", Assumed: c.Assumed, Observation: -1}
	vt, why := v.voteFor(f, t, measure.Observation{}, likely, 0)
	if c.Guessed {
		vt.soften(guessLimit)
	}
	return vt, why == ""
}

// guessLimit is the most that a computed figure may count for when it rests on assumed values alone: as a ratio of
// likelihoods, 2.9 dB (judgement).
const guessLimit = 1.95

// soften lifts the likelihoods of a vote so that no two differ by more than a ratio.
func (vt *vote) soften(limit float64) {
	all := []*float64{&vt.present, &vt.absent}
	for _, list := range [][]float64{vt.byRow, vt.named} {
		for k := range list {
			all = append(all, &list[k])
		}
	}
	top := 0.0
	for _, x := range all {
		top = max(top, *x)
	}
	for _, x := range all {
		*x = max(*x, top/limit)
	}
}

func computedText(c stress.Span, u quantity.Unit) string {
	if c.Low == c.High {
		return quantity.Format(c.Low, u)
	}
	return quantity.Format(c.Low, u) + " to " + quantity.Format(c.High, u)
}

func (v *view) keyVote(t *knowledge.Test) (vote, bool) {
	if t.AnsweredBy == nil {
		return vote{}, false
	}
	word, _, known := v.lookup(t.AnsweredBy.Path)
	result, ok := t.AnsweredBy.Results[word]
	if !known || !ok {
		return vote{}, false
	}
	likely, err := wordLikelihoods(t, result)
	if err != nil {
		return vote{}, false
	}
	f := Finding{Test: t, Shown: result, Source: "answered", Observation: -1}
	vt, why := v.voteFor(f, t, measure.Observation{Result: result}, likely, 0)
	return vt, why == ""
}
