package safety

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// The sources of the thresholds, as they were read.
var (
	citeOsha       = citation{"29 CFR 1910.333", "29 CFR 1910.333(a)(1), 50 V to ground, in a training summary", SecondHand}
	citeMachines   = citation{"IEC 60204-1", "IEC 60204-1 6.2.4, in a clause-by-clause commentary", SecondHand}
	citeDrives     = citation{"IEC 61800-5-1", "IEC 61800-5-1 and EN 50178 5.2.8.1", Memory}
	citeLabShock   = citation{"LBNL 2.2.13", labManual + "table 2.2.13", Read}
	citeLabArc     = citation{"LBNL 2.3.3", labManual + "table 2.3.3", Read}
	citeLabBurn    = citation{"LBNL 2.3.5", labManual + "table 2.3.5", Read}
	citeWorkplace  = citation{"NFPA 70E", "NFPA 70E, restated by " + labName, SecondHand}
	citeLaboratory = citation{"NFPA 70E 350.9", "NFPA 70E-2021 350.9, in a trade magazine", SecondHand}
	citeArticle360 = citation{"NFPA 70E 360.3", "NFPA 70E-2021 article 360.3", Memory}
	citeAnnexR     = citation{"NFPA 70E annex R", "NFPA 70E-2021 informative annex R", Memory}
	citeVehicles   = citation{"UN R100", "UN R100 and ISO 6469-3", Memory}
	citeCrashed    = citation{"UN R100 crash", "UN R100, GTR 20 and SAE J1766: the 0.2 J in a paper of the vehicle-safety group, the clause from memory", SecondHand}
	citeReflex     = citation{"DOE-HDBK reflex", "DOE-HDBK-1092-2013 appendix D, in a web text", SecondHand}
	citeCharts     = citation{"DOE-HDBK charts", "DOE-HDBK-1092-2013 appendix D, capacitor charts; columns and steps", Memory}
	citeBench      = citation{"bench practice", "bench practice", CommonPractice}
)

// labManual is the manual whose tables were read.
const (
	labName   = "Lawrence Berkeley National Laboratory"
	labManual = labName + ", Electrical Safety Manual, "
)

// residualSeconds is the time in which machines and drives fall to TouchVolts without a label, IEC 60204-1 6.2.4,
// second-hand, and IEC 61800-5-1, from memory.
const residualSeconds = 5.0

// exemptMachine is the charge up to which a part of a machine needs no discharge, IEC 60204-1 6.2.4, second-hand; the
// one of drives, smallCoulombs, is lower.
const exemptMachine = 60e-6

// The levels of the thresholds by the voltage of a store.
func everywhere(level float64) func(float64) float64 { return func(float64) float64 { return level } }

func aboveVolts(volt, level float64) func(float64) float64 {
	return func(v float64) float64 { return reaching(v > volt, level) }
}

func fromVolts(volt, level float64) func(float64) float64 {
	return func(v float64) float64 { return reaching(v >= volt, level) }
}

func belowVolts(volt, level float64) func(float64) float64 {
	return func(v float64) float64 { return reaching(v < volt, level) }
}

func reaching(reaches bool, level float64) float64 {
	if reaches {
		return level
	}
	return math.Inf(1)
}

// chart is one column of the handbook's capacitor charts: the energies in joules from which each class begins. Both the
// columns and the steps are from memory; the lines of 100 J below 100 V and of 10 J from 100 V agree with tables read.
type chart struct {
	reaches func(volt float64) bool
	steps   []chartStep // the lowest first; below it there is no class
}

type chartStep struct {
	joule float64
	class string
}

var handbook = []chart{
	{func(v float64) bool { return v < 100 }, []chartStep{{100, "low"}, {1e3, "burn and arc"}}},
	{func(v float64) bool { return v >= 100 && v <= 400 }, []chartStep{{1, "low"}, {10, "moderate"}, {1e3, "high"}, {10e3, "very high"}}},
	{func(v float64) bool { return v > 400 }, []chartStep{{0.25, "low"}, {1, "moderate"}, {10, "high"}, {1e3, "very high"}, {10e3, "extreme"}}},
}

// first is the energy from which a column of the charts names a class.
func (c chart) first(volt float64) float64 { return reaching(c.reaches(volt), c.steps[0].joule) }

// text lists the steps of a column: "1 J low, 10 J moderate".
func (c chart) text() string {
	var steps string
	for i, s := range c.steps {
		if i > 0 {
			steps += ", "
		}
		steps += inJoules(s.joule) + " " + s.class
	}
	return steps
}

// classAt gives the handbook's class of a store, "none" below its first step.
func classAt(volt, joule float64) string {
	class := "none"
	for _, c := range handbook {
		for _, s := range c.steps {
			if c.reaches(volt) && joule >= s.joule {
				class = s.class
			}
		}
	}
	return class
}

// article360Level is the line of NFPA 70E 360.3 from 100 V on, from memory; what it says below 100 V is a burn.
func article360Level(v float64) float64 {
	if v > 400 {
		return 0.25
	}
	return reaching(v >= 100, 1)
}

