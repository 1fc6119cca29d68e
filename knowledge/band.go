package knowledge

import (
	"fmt"
	"math"

	"gopkg.in/yaml.v3"
)

// sumTolerance is how far the mids of a row may be from 1.
const sumTolerance = 1e-6

// row is what a test shows under one circumstance: a band for every result, in file order.
type row struct {
	spot
	order []string
	bands map[string]Band
	sound bool // no fault was found in it
}

// probability gives a band between 0 and 1.
func (d *decoder) probability(s spot) (Band, bool) { return d.band(s, 1) }

// share gives a band from 0 up.
func (d *decoder) share(s spot) (Band, bool) { return d.band(s, math.Inf(1)) }

// band reads a number, [low, mid, high] or {p: band, grade, source}, all between 0 and most.
func (d *decoder) band(s spot, most float64) (Band, bool) {
	if !s.given() {
		return Band{}, false
	}
	if s.node.Kind != yaml.MappingNode {
		return d.shortBand(s, most)
	}
	f := d.fields(s, "p", "grade", "source")
	d.need(s, "p", "grade")
	if !f["p"].given() {
		return Band{}, false
	}
	b, ok := d.shortBand(f["p"], most)
	b.Grade = d.word(f["grade"], "grade", Grades())
	b.Source = d.name(f["source"])
	d.refer(f["source"], KindSource, b.Source)
	if (b.Grade == "read" || b.Grade == "second-hand") && !f["source"].given() {
		d.add(s, "the grade "+b.Grade+" needs a source", "add source: with an id of sources.yaml, or use the grade memory or judgement")
		return b, false
	}
	return b, ok && b.Grade != ""
}

// shortBand reads a number or [low, mid, high]; its grade is judgement.
func (d *decoder) shortBand(s spot, most float64) (Band, bool) {
	var v [3]float64
	switch s.node.Kind {
	case yaml.SequenceNode:
		if len(s.node.Content) != len(v) {
			d.add(s, fmt.Sprintf("has %d numbers; expected [low, mid, high]", len(s.node.Content)), "write decimals with a point")
			return Band{}, false
		}
		sound := true
		for i, item := range d.items(s) {
			n, ok := d.number(item)
			v[i], sound = n, sound && ok
		}
		if !sound {
			return Band{}, false
		}
	case yaml.ScalarNode:
		n, ok := d.number(s)
		if !ok {
			return Band{}, false
		}
		v = [3]float64{n, n, n}
	default:
		d.add(s, "is "+describe(s.node)+"; expected a number or [low, mid, high]", "")
		return Band{}, false
	}
	b := Band{Low: v[0], Mid: v[1], High: v[2], Grade: "judgement"}
	return b, d.inRange(s, b, most)
}

// inRange reports a band that is out of order or out of range.
func (d *decoder) inRange(s spot, b Band, most float64) bool {
	switch {
	case b.Low < 0:
		d.add(s, fmt.Sprintf("%g is below 0", b.Low), "")
	case b.High > most:
		hint := ""
		if b.Mid > 1 && b.High <= 100 {
			hint = fmt.Sprintf("write %g %% as %.3g", b.High, b.High/100)
		}
		d.add(s, fmt.Sprintf("%g is above %g; expected a probability", b.High, most), hint)
	case b.Low > b.Mid || b.Mid > b.High:
		d.add(s, fmt.Sprintf("[%g, %g, %g] is not in order; expected low <= mid <= high", b.Low, b.Mid, b.High), "")
	default:
		return true
	}
	return false
}

// row reads a band for every result.
func (d *decoder) row(s spot) row {
	r := row{spot: s, bands: map[string]Band{}, sound: s.given() && s.node.Kind == yaml.MappingNode}
	before := len(d.list)
	for _, p := range d.pairs(s) {
		if !kebab.MatchString(p.key) {
			d.add(p.at, "is no id of a result; expected small letters and digits with hyphens between words", "")
			continue
		}
		b, _ := d.probability(p.value)
		r.order = append(r.order, p.key)
		r.bands[p.key] = b
	}
	if s.given() && len(r.order) == 0 && len(d.list) == before {
		d.add(s, "names no result", "")
	}
	r.sound = r.sound && len(d.list) == before
	return r
}

// sum adds the mids in file order.
func (r row) sum() float64 {
	total := 0.0
	for _, id := range r.order {
		total += r.bands[id].Mid
	}
	return total
}

// wholeRow reads a row whose mids must sum to 1.
func (d *decoder) wholeRow(s spot) row {
	r := d.row(s)
	if r.sound && math.Abs(r.sum()-1) > sumTolerance {
		d.add(s, fmt.Sprintf("the middle values sum to %.7g; expected 1", r.sum()), "")
		r.sound = false
	}
	return r
}
