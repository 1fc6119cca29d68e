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

// form asks one question with keys pressed one after the other.
func form(t *testing.T, q Question, keys ...string) (Answer, string) {
	t.Helper()
	in, typed := io.Pipe()
	defer typed.Close()
	screen := &screenOf{}
	done := make(chan struct{})
	go func() {
		for _, k := range keys {
			select {
			case <-done:
				return
			case <-time.After(60 * time.Millisecond):
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
