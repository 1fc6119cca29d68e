package reports

import (
	"bytes"
	"encoding/json"
	"encoding/xml"
	"io"
	"regexp"
	"slices"
	"strings"
	"testing"
)

// shapes are the keys that other programs rely on, as paths; [] is an entry of a list.
var shapes = map[string][]string{
	"discharge.json": {"bus_v", "capacitance_f", "energy_j", "charge_c", "resistor_ohm", "peak_current_a", "peak_power_w", "time_to_60v_s", "time_to_50v_s", "time_to_5v_s", "stores[].point", "stores[].energy_j", "cautions[].id", "cautions[].text"},
	"rank.json": {"case", "setting", "causes[].id", "causes[].title", "causes[].role", "causes[].probability", "causes[].low", "causes[].high", "causes[].leads", "stresses[].id", "faults[].id", "faults[].parts", "faults[].parts[].part", "faults[].parts[].probability",
		"unlisted.probability", "unlisted.low", "unlisted.high", "fit", "unexplained[].test", "unexplained[].result", "unexplained[].db", "alike", "findings[].test", "findings[].result", "findings[].part", "findings[].source", "findings[].db", "findings[].alone_db", "findings[].assumed", "needs[].key", "needs[].for"},
	"next.json": {"case", "at", "tests[].id", "tests[].title", "tests[].part", "tests[].position", "tests[].value_min", "tests[].bits", "tests[].minutes", "tests[].needs", "tests[].allowed", "tests[].blocked_by", "tests[].unlocked_by", "stop"},
	"margin.json": {"case", "rated_v", "allowed_v", "as_found.network.kind", "as_found.nominal", "as_found.cut", "as_found.worst.peak_v", "as_found.worst.edge", "as_found.worst.position", "as_found.worst.corner", "as_found.p999.peak_v", "as_found.p999.samples", "as_found.avalanche", "as_found.clamp", "as_found.pump_up", "as_found.network_duty", "as_found.last_part", "as_found.measured", "as_found.short_circuit", "as_found.alike",
		"as_found.edges[].edge", "as_found.edges[].surge_a", "as_found.edges[].loss_w.switch", "rebuild.network_duty.capacitor_rms_a", "rebuild.network_duty.capacitor_peak_a", "rebuild.network_duty.capacitor_dvdt_v_per_s", "rebuild.network_duty.resistor_w", "rebuild.network_duty.discharge_a", "rebuild.network_duty.emptied_share",
		"as_found.verdict", "as_found.lifted_by", "as_found.rests_on_assumed",
		"rebuild.network.capacitance_f", "rebuild.network.resistance_ohm", "rebuild.nominal.edge", "rebuild.nominal.position", "rebuild.nominal.peak_v", "rebuild.nominal.peak_time_s", "rebuild.nominal.dvdt_v_per_s", "rebuild.nominal.ring_hz", "rebuild.nominal.damping_ratio", "rebuild.nominal.energy_j.switch",
		"stresses", "assumed[].key", "assumed[].value", "assumed[].unit", "assumed[].why", "needs[].key", "needs[].for"},
}

// jobShapes are the keys of the whole job's outputs.
var jobShapes = map[string][]string{
	"job-status.json": {"case", "at", "answers", "dead", "alarms", "isolation.isolated", "isolation.since", "isolation.stated_at", "isolation.age_s", "isolation.energised", "isolation.missing", "link.fitted", "link.since", "link.removed",
		"points[].point", "points[].dead", "points[].dc_v", "points[].ac_v", "points[].meter_proved", "points[].at", "points[].age_s", "points[].expires_at", "points[].missing[].hold_point", "unplaced", "outcome",
		"works[].need", "works[].tool", "works[].title", "works[].allowed", "works[].missing[].hold_point", "works[].missing[].text", "works[].missing[].unlock",
		"record[].step", "record[].phase", "record[].result", "record[].at", "record[].settled", "record[].due", "record[].missing", "outside[].observation", "open[].test", "open[].title", "open[].why", "needs[].key", "needs[].for", "stated", "assumed"},
	"job-next.json": {"tests[].tool", "tests[].carries", "tests[].serves", "tests[].again", "tests[].needs", "tests[].blocked_by"},
	"job-report.json": {"finding", "finding_stated", "repairs[].part", "repairs[].done", "repairs[].work", "repairs[].was", "repairs[].fitted", "repairs[].because", "fault_log[].code", "fault_log[].count", "settings[].name", "settings[].value",
		"photographs[].path", "photographs[].sha256", "captures[].name", "captures[].bytes", "captures[].sha256", "captures[].figures.peak.value", "captures[].figures.peak.unit", "steps[].step", "steps[].result", "steps[].at", "steps[].by",
		"record[].step", "record[].due", "conditions[].step", "conditions[].at", "conditions[].fuse_a", "conditions[].second_person", "conditions[].probe", "conditions[].earth_clips", "observations[].shown", "observations[].lower_bound"},
}

