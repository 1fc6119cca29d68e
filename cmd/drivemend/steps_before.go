package main

import (
	"errors"
	"fmt"
	"strings"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// saidCondition is one condition with what was said of it.
type saidCondition struct {
	at   int // in conditions
	text string
}

// statement is the making of one statement of conditions. It is kept as one entry, once all is said.
type statement struct {
	*session
	word string
	work safety.Work
	now  time.Time // when it was begun: what is asked does not change while it is asked
}

// beforeStep asks the conditions of a step, one question each. They are asked only when nothing else stands against
// the work.
func (s *session) beforeStep(word string, w safety.Work) *step {
	return &step{"before " + word, func() (ask.Kind, error) {
		if !w.Need.Powered() && s.held() {
			return s.standStep().run()
		}
		st := &statement{s, word, w, s.clock()}
		if d := st.with(ideal(word, st.now)); !d.Allowed {
			return ask.Later, s.withheld("the conditions before "+word, d.Missing)
		}
		return st.begin()
	}}
}

// with tells how the work would stand on one form of this statement.
func (st *statement) with(b measure.Before) safety.Decision {
	return st.checkWith(st.work, st.now, append(ideals(st.work, st.now, st.word), b)...)
}

// begin asks first whether a statement of an earlier session still stands, where there is one that would do.
func (st *statement) begin() (ask.Kind, error) {
	last := st.lastStated()
	if last == nil || !st.checkWith(st.work, st.now, ideals(st.work, st.now, st.word)...).Allowed {
		return st.askAll()
	}
	answer, err := st.put(ask.Question{Title: st.title("do they still stand?"), Danger: true, Choices: yesNo,
		Lines: []string{"Stated at " + last.At.Format("15:04") + ": " + saidOf(*last) + ".",
			"Go and look at each of them now."},
		Ask: "Does all of it still stand? Type yes only if you have looked."})
	switch {
	case err != nil || answer.Kind != ask.Given:
		return answer.Kind, err
	case answer.Text == "yes":
		return st.state(*last)
	}
	return st.askAll()
}

// lastStated is the newest statement of this step, nil without one.
func (st *statement) lastStated() *measure.Before {
	var last *measure.Before
	all := st.file.Case.Safety.Before
	for i := range all {
		if all[i].Step == st.word && (last == nil || !all[i].At.Before(last.At)) {
			last = &all[i]
		}
	}
	return last
}

// askAll asks every condition that the hold points want.
func (st *statement) askAll() (ask.Kind, error) {
	var said []saidCondition
	for {
		b, best := st.sofar(said)
		at := st.next(said, best)
		if at < 0 {
			return st.state(b)
		}
		answer, err := st.put(st.question(at, len(said)+1))
		if err == nil && answer.Kind == ask.Back && len(said) > 0 {
			said = said[:len(said)-1]
			continue
		}
		if err != nil || answer.Kind != ask.Given {
			return st.broken(answer.Kind, len(said), err)
		}
		said = append(said, saidCondition{at, answer.Text})
		st.against(at, answer.Text, best)
	}
}

// sofar gives the statement as far as it was said, and the ideal one with whatever was said that the hold points bear.
func (st *statement) sofar(said []saidCondition) (b, best measure.Before) {
	b, best = measure.Before{Step: st.word}, ideal(st.word, st.now)
	for _, one := range said {
		b = put(b, one)
		if try := put(best, one); st.with(try).Allowed {
			best = try
		}
	}
	return b, best
}

// put gives a statement with one more condition in it; what was typed was checked when it was asked.
func put(b measure.Before, one saidCondition) measure.Before {
	_ = conditions[one.at].put(&b, inFlag(one.text))
	return b
}

// inFlag writes yes and no as the flag of a condition has them.
func inFlag(text string) string {
	switch text {
	case "yes":
		return "true"
	case "no":
		return "false"
	}
	return text
}

// next gives the condition that is asked next, -1 for none: one without which the hold points would not allow the work.
func (st *statement) next(said []saidCondition, best measure.Before) int {
	from := 0
	if len(said) > 0 {
		from = said[len(said)-1].at + 1
	}
	for i := from; i < len(conditions); i++ {
		without := best
		if conditions[i].silence(&without) && !st.with(without).Allowed {
			return i
		}
	}
	return -1
}

// silence takes a condition out of a statement; false for one that is never asked.
func (c condition) silence(b *measure.Before) bool {
	switch {
	case c.word != nil:
		*c.word(b) = ""
	case c.yes != nil:
		*c.yes(b) = false
	case c.flag == "fuse":
		b.Fuse = quantity.Quantity{}
	case c.flag == "earth-clips":
		b.EarthClips = 0
	default:
		return false
	}
	return true
}

// against says at once what stands against an answer.
func (st *statement) against(at int, text string, best measure.Before) {
	for _, m := range st.with(put(best, saidCondition{at, text})).Missing {
		st.say("! so it stays locked: " + m.Text)
	}
}

// question asks one condition. Only a whole word answers it.
func (st *statement) question(at, number int) ask.Question {
	c := conditions[at]
	words := conditionWords[c.flag]
	q := ask.Question{Title: st.title(fmt.Sprintf("%d, %s", number, strings.ReplaceAll(c.flag, "-", " "))), Ask: words.ask, Danger: true,
		Asides: []ask.Aside{st.text("why", "why this is asked", words.why)}}
	if number == 1 {
		q.Lines = st.opening()
	}
	switch k := c.key(); {
	case c.yes != nil:
		q.Choices, q.Ask = yesNo, q.Ask+" Type yes only if you have looked."
	case c.word != nil:
		for _, w := range k.Words {
			q.Choices = append(q.Choices, ask.Choice{Word: w, Means: words.means[w]})
		}
	default:
		q.Free, q.Check = words.free, func(text string) error { return c.refusal(text) }
	}
	if c.flag == "fuse" {
		q.Lines = append(q.Lines, st.fuseLine())
		q.Choices = []ask.Choice{{Word: "none", Means: "no fuse: the step stays locked"}}
	}
	return q
}

// opening stands above the first condition.
func (st *statement) opening() []string {
	lines := []string{"Nothing is switched on while this is asked. Look at each of them at the board. A half statement is not kept."}
	return append(append(lines, st.carried(st.work)...), st.joules()...)
}

// carried is what the instruction for a work always carries with it.
func (s *session) carried(w safety.Work) []string {
	var lines []string
	for _, text := range s.check(w).Carries {
		lines = append(lines, "! "+s.cautionText(text, text))
	}
	return lines
}

// fuseLine names the highest fuse of this step on this board, and why it is that.
func (st *statement) fuseLine() string {
	f := safety.FuseFor(st.built(), st.work.Need)
	return "At most " + quantity.Format(f.Value, f.Unit) + ": " + f.Because + "."
}

// built is the board as it stands now: the rebuilt one once the rebuild is done.
func (s *session) built() measure.Board {
	if s.isRebuilt() {
		return s.file.Case.Rebuild.Board
	}
	return s.file.Case.Board
}

func (st *statement) title(rest string) string {
	return "BEFORE " + strings.ToUpper(st.word) + ": " + rest
}

// refusal says what is wrong with what was typed for a condition.
func (c condition) refusal(text string) error {
	var b measure.Before
	var f *failure
	if err := c.put(&b, text); errors.As(err, &f) {
		return errors.New(strings.TrimPrefix(strings.TrimPrefix(f.message, "--"+c.flag), ": ") + "; " + strings.Join(f.hints, "; "))
	}
	return nil
}

// broken ends a statement that was not said in full.
func (st *statement) broken(kind ask.Kind, parts int, err error) (ask.Kind, error) {
	if parts > 0 {
		st.say("The conditions before " + st.word + " count only in full; these are not kept, and the step stays locked.")
	} else if kind != ask.Back {
		st.say("Without them the step stays locked.")
	}
	return kind, err
}

// state keeps a statement and says what it leaves locked.
func (st *statement) state(b measure.Before) (ask.Kind, error) {
	b.At = st.clock()
	ok, err := st.keep(func(f *measure.File) error { return f.StateBefore(b) })
	if err != nil || !ok {
		return ask.Later, err
	}
	now := st.clock()
	d := st.checkWith(st.work, now, ideals(st.work, now, st.word)...)
	if d.Allowed {
		st.say("Stated before " + st.word + " at " + b.At.Format("15:04") + ". It counts until the board is isolated anew; look again when anything was moved.")
		return ask.Given, nil
	}
	st.say("Kept, and the step stays locked:")
	for _, m := range d.Missing {
		st.say("! " + m.Text + ": " + m.Unlock)
	}
	return ask.Later, nil
}

// conditionWords are the questions of the conditions, in plain words, and why each is asked.
var conditionWords = map[string]struct {
	ask, why, free string
	means          map[string]string
}{
	"motor": {ask: "How is the motor kept from doing harm? Type the whole word.",
		why: "With a shorted switch the load has no electronic off: a motor can go to full speed as soon as power comes on.",
		means: map[string]string{"unplugged": "its cable is off the board", "uncoupled": "it can turn, and drives nothing",
			"wheels-up": "the driven wheels are off the ground", "connected": "it can move the machine"}},
	"brake-resistor": {ask: "Is the brake resistor connected? Type the whole word.",
		why: "With a shorted brake switch the resistor sits on the bus without limit and burns."},
	"guard":      {ask: "Does a guard stand between the board and everybody?", why: "A module or a capacitor that bursts throws metal and hot vapour."},
	"fuse":       {ask: "What is the rating of the fuse that is fitted for this step?", free: "amperes as printed on it, such as 2 A", why: "Only the fuse ends a short that nothing else switches off. On a bus it has to be rated for direct current."},
	"remote-off": {ask: "Can the supply be switched off from where you stand, without reaching over the board?", why: "When it goes wrong nobody reaches over it."},
	"glasses":    {ask: "Does everybody near wear safety glasses?", why: "Parts burst without warning."},
	"second-person": {ask: "Does somebody stand by who knows how to switch off?",
		why: "Who is held by a voltage cannot help himself."},
	"bank": {ask: "Were the bus capacitors at voltage within the last year, or re-formed since? Type the whole word.",
		why:   "Electrolytics that were stored for long draw a large current at once, and can burst.",
		means: map[string]string{"in-use": "at voltage within a year", "re-formed": "stored, and re-formed since", "stored": "neither, or not known"}},
	"bus-disconnected":         {ask: "Is the bus disconnected from its source?", why: "With only the control supply on a wrong gate signal finds no energy to do harm with."},
	"shield":                   {ask: "Does a shield stand over the board?", why: "A double pulse drives the switch to its current: when it fails it bursts."},
	"electronics-disconnected": {ask: "Are the electronics disconnected from what is tested?", why: "The test voltage kills drivers, sensors and meters that are left connected."},
	"sources-off":              {ask: "Is every other source off?", why: "The current must come from the limited supply only."},
	"gates-held":               {ask: "Is every gate that is not under test held to its emitter or source?", why: "An open gate charges itself and turns its switch on."},
	"limit-set":                {ask: "Are current and voltage limit set, before anything is connected?", why: "A limit that is set afterwards comes too late for the part."},
	"attended":                 {ask: "Does somebody stay with it all the time, and stop at 40 K rise?", why: "A shorted bank heats on until something opens."},
	"probe": {ask: "What is the reference of the probe? Type the whole word.",
		why:   "The clip of an ordinary probe is tied to protective earth through the scope. On a live node it is a short.",
		means: map[string]string{"differential": "a differential probe, rated for the bus", "isolated-input": "isolated inputs, or a battery scope made for it", "earth-clip": "an ordinary probe with its earth clip"}},
	"clip-on": {ask: "What is the earth clip on? Type the whole word.", why: "On a node that carries voltage to earth the clip is a short through the lead.",
		means: map[string]string{"earthed-node": "a node that is tied to earth already", "live-node": "anything else: emitter, source, minus of the bus"}},
	"supply": {ask: "Is the supply of the board isolated from earth? Type the whole word.", why: "Only then one point of the board may be tied to earth by a clip.",
		means: map[string]string{"isolated": "isolating transformer, battery, floating supply", "not-isolated": "or not known"}},
	"earth-clips": {ask: "How many earth clips are on the board, all channels together?", free: "a number", why: "Two clips on different nodes are a short through the scope."},
}
