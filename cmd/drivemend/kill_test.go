//go:build linux

// Kills need signals and a watch on a folder, as Linux has them; what is proved of the file holds on every system.

package main

import (
	"bytes"
	"fmt"
	"math/rand"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"gopkg.in/yaml.v3"

	"drivemend/measure"
)

// killsWanted is how many kills are done: 60, which take some twenty seconds on two processors, or what DRIVEMEND_KILLS
// says. Before a release it says 200.
func killsWanted(t *testing.T) int {
	text := os.Getenv("DRIVEMEND_KILLS")
	if text == "" {
		return 60
	}
	n, err := strconv.Atoi(text)
	if err != nil || n < 10 {
		t.Fatalf("DRIVEMEND_KILLS is %q, want a number from 10 on", text)
	}
	return n
}

// facts lists what a case file says, every value with its path; a list that grows keeps its paths.
func facts(t *testing.T, path string) []string {
	t.Helper()
	raw, err := os.ReadFile(path)
	if os.IsNotExist(err) {
		return nil
	}
	var top yaml.Node
	if err == nil {
		err = yaml.Unmarshal(raw, &top)
	}
	if err != nil {
		t.Fatalf("%v\n%s", err, raw)
	}
	var out []string
	var walk func(n *yaml.Node, path string)
	walk = func(n *yaml.Node, path string) {
		for i, c := range n.Content {
			switch n.Kind {
			case yaml.MappingNode:
				if i%2 == 1 {
					walk(c, path+"."+n.Content[i-1].Value)
				}
			default:
				walk(c, fmt.Sprintf("%s[%d]", path, i))
			}
		}
		if n.Kind == yaml.ScalarNode {
			out = append(out, path+" = "+n.Value)
		}
	}
	walk(&top, "")
	return out
}

// lost lists what is not among the facts of a file any more.
func lost(acknowledged, there []string) []string {
	var out []string
	for _, fact := range acknowledged {
		if !slices.Contains(there, fact) {
			out = append(out, fact)
		}
	}
	return out
}

// rehearsal is one session that was not killed: what was answered, and how it stood at each prompt. Prompt n is the one
// printed after n answers.
type rehearsal struct {
	answers []string
	screen  []byte
	prompts []int           // bytes printed when the prompt stood there
	facts   [][]string      // on disk at that moment
	took    []time.Duration // from the answer to the next prompt
}

const prompt = "\n> "

// setAnswers are for the questions of the first five minutes; anything else gets its first choice.
var setAnswers = []struct{ title, text string }{
	{"No such case", "yes"}, {"MAKE SAFE 1", "yes"}, {"MAKE SAFE 2", "unplugged"}, {"MAKE SAFE 3", "none"}, {"Supply", "rectified-mains"},
	{"Bus voltage", "310"}, {"Bus capacitance", "2200uF"}, {"Parallel parts", "3"},
}

var firstChoice = regexp.MustCompile(`(?m)^   (\S+)  `)

// answerTyped finds an answer to the question that was printed last.
func answerTyped(question string) string {
	for _, s := range setAnswers {
		if strings.Contains(question, "\n"+s.title) {
			return s.text
		}
	}
	choice := firstChoice.FindStringSubmatch(question)
	switch {
	case strings.Contains(question, "What now?"):
		return "quit"
	case strings.Contains(question, "DEAD CHECK") && choice == nil || strings.Contains(question, "DEAD CHECK") && strings.Contains(question, " AC"):
		return "0.3 0"
	case choice != nil:
		return choice[1]
	}
	return "?"
}

// rehearse runs the session.
func rehearse(t *testing.T, folder string, most int) *rehearsal {
	t.Helper()
	r := &rehearsal{}
	p := onPipe(t, folder, "bench", "pump")
	began := time.Now()
	for p.waits(func(out []byte) bool { return len(out) > len(r.screen) && bytes.HasSuffix(out, []byte(prompt)) }) {
		question := string(p.printed()[len(r.screen):])
		r.screen = p.printed()
		r.prompts = append(r.prompts, len(r.screen))
		r.facts = append(r.facts, facts(t, filepath.Join(folder, "pump.yaml")))
		r.took = append(r.took, time.Since(began))
		if len(r.answers) == most {
			break
		}
		r.answers = append(r.answers, answerTyped(question))
		began = time.Now()
		p.answer(r.answers[len(r.answers)-1])
	}
	p.kill()
	if len(r.prompts) == 0 {
		t.Fatalf("the session asks nothing: %s", p.errors())
	}
	r.answers = r.answers[:len(r.prompts)-1]
	return r
}