func TestShapes(t *testing.T) {
	checkShapes(t, frozen(t), pages[:9], shapes)
	checkShapes(t, job(t), jobWriters(t), jobShapes)
}

func checkShapes(t *testing.T, r Report, outputs []output, shapes map[string][]string) {
	for _, o := range outputs {
		if !strings.HasSuffix(o.name, ".json") {
			continue
		}
		text := rendered(t, o, r, Style{})
		var v any
		if err := json.Unmarshal([]byte(text), &v); err != nil {
			t.Errorf("%s: %v", o.name, err)
			continue
		}
		if !strings.HasPrefix(text, "{\n  \"") {
			t.Errorf("%s is not one object indented by two blanks", o.name)
		}
		snakeCase(t, o.name, v)
		for _, path := range shapes[o.name] {
			if !has(v, strings.Split(path, ".")) {
				t.Errorf("%s lacks %s", o.name, path)
			}
		}
	}
}

func has(v any, path []string) bool {
	if len(path) == 0 {
		return true
	}
	name, inList := strings.CutSuffix(path[0], "[]")
	m, ok := v.(map[string]any)
	if !ok {
		return false
	}
	inner, ok := m[name]
	if !ok || !inList {
		return ok && has(inner, path[1:])
	}
	for _, x := range inner.([]any) {
		if has(x, path[1:]) {
			return true
		}
	}
	return false
}

var snake = regexp.MustCompile(`^[a-z][a-z0-9]*(_[a-z0-9]+)*$`)

// snakeCase checks every key but those below corner, energy_j, loss_w and the like, which are keys of the board.
func snakeCase(t *testing.T, at string, v any) {
	switch v := v.(type) {
	case map[string]any:
		for k, inner := range v {
			if !snake.MatchString(k) {
				t.Errorf("%s: key %q is not snake case", at, k)
			}
			if k != "corner" && k != "energy_j" && k != "loss_w" {
				snakeCase(t, at+"."+k, inner)
			}
		}
	case []any:
		for _, inner := range v {
			snakeCase(t, at, inner)
		}
	}
}

// TestNoNumberIsNull proves that what is no finite number becomes null, and that no writer trips over it.
func TestNoNumberIsNull(t *testing.T) {
	r := broken(frozen(t))
	for _, o := range append(append([]output(nil), terminal...), pages[:11]...) {
		text := rendered(t, o, r, Style{})
		if strings.Contains(text, "NaN") || strings.Contains(text, "Inf") {
			t.Errorf("%s shows a number that is none", o.name)
		}
	}
	var rank struct {
		Causes []struct {
			Probability *float64 `json:"probability"`
		} `json:"causes"`
	}
	if err := json.Unmarshal([]byte(rendered(t, pages[0], r, Style{})), &rank); err != nil || rank.Causes[0].Probability != nil {
		t.Errorf("probability %v, %v; want null", rank.Causes[0].Probability, err)
	}
}

func TestNumbers(t *testing.T) {
	for _, c := range []struct {
		in   float64
		want string
	}{{0.1 + 0.2, "0.3"}, {1.0 / 3, "0.333333333"}, {-1e-300 * 1e-300, "0"}, {1234567890123, "1234567890000"}, {2.2e-8, "2.2e-8"}} {
		got, err := json.Marshal(num(c.in))
		if err != nil || string(got) != c.want {
			t.Errorf("num(%v) = %s, %v; want %s", c.in, got, err, c.want)
		}
	}
}

// loaders are the elements and attributes that make a browser fetch or run something.
var (
	loadingElements   = strings.Fields("script link img iframe object embed base form video audio source use image frame applet")
	loadingAttributes = strings.Fields("src srcset action poster data formaction background ping manifest")
	loadingStyle      = regexp.MustCompile(`(?i)@import|url\(|expression\(|//`)
)

func TestPageLoadsNothing(t *testing.T) {
	for name, r := range map[string]Report{"frozen": frozen(t), "real": pump(t), "hostile": hostile(t)} {
		html := rendered(t, pages[10], r, Style{})
		d := xml.NewDecoder(strings.NewReader(strings.Replace(html, "<!DOCTYPE html>", "", 1)))
		d.Entity = xml.HTMLEntity
		ids, inStyle := map[string]bool{}, false
		for {
			token, err := d.Token()
			if err == io.EOF {
				break
			}
			if err != nil {
				t.Errorf("%s: the page is not well formed: %v", name, err)
				break
			}
			switch token := token.(type) {
			case xml.StartElement:
				checkElement(t, name, token, ids)
				inStyle = token.Name.Local == "style"
			case xml.CharData:
				if inStyle && loadingStyle.Match(token) {
					t.Errorf("%s: the style sheet loads something", name)
				}
			case xml.EndElement:
				inStyle = false
			}
		}
	}
}

