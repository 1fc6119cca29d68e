package reports

import (
	"io"
	"regexp"
	"strings"
	"testing"
	"unicode"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// evil are texts that a case file may hold and a page must survive.
var evil = []string{
	`<script>alert(1)</script>`, "\x1b[2J\x1b[31mred\x1b[0m \u009b31m", "a | b || c", "`code` **bold** [x](http://evil.example/x) ![i](//evil.example/i.png)",
	"\u202eright to left override\u202c \u2066isolate\u2069", "שלום عليكم", "😀👩\u200d🔧🔥", "\x00\x07\r\nline\u2028two\tthree", "</title><img src=x onerror=alert(1)>", "' onmouseover='x", "www.evil.example a@b.example",
	"\xff\xfe not UTF-8", "# heading", "- item", "12. item", "--- x", strings.Repeat("w", 300),
}

// hostile is the frozen report with every text that comes from outside replaced.
func hostile(t *testing.T) Report {
	t.Helper()
	r := frozen(t)
	all := strings.Join(evil, " ")
	c := *r.Case
	c.ID, c.Owner, c.Technician, c.Serial, c.Firmware = all, evil[0], evil[1], evil[2], evil[3]
	c.Story = all + strings.Repeat(" long title", 1000)
	c.Board = c.Board.WithWord("title", strings.Repeat(all, 20))
	c.Observations = append(c.Observations[:0:0], c.Observations...)
	for i := range c.Observations {
		c.Observations[i].Test, c.Observations[i].Part, c.Observations[i].Note = all, evil[i%len(evil)], all
	}
	c.Observations[1].Reading = &quantity.Reading{Kind: quantity.Word, Text: all}
	c.Source.Title = all
	hostileRecord(&c, all)
	r.Case = &c
	r.Record = frozenRecord(&c)
	r.Base = frozenBase()
	for i := range r.Base.Causes {
		r.Base.Causes[i].Title = all
	}
	r.Base.Tests[1].Title, r.Base.Tests[1].Ask, r.Base.Tests[1].How = all, all, all
	r.Base.Sources[0].Title, r.Base.Repairs[0].Title = all, all
	r.Ranking, r.Next = frozenRanking(r.Base), frozenNext(r.Base)
	r.Ranking.Causes[0].Title, r.Ranking.Case = all, all
	r.Ranking.Faults[0].Parts = []diagnose.PartChance{{Part: all, Probability: 0.5}}
	r.Ranking.Findings[0].Shown, r.Ranking.Findings[0].Part = all, all
	r.Margin.Case = all
	r.OutsideSteps = []OutsideStep{{0, []safety.Missing{{Point: 3, Text: all + "; " + all + "; " + all, Unlock: all}}}}
	return r
}

// hostileRecord fills every text of the record that comes from outside.
func hostileRecord(c *measure.Case, all string) {
	c.Repairs = []measure.Repair{{Part: all, Position: all, By: all, Work: all, Was: all, Fitted: all, Because: all, Note: all}}
	c.FaultLog = []measure.FaultCode{{Code: all, Text: all, At: all, Note: all, Count: 3}}
	c.Settings = []measure.Setting{{Name: all, Value: all, Note: all}}
	c.Photographs = []measure.Photograph{{Path: all, Shows: all, Part: all, SHA256: all}, {Path: "javascript:alert(1)"}, {Path: "../../x\" onerror=\"y"}}
	c.Captures = []measure.Capture{{Name: all, SHA256: all, Kind: all, Position: all, Edge: all, Note: all, Figures: map[string]quantity.Quantity{all: {Unit: quantity.Volt, Text: all}}}}
	c.Steps = []measure.StepEntry{{Step: measure.StepPhotographed, Result: all, By: all, Note: all, At: testTime}, {Step: measure.StepMotorTested, Result: "failed", By: all, Note: all, At: testTime}}
	c.Safety.Before = []measure.Before{{Step: all, Motor: all, BrakeResistor: all, Bank: all, Probe: all, ClipOn: all, Supply: all, Note: all}, {Step: measure.BeforeScope, Probe: "earth-clip", ClipOn: all, Supply: all, At: testTime},
		{Step: measure.BeforeLowBus, Note: all, Fuse: quantity.Quantity{Unit: quantity.Ampere, Text: all}, At: testTime}}
}

// hostileBench are the outputs of the bench that the record and the conditions reach, each on hostile text.
func hostileBench(t *testing.T) []output {
	all := strings.Join(evil, " ")
	n, _ := underPower(t)
	n.Tests[0].Again, n.Tests[1].Again = all, all
	n.Tests[1].BlockedBy, n.Tests[1].UnlockedBy = []string{all}, []string{all}
	page := halfway(t)
	page.Open = []OpenTest{{all, all, all}}
	page.Works[1].Title, page.Works[2].Decision.Missing = all, []safety.Missing{{Point: 1, Text: all, Unlock: all}}
	page.Safety.Alarms, page.Safety.Unplaced = []string{all}, []string{all}
	page.Needs[0].Key = all
	return []output{
		{"status", func(w io.Writer, r Report, s Style) error {
			page.Case, page.Record = r.Case, r.Record
			return Status(w, page, s)
		}},
		{"next", func(w io.Writer, r Report, s Style) error { return Next(w, r.Base, n, r.Discharge, s, r.beside()) }},
		{"status.json", func(w io.Writer, r Report, _ Style) error {
			page.Case, page.Record = r.Case, r.Record
			return StatusJSON(w, page)
		}},
		{"next.json", func(w io.Writer, r Report, _ Style) error { return NextJSON(w, n, r.beside()) }},
	}
}

func TestHostileTextFitsTheBench(t *testing.T) {
	r := hostile(t)
	for _, o := range hostileBench(t)[:2] {
		for _, width := range []int{40, 80, 132} {
			for i, line := range strings.Split(rendered(t, o, r, Style{Width: width}), "\n") {
				if n := columns(line); n > width {
					t.Errorf("%s, line %d takes %d of %d columns", o.name, i+1, n, width)
				}
			}
		}
	}
}

func TestHostileTextIsHarmless(t *testing.T) {
	r := hostile(t)
	for _, o := range append(append(hostileBench(t), terminal...), pages...) {
		text := rendered(t, o, r, Style{})
		for _, c := range text {
			if c != '\n' && unicode.IsControl(c) {
				t.Errorf("%s passes the control character %U", o.name, c)
				break
			}
			if strings.ContainsRune("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069\u2028\u2029", c) {
				t.Errorf("%s passes %U", o.name, c)
				break
			}
		}
	}
	html := rendered(t, output{"report.html", pages[10].write}, r, Style{})
	for _, bad := range []string{"<script", "<img", "onerror=alert(1)>", "' onmouseover='"} {
		if strings.Contains(html, bad) {
			t.Errorf("the page holds %q", bad)
		}
	}
	if !strings.Contains(html, "שלום عليكم") || !strings.Contains(html, "😀") {
		t.Error("ordinary right-to-left text or emoji is lost")
	}
}

func TestMarkdownKeepsItsTables(t *testing.T) {
	text := rendered(t, output{"report.md", pages[9].write}, hostile(t), Style{})
	want := 0
	for i, line := range strings.Split(text, "\n") {
		switch {
		case !strings.HasPrefix(line, "|"):
			want = 0
		case want == 0:
			want = strings.Count(line, "|")
		case strings.Count(line, "|") != want:
			t.Errorf("line %d has %d pipes, its table %d", i+1, strings.Count(line, "|"), want)
		}
		if strings.HasPrefix(line, "# ") && i > 0 || strings.HasPrefix(line, "- item") || strings.Contains(line, "<script") {
			t.Errorf("line %d: text from the case became markup: %.60s", i+1, line)
		}
	}
	if found := regexp.MustCompile(`[^\\][\[\]` + "`" + `]|[^\\*]\*\*\*|http://|www\.evil|a@b`).FindString(text); found != "" {
		t.Errorf("text from the case became markup: %q", found)
	}
}

func TestPrivateLeavesOutWhoAndWhich(t *testing.T) {
	r := frozen(t)
	r.Case.Owner, r.Case.Technician, r.Case.Serial, r.Case.Firmware = "OWNER-X", "TECH-X", "SERIAL-X", "FIRM-X"
	r.Case.Repairs = []measure.Repair{{Part: "Q2", By: "REPAIRER-X"}}
	r.Case.Steps = append(r.Case.Steps, measure.StepEntry{Step: measure.StepPhotographed, Result: "done", By: "WITNESS-X", At: testTime})
	r.Record = frozenRecord(r.Case)
	for _, private := range []bool{false, true} {
		r.Private = private
		for _, o := range pages[8:11] {
			text := rendered(t, o, r, Style{})
			for _, word := range []string{"OWNER-X", "TECH-X", "SERIAL-X", "FIRM-X", "REPAIRER-X", "WITNESS-X"} {
				if strings.Contains(text, word) == private {
					t.Errorf("%s, private %v: %s", o.name, private, word)
				}
			}
		}
	}
}

func FuzzPlain(f *testing.F) {
	for _, s := range evil {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		p := plain(text)
		for _, r := range p {
			if unicode.IsControl(r) {
				t.Fatalf("%q keeps %U", p, r)
			}
		}
		for _, most := range []int{1, 2, 8, 40} {
			for _, line := range fold(p, most) {
				if columns(line) > max(most, 2) {
					t.Fatalf("%q takes more than %d columns", line, most)
				}
			}
			if columns(fit(p, most)) > most {
				t.Fatalf("%q does not fit %d", fit(p, most), most)
			}
		}
		if strings.ContainsAny(escaped(text), "<>|") {
			t.Fatalf("%q is not harmless in Markdown", escaped(text))
		}
	})
}
