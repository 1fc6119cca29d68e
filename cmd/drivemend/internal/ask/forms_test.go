package ask

import (
	"io"
	"strings"
	"sync"
	"testing"
	"time"
)

// screenOf is an output that is written and read at the same time.
type screenOf struct {
	mu   sync.Mutex
	text strings.Builder
}

func (s *screenOf) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.text.Write(p)
}

func (s *screenOf) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.text.String()
}

// settled waits until something new stands on the screen since it held so many bytes, and no more comes; some keys change
// nothing, so that it does not wait for ever.
func (s *screenOf) settled(before int) {
	for start, last := time.Now(), before; time.Since(start) < time.Second; {
		time.Sleep(40 * time.Millisecond)
		now := len(s.String())
		if now > before && now == last {
			return
		}
		last = now
	}
}

// form asks one question with keys pressed one after the other, each once the screen has answered the one before.
func form(t *testing.T, q Question, keys ...string) (Answer, string) {
	t.Helper()
	in, typed := io.Pipe()
	defer typed.Close()
	screen := &screenOf{}
	done := make(chan struct{})
	go func() {
		before := 0
		for _, k := range keys {
			screen.settled(before)
			before = len(screen.String())
			select {
			case <-done:
				return
			default:
			}
			if _, err := io.WriteString(typed, k); err != nil {
				return
			}
		}
	}()
	type result struct {
		a   Answer
		err error
	}
	got := make(chan result, 1)
	go func() {
		a, err := NewForms(in, screen, 80).Ask(q)
		got <- result{a, err}
	}()
	select {
	case r := <-got:
		close(done)
		if r.err != nil {
			t.Fatal(r.err)
		}
		return r.a, screen.String()
	case <-time.After(20 * time.Second):
		close(done)
		t.Fatalf("no answer after %q; the screen:\n%s", keys, screen)
	}
	return Answer{}, ""
}

const (
	down  = "\x1b[B"
	enter = "\r"
)

func TestForms(t *testing.T) {
	for _, c := range []struct {
		name string
		q    Question
		keys []string
		want Answer
		says string
	}{
		{"the second of a menu", moment, []string{down, down, enter}, Answer{Given, "stall"}, "> stall"},
		{"Enter alone chooses nothing", moment, []string{enter, down, enter}, Answer{Given, "start"}, "Enter alone answers nothing"},
		{"the beginning of a word moves to it", moment, []string{"s", "t", "a", "l", enter}, Answer{Given, "stall"}, "> stall"},
		{"pasted at once", moment, []string{"stall", enter}, Answer{Given, "stall"}, "> stall"},
		{"letters of no word begin anew", moment, []string{"x", "z", "s", enter}, Answer{Given, "start"}, "> start"},
		{"letters that move the cursor elsewhere do not", moment, []string{"j", "k", "g", "G", "/", enter, "q", "u", enter}, Answer{Kind: Quit}, "Enter alone answers nothing"},
		{"a command by its sign", moment, []string{"?", enter}, Answer{Kind: Skipped}, "> don't know"},
		{"an arrow ends a word", moment, []string{"s", "t", down, "a", enter}, Answer{Given, "stall"}, "> stall"},
		{"a typed reading", reading, []string{"0", ".", "4", enter}, Answer{Given, "0.4"}, "> 0.4"},
		{"a wrong unit, mended", reading, []string{"3V", enter, "3", enter}, Answer{Given, "3"}, "that is in V"},
		{"danger needs the word", danger, []string{enter, "y", enter, "yes", enter}, Answer{Given, "yes"}, "Enter alone confirms nothing"},
		{"interrupted", moment, []string{"\x03"}, Answer{Kind: Quit}, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			got, screen := form(t, c.q, c.keys...)
			if got != c.want {
				t.Errorf("got %v, want %v", got, c.want)
			}
			if !strings.Contains(screen, c.says) {
				t.Errorf("%q is not on the screen:\n%q", c.says, screen)
			}
		})
	}
}

// TestMenuSaysHowItIsAnswered: words cannot be typed out in a menu, and nothing on the screen asks for it.
func TestMenuSaysHowItIsAnswered(t *testing.T) {
	_, screen := form(t, moment, enter, down, enter)
	if strings.Contains(screen, "one of:") || strings.Count(screen, menuKeys) < 2 {
		t.Errorf("the screen says\n%q", screen)
	}
}

// TestLongMeaningIsNotCut: what a choice means stands there in full, below its first line.
func TestLongMeaningIsNotCut(t *testing.T) {
	q := Question{Title: "Steps", Ask: "Which?", Choices: []Choice{{"one", strings.Repeat("locked by what stands before it, ", 5) + "and the end"}, {"two", ""}}}
	_, screen := form(t, q, down, enter)
	if strings.Contains(screen, "…") || !strings.Contains(screen, "and the end") {
		t.Errorf("the screen says\n%q", screen)
	}
	f := NewForms(nil, nil, 80)
	for i, line := range strings.Split(f.label(q.Choices[0].Word, q.Choices[0].Means, 6), "\n") {
		if n := len([]rune(line)); n > 76 || i > 0 && !strings.HasPrefix(line, "        ") || i == 0 && !strings.HasPrefix(line, "one     locked") {
			t.Errorf("line %d is %q", i, line)
		}
	}
}
