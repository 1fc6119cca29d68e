package stress

import "math"

// The reverse recovery of a diode by its stored charge (Lauritzen and Ma, A simple diode model with reverse recovery,
// IEEE Trans. Power Electronics 6, 1991, from memory): on a current that falls by a amperes a second from I, it blocks at
//
//	I_rr = a·(τ − τ_rr)·(1 − exp(−(I + I_rr)/(a·τ)))
//
// and the reverse current then dies away with τ_rr; τ is the life of the charge. Both times belong to the diode, so that
// one test gives what it does at another current and slope.

// blocking is the test at which a diode's recovery was stated.
type blocking struct{ amps, slope float64 } // of one diode; A, A/s

// recovered is how a bank's diodes block: their reverse current, and how fast that dies away.
type recovered struct{ amps, time float64 }

// usualTest is the slope at which data sheets state a recovery time (common practice).
const usualTest = 100e6 // A/s

// recovery is the blocking of the victim's diodes by the current slope that the loop allows. One diode lies beside every
// switch of a leg; a chopper's freewheel diode is stated as a whole.
func (s scene) recovery() recovered {
	bank := 1.0
	if s.leg {
		bank = float64(max(s.in.bank, 1))
	}
	slope := math.Min(s.closingSlope(), (s.bus+s.get("freewheel.forward_voltage"))/s.commutation()) / bank
	at, amps, time := s.tested.or(s.amps/bank, slope), 0.0, 0.0
	soft := s.get("freewheel.softness")
	if whole := s.get("freewheel.recovery_time"); whole > 0 {
		if s.tested.slope <= 0 {
			at.slope = usualTest
		}
		rising := whole / (1 + soft)
		amps, time = at.slope*rising, soft*rising/2
	} else if charge := s.storedCharge() / (1 + soft); charge > 0 {
		amps = math.Sqrt(2 * charge * at.slope)
		time = soft * charge / amps
	}
	if amps <= 0 {
		return recovered{}
	}
	life := chargeLife(at, amps, time)
	return recovered{bank * blockedAt(blocking{s.amps / bank, slope}, life, time), time}
}

// storedCharge is the stated recovery charge of one diode less what its measurement has of the output capacitance, which
// the circuit charges by itself; no less than half of what is stated.
func (s scene) storedCharge() float64 {
	charge := s.get("freewheel.recovery_charge")
	if !s.leg {
		return charge
	}
	return math.Max(charge-s.bus*s.meanFarad()/float64(max(s.in.bank, 1)), charge/2)
}

// or fills what the test does not say with the conditions it is asked for.
func (b blocking) or(amps, slope float64) blocking {
	if b.amps <= 0 {
		b.amps = amps
	}
	if b.slope <= 0 {
		b.slope = slope
	}
	return b
}

// chargeLife is the life of the charge of a diode that blocked at so many amperes in a test.
func chargeLife(at blocking, amps, time float64) float64 {
	low := time + amps/at.slope // as if nothing limited the charge
	high := low
	for range 60 {
		if blockedAt(at, high, time) >= amps || high > 1e6*low {
			break
		}
		high *= 2
	}
	for range 60 {
		if mid := (low + high) / 2; blockedAt(at, mid, time) < amps {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2
}

// blockedAt is the reverse current at which a diode blocks, found by stepping the implicit law above, which rises to it.
func blockedAt(at blocking, life, time float64) float64 {
	amps := 0.0
	for range 200 {
		next := at.slope * (life - time) * -math.Expm1(-(at.amps+amps)/(at.slope*life))
		if next-amps <= 1e-9*next {
			return next
		}
		amps = next
	}
	return amps
}