// thresholds is the one table of every source's line; limits and cautions both follow it. The order is that of the
// screen: by hazard, within a hazard the lowest first.
var thresholds = []threshold{
	{"us-live", HazardTouch, inVolts(LiveVolts) + ", work", "from when parts must be de-energised before work, US; below it only where no burn or arc adds to it", citeOsha, byVolt, everywhere(LiveVolts), false},
	{"machine-voltage", HazardTouch, inVolts(TouchVolts) + " in " + seconds(residualSeconds) + ", machine", "what a machine must fall to after switching off, else a label names the waiting time", citeMachines, byVolt, everywhere(TouchVolts), true},
	{"drive-voltage", HazardTouch, inVolts(TouchVolts) + " in " + seconds(residualSeconds) + ", drive", "what a drive must fall to after disconnection, else a label names the waiting time", citeDrives, byVolt, everywhere(TouchVolts), true},
	{"plug-voltage", HazardTouch, inVolts(TouchVolts) + " in 1 s, plug", "what the bare pins of a pulled plug must fall to, else they are covered", citeMachines, byVolt, everywhere(TouchVolts), true},
	{"vehicle-voltage", HazardTouch, "60 V DC, vehicle", "from when a vehicle's circuit counts as high voltage (class B)", citeVehicles, byVolt, everywhere(60), true},
	{"lab-voltage", HazardTouch, "100 V and 40 mA, lab", "from when a laboratory plans against shock by DC", citeLabShock, byVolt, everywhere(100), false},
	{"lab-section-voltage", HazardTouch, "100 V and 40 mA, lab", "from when laboratory work counts as a shock hazard, DC", citeLaboratory, byVolt, everywhere(100), false},
	{"lab-battery-voltage", HazardTouch, "100 V, battery", "from when a laboratory plans against shock by batteries", citeLabShock, byBattery, everywhere(100), false},

	{"vehicle-ac", HazardTouchAC, "30 V AC", "from when a vehicle's circuit counts as high voltage (class B)", citeVehicles, byAC, everywhere(30), true},
	{"workplace-ac", HazardTouchAC, "50 V AC", "from when AC counts as a shock hazard at work", citeWorkplace, byAC, everywhere(50), false},
	{"lab-section-ac", HazardTouchAC, "50 V and 5 mA AC", "from when laboratory work counts as a shock hazard, AC", citeLaboratory, byAC, everywhere(50), false},

	{"drive-charge", HazardCharge, inMicro(smallCoulombs) + " above 60 V", "the charge from which a drive must discharge a part or carry a label", citeDrives, byCharge, aboveVolts(TouchVolts, smallCoulombs), false},
	{"machine-charge", HazardCharge, inMicro(exemptMachine) + " above 60 V", "the charge above which a machine must discharge a part or carry a label", citeMachines, byCharge, aboveVolts(TouchVolts, exemptMachine), true},

	{"vehicle-crash", HazardEnergy, "0.2 J above 60 V", "what a high-voltage bus may hold after a crash, so that it can be touched", citeCrashed, byEnergy, aboveVolts(60, 0.2), false},
	{"reflex", HazardEnergy, "0.25 J above 400 V", "from when a capacitor makes one jerk by reflex, and fall or hit something", citeReflex, byEnergy, aboveVolts(400, 0.25), true},
	{"article-360", HazardEnergy, "1 J from 100 V, 0.25 J above 400 V", "from when a capacitor counts as hazardous at work", citeArticle360, byEnergy, article360Level, false},
	{"lab-shock", HazardEnergy, "100 V and 10 J", "from when a laboratory plans against shock by capacitors", citeLabShock, byEnergy, fromVolts(100, 10), false},

	{"class-low", HazardClass, "below 100 V: " + handbook[0].text(), "how severe a capacitor's hazard is", citeCharts, byEnergy, handbook[0].first, false},
	{"class-middle", HazardClass, "100 to 400 V: " + handbook[1].text(), "how severe a capacitor's hazard is", citeCharts, byEnergy, handbook[1].first, false},
	{"class-high", HazardClass, "above 400 V: " + handbook[2].text(), "how severe a capacitor's hazard is; under its first step the reflex alone", citeCharts, byEnergy, handbook[2].first, false},

	{"lab-burn", HazardBurn, "> 100 J below 100 V", "from when a laboratory plans against burns by capacitors", citeLabBurn, byEnergy, belowVolts(100, 100), true},
	{"article-360-burn", HazardBurn, "100 J below 100 V", "from when a capacitor counts as hazardous at work", citeArticle360, byEnergy, belowVolts(100, 100), false},
	{"lab-battery-burn", HazardBurnSource, "> 1000 W below 100 V", "from when a laboratory plans against burns by batteries", citeLabBurn, bySource, belowVolts(100, 1000), true},

	{"lab-arc", HazardArc, "100 V and 10 kJ", "from when a capacitor's arc is work for a qualified person", citeLabArc, byEnergy, fromVolts(100, 10e3), false},
	{"lab-arc-source", HazardArcSource, "100 V and 500 A", "from when the arc of a battery or another DC source is work for a qualified person", citeLabArc, bySource, fromVolts(100, 500), false},
	{"noise", HazardNoise, "100 J", "from when a dead short of the bank asks for hearing protection", citeAnnexR, byTotal, everywhere(100), false},
	{"meter", HazardMeter, "> " + inVolts(DeadVolts) + ", DC or AC", "from when no ohmmeter may be connected; the limit of this program", citeBench, byVolt, everywhere(DeadVolts), true},
}

func inVolts(v float64) string { return format(v, quantity.Volt) }

// inJoules prints an energy as the sources write it: "0.25 J", "10 kJ".
func inJoules(j float64) string {
	if j < 1 {
		return fmt.Sprintf("%g J", j)
	}
	return format(j, quantity.Joule)
}

func inMicro(coulomb float64) string { return fmt.Sprintf("%g µC", coulomb*1e6) }
