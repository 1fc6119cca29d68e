package reports

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/stress"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// percent prints a probability: never 0 or 100 for what is only nearly so.
func percent(p float64) string {
	switch {
	case math.IsNaN(p):
		return "?"
	case p == 0 || p == 1:
	case p <= 0.005:
		return "<1 %"
	case p >= 0.995:
		return ">99 %"
	}
	return fmt.Sprintf("%.0f %%", 100*p)
}

// decibans prints a weight of evidence with its sign.
func decibans(x float64) string {
	if math.IsNaN(x) {
		return "?"
	}
	if math.IsInf(x, 0) || math.Abs(x) >= 999.95 {
		return map[bool]string{true: "> +999", false: "< -999"}[x > 0]
	}
	text := fmt.Sprintf("%+.1f", x)
	if text == "-0.0" {
		return "+0.0"
	}
	return text
}

// oddsOf scales a probability to decibans.
func oddsOf(p float64) float64 { return 10 * math.Log10(p/(1-p)) }

func moment(t time.Time) string {
	if t.IsZero() {
		return "no time stated"
	}
	return t.Format("2006-01-02 15:04 -07:00")
}

func day(t time.Time) string {
	if t.IsZero() {
		return "not stated"
	}
	return t.Format("2006-01-02")
}

func volts(x float64) string { return quantity.Format(x, quantity.Volt) }

// seconds prints a waiting time in whole seconds, rounded up so that nobody waits too short.
func seconds(x float64) string {
	if x > 0 && x < 1 {
		return "1 s"
	}
	return quantity.Format(math.Ceil(x), quantity.Second)
}

// between is a value with its interval: "10 µH (3.333 µH to 30 µH)".
func between(q quantity.Quantity) string {
	text := quantity.Format(q.Value, q.Unit)
	if !q.Exact() {
		text += " (" + quantity.Format(q.Low, q.Unit) + " to " + quantity.Format(q.High, q.Unit) + ")"
	}
	return text
}

// moves is how far a value moves the peak, in whole volts.
func moves(x float64) string {
	if x < 0.5 {
		return "<1 V"
	}
	return volts(math.Round(x))
}

func mins(x float64) string { return strconv.FormatFloat(math.Round(x), 'f', -1, 64) + " min" }

func count(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return strconv.Itoa(n) + " " + many
}

// boardLine is the board in a few words: "low-side chopper, 3 IGBTs in parallel".
func boardLine(b measure.Board) string {
	var parts []string
	if t, ok := b.Word("topology"); ok {
		if t == "other" {
			t = "other topology"
		}
		parts = append(parts, strings.Replace(t, "-chopper", " chopper", 1))
	}
	kind, _ := b.Word("switch.kind")
	name, ok := kindNames[kind]
	if !ok {
		name = "switch of unknown kind"
	}
	if q, stated := b.Quantity("positions.parallel"); stated && q.Value > 1 {
		name = quantity.Format(q.Value, quantity.Count) + " " + strings.Replace(name, "switch", "switches", 1)
		if ok {
			name += "s"
		}
		name += " in parallel"
	}
	return strings.Join(append(parts, name), ", ")
}

var kindNames = map[string]string{"igbt": "IGBT", "mosfet": "MOSFET", "sic-mosfet": "SiC MOSFET", "bipolar": "bipolar transistor"}

// place names where an observation was made.
func place(part, position string) string {
	switch {
	case part != "" && position != "":
		return part + " (" + position + ")"
	case part != "":
		return part
	case position != "":
		return position
	}
	return "board"
}

// shown is an observation's answer as it was entered.
func shown(o measure.Observation) string {
	text := o.Result
	if o.Reading != nil {
		text = written(*o.Reading)
	}
	if o.Answer != "" {
		text = o.Answer
	}
	if o.Twin != nil {
		text += " (its twin " + written(*o.Twin) + ")"
	}
	return text
}

func written(r quantity.Reading) string {
	if r.Text != "" {
		return r.Text
	}
	return r.String()
}

// seen says in words who saw it, and when.
func seen(s string) string {
	switch s {
	case "on-arrival":
		return "told on arrival"
	case "by-cure":
		return "known from the cure"
	}
	return "at the bench"
}

// verdictTone gives the tone of a verdict; its word stands beside it.
func verdictTone(v stress.Verdict) tone {
	switch v {
	case stress.Within:
		return normal
	case stress.Thin, stress.Bare:
		return caution
	case stress.OverIt:
		return danger
	}
	return neutral
}

// verdictWords says what a verdict means.
func verdictWords(v stress.Verdict) string {
	switch v {
	case stress.Within:
		return "WITHIN: at most 80 % of the rating"
	case stress.Thin:
		return "THIN: close to the rating, or not sure enough to be called within"
	case stress.Bare:
		return "BARE: between 91 % and all of the rating"
	case stress.OverIt:
		return "OVER: above the rating"
	}
	return "NOT KNOWN"
}

// networkWords is a network with its parts: "RCD 27 Ω, 22 nF".
func networkWords(n stress.Network) string {
	if n.Kind == "none" || n.Kind == "" {
		return "no network"
	}
	text := n.Kind
	if strings.HasPrefix(text, "rc") {
		text = strings.ToUpper(text)
	}
	for i, p := range n.Parts {
		if i == 0 {
			text += " "
		} else {
			text += ", "
		}
		text += p.Value.String()
	}
	return text
}

func lineOf(r *diagnose.Ranking, id string) (diagnose.Line, bool) {
	if r == nil {
		return diagnose.Line{}, false
	}
	for _, lines := range [][]diagnose.Line{r.Causes, r.Stresses, r.Faults} {
		for _, l := range lines {
			if l.ID == id {
				return l, true
			}
		}
	}
	return diagnose.Line{}, false
}

func priorOf(r *diagnose.Ranking, id string) (float64, bool) {
	for _, l := range r.Prior {
		if l.ID == id {
			return l.Probability, true
		}
	}
	return 0, false
}

func byChance(parts []diagnose.PartChance) []diagnose.PartChance {
	out := append([]diagnose.PartChance(nil), parts...)
	for i := 1; i < len(out); i++ {
		for k := i; k > 0 && out[k].Probability > out[k-1].Probability; k-- {
			out[k], out[k-1] = out[k-1], out[k]
		}
	}
	return out
}

// belief is what the percentages are, said wherever they are shown.
const belief = "The percentages are the rule base's own belief (judgements), not the chance of being right."

// beliefShort is belief for a screen.
const beliefShort = "Percentages: the rule base's own belief, not the chance of being right."