// saving lists the answers that changed the file.
func (r *rehearsal) saving() []int {
	var out []int
	for n := range r.answers {
		if !slices.Equal(r.facts[n], r.facts[n+1]) {
			out = append(out, n)
		}
	}
	return out
}

// killing is a number of kills, and what was seen after them.
type killing struct {
	t                     *testing.T
	r                     *rand.Rand
	during                map[string]int // kills by the moment that was aimed at
	parts, locks, tries   int            // kills that left a half-written file, a lock file, a try of the folder
	acknowledged, lost    int            // answers
	early, fresh, resumed int            // kills after which more was on disk than acknowledged, no file yet, a session went on
}

// kills counts all.
func (k *killing) kills() int {
	n := 0
	for _, of := range k.during {
		n += of
	}
	return n
}

// left counts what a kill left in the folder.
func (k *killing) left(folder string) {
	names, _ := filepath.Glob(filepath.Join(folder, ".*"))
	part, lock := false, false
	for _, name := range names {
		part = part || strings.HasSuffix(name, ".part")
		lock = lock || strings.HasSuffix(name, ".lock")
	}
	if part {
		k.parts++
	}
	if lock {
		k.locks++
	}
}

// benchRound runs the rehearsed session up to a moment in its middle and kills it there.
func (k *killing) benchRound(r *rehearsal, saving []int) {
	folder := k.t.TempDir()
	path := filepath.Join(folder, "pump.yaml")
	p := onPipe(k.t, folder, "bench", "pump")
	at := saving[k.r.Intn(len(saving))]
	for n := range at {
		p.waits(func(out []byte) bool { return len(out) >= r.prompts[n] })
		p.answer(r.answers[n])
	}
	p.waits(func(out []byte) bool { return len(out) >= r.prompts[at] })
	moment := "saving"
	switch k.r.Intn(4) {
	case 0:
		moment = "any moment of an answer"
		p.answer(r.answers[at])
		time.Sleep(time.Duration(k.r.Float64() * 1.2 * float64(r.took[at+1])))
	case 1:
		moment = "the next prompt"
		p.answer(r.answers[at])
		p.waits(func(out []byte) bool { return len(out) >= r.prompts[at+1] })
	default:
		w := watchFolder(k.t, folder)
		p.answer(r.answers[at])
		k.atSave(w)
	}
	if killed, status := p.kill(); !killed {
		k.t.Fatalf("the session ended by itself with %d: %s\n%s", status, p.errors(), p.printed())
	}
	k.during["bench: "+moment]++
	k.left(folder)
	screen := p.printed()
	if !bytes.HasPrefix(r.screen, screen[:min(len(screen), len(r.screen))]) {
		k.t.Fatalf("two runs with the same answers print different things:\n%s\n--- rehearsed ---\n%s", screen, r.screen)
	}
	done := 0
	for done < len(r.prompts)-1 && len(screen) >= r.prompts[done+1] {
		done++
	}
	k.judge(path, r, done)
	k.goOn(folder)
}

// atSave waits for a step of saving, in half of the rounds up to 1.5 ms longer: a save takes a few.
func (k *killing) atSave(w *folderWatch) {
	if !w.until(saveEvents[k.r.Intn(len(saveEvents))]) {
		k.t.Error("nothing was saved")
	}
	if k.r.Intn(2) == 0 {
		time.Sleep(time.Duration(k.r.Float64() * 1.5e6))
	}
	w.file.Close()
}

// judge proves that the file loads and that nothing of the answers that were acknowledged is missing from it.
func (k *killing) judge(path string, r *rehearsal, done int) {
	for n := range done {
		if !slices.Equal(r.facts[n], r.facts[n+1]) {
			k.acknowledged++
		}
	}
	if _, err := os.Stat(path); os.IsNotExist(err) && r.facts[done] == nil {
		k.fresh++
		return
	}
	if _, err := measure.Load(path); err != nil {
		k.t.Errorf("the file does not load: %v", err)
	}
	there := facts(k.t, path)
	if slices.Equal(there, r.facts[done]) {
		return
	}
	if done+1 < len(r.facts) && slices.Equal(there, r.facts[done+1]) {
		k.early++
		return
	}
	if gone := lost(r.facts[done], there); len(gone) > 0 { // an answer may be saved in two steps
		k.lost++
		k.t.Errorf("after %d answers these are lost: %q", done, gone)
	}
}

