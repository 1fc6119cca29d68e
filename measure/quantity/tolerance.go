package quantity

import (
	"fmt"
	"math"
)

// tolerance reads "±20 %", "±5 nH" or "-10/+20 %" behind a value. Nothing is taken when none stands here.
func (p *parser) tolerance(value term) (q Quantity, found bool, err error) {
	start := p.pos
	var below, above term
	switch {
	case p.takeAny("±", "+/-", "+-"):
		p.space()
		if below, err = p.distance(); err != nil {
			return Quantity{}, true, err
		}
		above = below
	default:
		if below, above, found = p.twoSided(); !found {
			p.pos = start
			return Quantity{}, false, nil
		}
	}
	if p.space(); !p.done() {
		return Quantity{}, true, p.leftover(above)
	}
	if value.unit == "" && above.unit != Ratio {
		value.unit, value.scale = above.unit, above.scale // 120 ±5 nH
	}
	q, err = p.spread(value, below, above)
	return q, true, err
}

// distance reads an unsigned number with its unit, if it has one.
func (p *parser) distance() (term, error) {
	if p.sign() == "-" {
		return term{}, p.fault("has a second sign behind its tolerance", "write ±5 % or -10/+20 %")
	}
	return (&parser{p.scanner, p.text, p.distanceUnit(), false}).at(p)
}

// at reads a term and moves the outer parser on.
func (p *parser) at(outer *parser) (term, error) {
	t, err := p.term()
	outer.pos = p.pos
	return t, err
}

// distanceUnit is what a distance from the wanted unit is measured in: beside °C it is K.
func (p *parser) distanceUnit() Unit {
	if p.want == Celsius {
		return Kelvin
	}
	return p.want
}

// twoSided reads "-10/+20 %" in either order; the first may leave its unit to the second.
func (p *parser) twoSided() (below, above term, found bool) {
	first, minus, ok := p.signed()
	p.space()
	if !ok || !p.take("/") {
		return term{}, term{}, false
	}
	p.space()
	second, otherMinus, ok := p.signed()
	if !ok || minus == otherMinus {
		return term{}, term{}, false
	}
	if first.unit == "" {
		first.unit, first.scale = second.unit, second.scale
	}
	if minus {
		return first, second, true
	}
	return second, first, true
}

func (p *parser) signed() (t term, minus, ok bool) {
	minus = p.take("-")
	if !minus && !p.take("+") {
		return term{}, false, false
	}
	t, err := p.distance()
	return t, minus, err == nil
}

// spread lays the two distances about the value.
func (p *parser) spread(value, below, above term) (Quantity, error) {
	v, unit, err := p.value(value)
	if err != nil {
		return Quantity{}, err
	}
	if value.unit != "" && above.unit == "" { // also 50 % ±5
		return Quantity{}, p.fault("has a tolerance without a unit", fmt.Sprintf("write ±%s %% or the unit of the value", above.bare))
	}
	down, err := p.length(v, unit, below)
	if err != nil {
		return Quantity{}, err
	}
	up, err := p.length(v, unit, above)
	if err != nil {
		return Quantity{}, err
	}
	return p.within(v, down, up, unit)
}

// length gives a distance in the unit of the value; per cent are of the value.
func (p *parser) length(v float64, unit Unit, t term) (float64, error) {
	length, fault := t.digits.si(t.scale)
	switch {
	case fault != "":
		return 0, p.fault(fault, p.example())
	case t.unit == Ratio && unit.relative():
		return math.Abs(v) * length, nil
	case t.unit == Ratio && (unit != Ratio || t.scale.exponent != 0):
		return 0, p.fault(fmt.Sprintf("has a tolerance in per cent of %s, which can be meant in two ways", describe(unit)), "write an interval, like "+p.intervalExample(unit))
	case t.unit == "" && (unit == Count || unit == Ratio), t.unit == unit, unit == Celsius && t.unit == Kelvin:
		return length, nil
	}
	return 0, p.fault(fmt.Sprintf("has a tolerance in %s beside %s", describe(t.unit), describe(unit)), "write ±5 % or the unit of the value")
}

func (p *parser) intervalExample(unit Unit) string {
	switch unit {
	case Celsius:
		return "20 °C to 30 °C"
	case Count:
		return "2 to 4"
	case Ratio:
		return "0.45 to 0.55"
	case Any:
		return "4 kΩ to 6 kΩ"
	}
	return Format(4, unit) + " to " + Format(6, unit)
}
