package diagnose

import (
	"math"

	"drivemend/diagnose/belief"
)

// evidence turns votes into the engine's terms; skip leaves one out (-1: none). Readings of parts enter as the
// factor by which each changes the joint likelihood of all readings on that fault so far.
func (v *view) evidence(votes []vote, skip int) []belief.Evidence {
	readings := map[int]*partReadings{}
	seen := map[string]*lookedAt{}
	var out []belief.Evidence
	for i := range votes {
		vt := &votes[i]
		switch {
		case i == skip:
		case vt.event < 0:
			out = append(out, belief.Evidence{Event: -1, Present: raise(vt.byRow, vt.power), Class: vt.rows.class})
		case vt.ofParts():
			out = append(out, v.partEvidence(vt, readings))
		default:
			in, not := vt.present, vt.absent
			if vt.places > 0 {
				in, not = look(seen, vt)
			}
			out = append(out, belief.Evidence{Event: vt.event, Absent: []float64{power(not, vt.power)}, Present: []float64{power(in, vt.power)}})
		}
	}
	return out
}

// lookedAt is what one test has shown so far at the places of an event that the board has once.
type lookedAt struct {
	clear float64 // product of the likelihoods without the event
	found float64 // Σ over the places looked at of present(place)·Π_others absent
	count int
}

// look adds one place: the event, when present, sits at one of the places, each as likely, so the joint likelihood is
// (found + (places − count)·clear)/places. It gives the factors by which this place changes it.
func look(seen map[string]*lookedAt, vt *vote) (present, absent float64) {
	l, ok := seen[vt.finding.Test.ID]
	if !ok {
		l = &lookedAt{clear: 1}
		seen[vt.finding.Test.ID] = l
	}
	before := l.joint(vt.places)
	l.found = float64(l.found*vt.absent) + float64(l.clear*vt.present)
	l.clear *= vt.absent
	l.count++
	return over(l.joint(vt.places), before), vt.absent
}

func (l *lookedAt) joint(places int) float64 {
	return l.found + float64(max(places-l.count, 0))*l.clear
}

// partReadings are the readings of the parts about one fault so far, and P(those | the fault is there) by row of its
// patterns, up to the scale of the factors.
type partReadings struct {
	factors partFactors
	joint   []float64
}

func (v *view) partEvidence(vt *vote, readings map[int]*partReadings) belief.Evidence {
	r, ok := readings[vt.event]
	if !ok {
		r = &partReadings{factors: v.parts.blank()}
		r.joint = vt.pattern.sums(v.parts.means(r.factors))
		readings[vt.event] = r
	}
	scale, absent := vt.see(&r.factors)
	now := vt.pattern.sums(v.parts.means(r.factors))
	ratio := make([]float64, len(now))
	for c := range now {
		ratio[c] = over(now[c], r.joint[c]) * scale
	}
	r.joint = now
	return belief.Evidence{Event: vt.event, Absent: []float64{absent}, Present: ratio, Class: vt.pattern.class}
}

// over is a/b, and nothing where both are nothing: what is impossible already stays so.
func over(a, b float64) float64 {
	if b == 0 {
		return 0
	}
	return a / b
}

func raise(x []float64, exponent float64) []float64 {
	if exponent == 1 {
		return x
	}
	out := make([]float64, len(x))
	for i := range x {
		out[i] = math.Pow(x[i], exponent)
	}
	return out
}

func power(x, exponent float64) float64 {
	if exponent == 1 {
		return x
	}
	return math.Pow(x, exponent)
}