func checkElement(t *testing.T, page string, e xml.StartElement, ids map[string]bool) {
	t.Helper()
	if slices.Contains(loadingElements, e.Name.Local) {
		t.Errorf("%s: <%s> loads something", page, e.Name.Local)
	}
	for _, a := range e.Attr {
		name := a.Name.Local
		switch {
		case name == "id" && ids[a.Value]:
			t.Errorf("%s: the id %s stands twice", page, a.Value)
		case name == "href" && !strings.HasPrefix(a.Value, "#"), slices.Contains(loadingAttributes, name), strings.HasPrefix(name, "on"), name == "style" && loadingStyle.MatchString(a.Value):
			t.Errorf("%s: <%s %s=%q> loads or runs something", page, e.Name.Local, name, a.Value)
		}
		if name == "id" {
			ids[a.Value] = true
		}
	}
}

// TestPageIsAccessible checks language, captions, headings of rows and columns, and words for the figure.
func TestPageIsAccessible(t *testing.T) {
	html := rendered(t, pages[10], frozen(t), Style{})
	for _, want := range []string{`<html lang="en">`, `<title>`, `name="viewport"`, `@page { size: A4`, `role="img" aria-labelledby="edge-title edge-text"`, `<desc id="edge-text">`, "<h1>"} {
		if !strings.Contains(html, want) {
			t.Errorf("the page lacks %s", want)
		}
	}
	if a, b := strings.Count(html, "<table"), strings.Count(html, "<caption>"); a != b || a == 0 {
		t.Errorf("%d tables, %d captions", a, b)
	}
	if strings.Count(html, `scope="col"`) == 0 || strings.Count(html, `scope="row"`) == 0 {
		t.Error("a table lacks the headings of its rows or columns")
	}
	if len(html) > 200e3 {
		t.Errorf("the page is %d bytes", len(html))
	}
}

// TestFirstPage checks that the first page says what it must, before the contents.
func TestFirstPage(t *testing.T) {
	r := frozen(t)
	first, _, _ := strings.Cut(rendered(t, pages[10], r, Style{}), "<nav")
	for _, want := range []string{"REPAIR HELD 30 DAYS", "THE ONE CHANGE WE ASK FOR", "Fit a snubber or clamp", "What is broken?", "What killed it?", "What let that happen?", "not excluded", "also likely broken", "The test that decides", "not the chance of being right", "THIN", "outside a hold point", "12"} {
		if !strings.Contains(first, want) {
			t.Errorf("the first page lacks %q", want)
		}
	}
	for by, want := range map[string]string{"reproduced": "REPRODUCED", "plausible": "INFERRED", "": "INFERRED", "held-30-days": "REPAIR HELD 30 DAYS"} {
		o := *r.Case.Outcome
		o.ConfirmedBy = by
		r.Case.Outcome = &o
		if text := rendered(t, pages[9], r, Style{}); !strings.Contains(text, "**"+want+".**") {
			t.Errorf("confirmed by %q does not read %s", by, want)
		}
	}
}

// TestFigureGuards draws what must not be drawn.
func TestFigureGuards(t *testing.T) {
	for name, spoil := range map[string]func(r *Report){
		"no margin":   func(r *Report) { r.Margin = nil },
		"no edges":    func(r *Report) { r.Margin.AsFound, r.Margin.Rebuild = nil, nil },
		"no samples":  func(r *Report) { r.Margin.AsFound.Highest.Waveform, r.Margin.Rebuild.Highest.Waveform = nil, nil },
		"no rating":   func(r *Report) { r.Margin.Rated = 0 },
		"not numbers": func(r *Report) { *r = broken(*r); r.Margin.Rebuild = nil },
	} {
		r := frozen(t)
		spoil(&r)
		var b bytes.Buffer
		if err := FigureSVG(&b, r.Margin); err == nil || b.Len() > 0 {
			t.Errorf("%s: drew %d bytes, error %v", name, b.Len(), err)
		}
	}
	svg := rendered(t, pages[11], frozen(t), Style{})
	if strings.Contains(svg, "Liberation") || strings.Contains(svg, "xlink") || strings.Contains(svg, "base64") {
		t.Error("the figure names a font or loads something")
	}
	if strings.Count(svg, "stroke-dasharray") < 3 {
		t.Error("the lines of the figure differ by color only")
	}
	if err := xml.Unmarshal([]byte(svg), new(struct{ XMLName xml.Name })); err != nil {
		t.Errorf("the figure is not well formed: %v", err)
	}
}
