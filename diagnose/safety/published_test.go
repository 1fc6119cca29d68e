package safety

import (
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// published is a row of testdata/published/discharge.csv.
type published struct {
	id, mark, status, check, printed, source string
	in                                       map[string]float64
	factor                                   float64
}

func publishedRows(t *testing.T) []published {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "published", "discharge.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	lines, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(lines[0], ","); got != "id,mark,status,check,inputs,printed,factor,source,note" {
		t.Fatalf("columns are %s", got)
	}
	var rows []published
	for _, l := range lines[1:] {
		p := published{id: l[0], mark: l[1], status: l[2], check: l[3], printed: l[5], source: l[7], in: map[string]float64{}, factor: number(t, l[6])}
		for _, word := range strings.Fields(l[4]) {
			key, value, _ := strings.Cut(word, "=")
			p.in[key] = number(t, value)
		}
		rows = append(rows, p)
	}
	return rows
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// checks compute what a row prints, through the plan where the plan holds the figure.
var checks = map[string]func(p *Plan, in map[string]float64) float64{
	"energy":                func(p *Plan, _ map[string]float64) float64 { return p.EnergyJ },
	"charge":                func(p *Plan, _ map[string]float64) float64 { return p.ChargeC },
	"above lab-shock":       func(p *Plan, _ map[string]float64) float64 { return one(p.limit("lab-shock").Above) },
	"capacitance of energy": func(_ *Plan, in map[string]float64) float64 { return in["E"] / Energy(1, in["V"]) },
	"capacitance of charge": func(_ *Plan, in map[string]float64) float64 { return in["Q"] / Charge(1, in["V"]) },
	"time": func(p *Plan, in map[string]float64) float64 {
		return map[float64]float64{TouchVolts: p.Nominal.To60V, LiveVolts: p.Nominal.To50V, DeadVolts: p.Nominal.To5V}[in["to"]]
	},
	"peak current":       func(p *Plan, _ map[string]float64) float64 { return p.PeakCurrentA },
	"peak power":         func(p *Plan, _ map[string]float64) float64 { return p.PeakPowerW },
	"bleeder resistance": func(_ *Plan, in map[string]float64) float64 { r, _ := bleederRow(in); return r },
	"bleeder power":      func(_ *Plan, in map[string]float64) float64 { _, w := bleederRow(in); return w },
	"recovery low":       func(p *Plan, _ map[string]float64) float64 { return p.Recovery.LowV },
	"recovery high":      func(p *Plan, _ map[string]float64) float64 { return p.Recovery.HighV },
	"recovery days low":  func(p *Plan, _ map[string]float64) float64 { return p.Recovery.DaysLow },
	"recovery days high": func(p *Plan, _ map[string]float64) float64 { return p.Recovery.DaysHigh },
	"recovery passes": func(p *Plan, in map[string]float64) float64 {
		return one(p.Recovery.LowV > in["to"] && (in["to"] == LiveVolts && p.Recovery.BackAbove50V || in["to"] == TouchVolts && p.Recovery.BackAbove60V))
	},
}

func one(is bool) float64 {
	if is {
		return 1
	}
	return 0
}

func bleederRow(in map[string]float64) (ohm, watt float64) {
	ohm, watt, err := BleederFor(in["C"], in["V"], in["to"], in["t"])
	if err != nil {
		return math.NaN(), math.NaN()
	}
	return ohm, watt
}

// Every published example holds to its printed digits; a label time that names no board is kept as a fact.
func TestPublishedDischarges(t *testing.T) {
	seen, computed := map[string]bool{}, map[string]bool{}
	for _, row := range publishedRows(t) {
		if seen[row.id] || row.source == "" || (row.mark != "derived" && row.mark != "read" && row.mark != "memory") {
			t.Errorf("%s: twice, without a source, or of unknown mark %q", row.id, row.mark)
		}
		seen[row.id] = true
		if row.status == "fact" {
			if row.check != "" || !(number(t, row.printed) > 0) {
				t.Errorf("%s: a fact is a time that is not computed", row.id)
			}
			continue
		}
		check := checks[row.check]
		if row.status != "agrees" || check == nil {
			t.Errorf("%s: unknown status %q or check %q", row.id, row.status, row.check)
			continue
		}
		computed[row.check] = true
		agrees(t, row, check(planOf(t, row.in), row.in))
	}
	for name := range checks {
		if !computed[name] {
			t.Errorf("no row checks the %s", name)
		}
	}
}

// planOf plans a row with its capacitance as marked and nothing on top.
func planOf(t *testing.T, in map[string]float64) *Plan {
	t.Helper()
	c := in["C"]
	if c == 0 {
		c = 1e-3
	}
	p, err := Discharge(Input{BusV: in["V"], CapacitanceF: c, HighestF: c * (1 + 1e-12), ResistorOhm: in["R"]})
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// agrees asks a value to round to the printed digits.
func agrees(t *testing.T, row published, value float64) {
	t.Helper()
	decimals := 0
	if _, after, ok := strings.Cut(row.printed, "."); ok {
		decimals = len(after)
	}
	half := 0.5 * math.Pow(10, -float64(decimals))
	want := number(t, row.printed)
	if got := value / row.factor; !(math.Abs(got-want) <= half*(1+1e-9)) {
		t.Errorf("%s: got %.6g, printed %s (%s)", row.id, got, row.printed, row.source)
	}
}