// goOn proves that the next session and the next command work at once, and that what the kill left is gone then.
func (k *killing) goOn(folder string) {
	path := filepath.Join(folder, "pump.yaml")
	before := facts(k.t, path)
	if before == nil {
		return
	}
	if p := onPipe(k.t, folder, "bench", "pump"); p.finish() != exitDone {
		k.t.Errorf("the next session does not start: %s\n%s", p.errors(), p.printed())
	}
	if p := onPipe(k.t, folder, "enter", "pump", "fan-turns", "turns", "--note", "after the kill"); p.finish() != exitDone {
		k.t.Errorf("the next answer cannot be entered: %s", p.errors())
	}
	there := facts(k.t, path)
	if gone := lost(before, there); len(gone) > 0 || len(there) <= len(before) {
		k.t.Errorf("%d facts before the next answer, %d after; gone: %q", len(before), len(there), gone)
	}
	names, _ := filepath.Glob(filepath.Join(folder, ".pump.yaml.*"))
	if len(names) > 0 {
		k.t.Errorf("left behind by the kill: %v", names)
	}
	tries, _ := filepath.Glob(filepath.Join(folder, ".drivemend-try-*"))
	k.tries += len(tries)
	k.resumed++
}

// enterRounds enters answers one command after the other into one file and kills every command at a moment of its own.
func (k *killing) enterRounds(want int) {
	folder := k.t.TempDir()
	path := filepath.Join(folder, "pump.yaml")
	if p := onPipe(k.t, folder, "new", "pump"); p.finish() != exitDone {
		k.t.Fatalf("no case was made: %s", p.errors())
	}
	began := time.Now()
	onPipe(k.t, folder, "enter", "pump", "fan-turns", "turns").finish()
	took := time.Since(began)
	var acknowledged []string
	for n, done := 0, k.kills(); k.kills()-done < want; n++ {
		note := fmt.Sprintf("answer %d", n)
		w := watchFolder(k.t, folder)
		p := onPipe(k.t, folder, "enter", "pump", "fan-turns", "turns", "--note", note)
		moment := "saving"
		if k.r.Intn(4) == 0 {
			moment = "any moment"
			time.Sleep(time.Duration(k.r.Float64() * 1.1 * float64(took)))
			w.file.Close()
		} else {
			k.atSave(w)
		}
		switch killed, status := p.kill(); {
		case killed:
			k.during["enter: "+moment]++
			k.left(folder)
		case status == exitDone:
			acknowledged = append(acknowledged, note)
			k.acknowledged++
		default:
			k.t.Errorf("after a kill, enter ends with %d: %s", status, p.errors())
		}
		k.inOrder(path, acknowledged)
	}
	k.goOn(folder)
}

// inOrder proves that a file loads and holds every acknowledged note, in order.
func (k *killing) inOrder(path string, acknowledged []string) {
	f, err := measure.Load(path)
	if err != nil {
		k.t.Fatalf("the file does not load: %v", err)
	}
	for _, o := range f.Case.Observations {
		if len(acknowledged) > 0 && o.Note == acknowledged[0] {
			acknowledged = acknowledged[1:]
		}
	}
	if len(acknowledged) > 0 {
		k.lost += len(acknowledged)
		k.t.Errorf("acknowledged and lost: %q", acknowledged)
	}
}

// TestKilledAnyTime kills guided sessions and single commands, most of them while they save. Whatever was answered by
// the next prompt, or by exit status 0, is on disk, the file loads, and the next session goes on at once.
func TestKilledAnyTime(t *testing.T) {
	if testing.Short() {
		t.Skip("many programs are started and killed")
	}
	want := killsWanted(t)
	k := &killing{t: t, r: rand.New(rand.NewSource(1)), during: map[string]int{}}
	r := rehearse(t, t.TempDir(), 24)
	saving := r.saving()
	if len(saving) < 10 {
		t.Fatalf("only %d of %d answers change the file:\n%s", len(saving), len(r.answers), r.screen)
	}
	began := time.Now()
	for k.kills() < want*6/10 && !t.Failed() {
		k.benchRound(r, saving)
	}
	k.enterRounds(want - k.kills())
	for k.parts < want/20 && k.kills() < 3*want && !t.Failed() { // a fast disk is seldom caught at writing
		k.enterRounds(want / 10)
	}
	t.Logf("%d kills in %.0f s %v: %d left a half-written file, %d a lock file, %d an empty try of the folder; %d answers acknowledged, %d lost; "+
		"%d times the answer was on disk before it was acknowledged, %d times there was no file yet; %d sessions went on",
		k.kills(), time.Since(began).Seconds(), k.during, k.parts, k.locks, k.tries, k.acknowledged, k.lost, k.early, k.fresh, k.resumed)
	if k.parts < want/20 {
		t.Errorf("only %d kills hit a save while it wrote, want %d", k.parts, want/20)
	}
}
