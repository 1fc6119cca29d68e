package ask

import (
	"errors"
	"io"
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"
)

var moment = Question{
	Title: "The exact moment", Ask: "What was it doing?",
	Choices: []Choice{{"start", "starting"}, {"stall", "jammed"}, {"none", "nothing"}, {"wrong", ""}},
	Asides:  []Aside{{Word: "how", Means: "how it is done", Show: func() string { return "  ask the driver" }}, {Word: "why", Means: "why", Show: func() string { return "  it decides" }}},
}

var reading = Question{
	Title: "Terminals", Place: "Q2", Ask: "What does it read?", Free: "a reading in Ω",
	Choices: []Choice{{"shorted", "near zero"}, {"blocking", "open"}},
	Check: func(text string) error {
		if strings.HasSuffix(text, "V") {
			return errors.New("that is in V, wanted is Ω")
		}
		return nil
	},
}

var plain = Question{Title: "Fan", Ask: "Does it turn?", Choices: []Choice{{"yes", ""}, {"no", ""}}}

var danger = Question{Title: "Isolator", Ask: "Locked?", Choices: []Choice{{"yes", ""}, {"no", ""}}, Danger: true, Enter: "yes"}

// ask1 asks one question with lines typed.
func ask1(q Question, typed string) (Answer, string, error) {
	var out strings.Builder
	a, err := NewLines(strings.NewReader(typed), &out, 80, false).Ask(q)
	return a, out.String(), err
}

func TestAnswers(t *testing.T) {
	for _, c := range []struct {
		name, typed string
		q           Question
		want        Answer
		says        string // somewhere on the screen
	}{
		{"a word", "stall\n", moment, Answer{Given, "stall"}, ""},
		{"a digit chooses nothing", "2\nstall\n", moment, Answer{Given, "stall"}, `"2" is no answer here`},
		{"in capitals", "STALL\n", moment, Answer{Given, "stall"}, ""},
		{"capitals in the word", "igbt\n", Question{Title: "x", Choices: []Choice{{"IGBT", ""}}}, Answer{Given, "IGBT"}, ""},
		{"a letter for a plain yes", "y\n", plain, Answer{Given, "yes"}, "later not now"},
		{"a letter for a plain no", "n\n", plain, Answer{Given, "no"}, ""},
		{"a plain yes or no put off", "later\n", plain, Answer{Kind: Later}, ""},
		{"a choice before the letter of an aside", "h\n", Question{Title: "x", Choices: []Choice{{"hot", ""}}, Asides: moment.Asides}, Answer{Given, "hot"}, ""},
		{"the question again after an aside", "how\nstall\n", moment, Answer{Given, "stall"}, "ask the driver\n\nThe exact moment\nWhat was it doing?\n"},
		{"an aside that does something", "more\n", Question{Title: "x", Choices: []Choice{{"hot", ""}}, Asides: []Aside{{Word: "more", Do: func() error { return nil }}}}, Answer{Kind: Moved}, ""},
		{"its beginning", "  STAL \n", moment, Answer{Given, "stall"}, ""},
		{"a beginning of two", "st\nsta\nstar\n", moment, Answer{Given, "start"}, `"sta" fits start and stall`},
		{"Enter alone", "\nstart\n", moment, Answer{Given, "start"}, "Enter alone answers nothing"},
		{"a wrong word", "perhaps\nstart\n", moment, Answer{Given, "start"}, `"perhaps" is no answer here; type one of: start, stall, none, wrong`},
		{"a number too high", "5\nstart\n", moment, Answer{Given, "start"}, `"5" is no answer`},
		{"not known", "?\n", moment, Answer{Kind: Skipped}, ""},
		{"not now", "n\n", moment, Answer{Kind: Later}, ""},
		{"a word that begins like a command", "no\n", moment, Answer{Given, "none"}, ""},
		{"back", "back\n", moment, Answer{Kind: Back}, ""},
		{"quit", "q\n", moment, Answer{Kind: Quit}, ""},
		{"how, then why", "how\nwhy\nwr\n", moment, Answer{Given, "wrong"}, "  it decides\n\nThe exact moment"},
		{"no line end", "stall", moment, Answer{Given, "stall"}, ""},
		{"a line end of its own", "stall\r\n", moment, Answer{Given, "stall"}, ""},
		{"a control character", "sta\x1b[2Jll\nstall\n", moment, Answer{Given, "stall"}, "control characters were typed"},
		{"a reading", "0.4\n", reading, Answer{Given, "0.4"}, "Terminals: Q2"},
		{"a number is a reading", "1\n", reading, Answer{Given, "1"}, ""},
		{"a wrong unit", "3 V\n3\n", reading, Answer{Given, "3"}, "that is in V, wanted is Ω"},
		{"a word instead of a reading", "sh\n", reading, Answer{Given, "shorted"}, ""},
		{"danger and Enter", "\nyes\n", danger, Answer{Given, "yes"}, "Enter alone confirms nothing here"},
		{"danger and a letter", "y\n1\nye\nyes\n", danger, Answer{Given, "yes"}, `"y" is no answer here`},
		{"danger can be put off", "?\n", danger, Answer{Kind: Skipped}, ""},
		{"Enter with a meaning", "\n", Question{Title: "x", Choices: []Choice{{"yes", ""}}, Enter: "yes"}, Answer{Given, "yes"}, "Enter: yes"},
		{"no back, no skip", "b\n?\nn\nyes\n", Question{Title: "x", Choices: []Choice{{"yes", ""}}, NoBack: true, NoSkip: true}, Answer{Given, "yes"}, `"?" is no answer`},
	} {
		t.Run(c.name, func(t *testing.T) {
			got, screen, err := ask1(c.q, c.typed)
			if err != nil || got != c.want {
				t.Errorf("%q gives %v, %v; want %v", c.typed, got, err, c.want)
			}
			if !strings.Contains(screen, c.says) {
				t.Errorf("%q is not on the screen:\n%s", c.says, screen)
			}
		})
	}
}

func TestEndOfInput(t *testing.T) {
	for _, typed := range []string{"", "perhaps\n", "\n\n", "how\n"} {
		if a, _, err := ask1(moment, typed); !errors.Is(err, ErrEnd) || a != (Answer{}) {
			t.Errorf("%q gives %v, %v; want ErrEnd", typed, a, err)
		}
	}
	broken := NewLines(iotestReader{}, io.Discard, 80, false)
	if _, err := broken.Ask(moment); err == nil || errors.Is(err, ErrEnd) {
		t.Errorf("a broken input gives %v", err)
	}
}

type iotestReader struct{}

func (iotestReader) Read([]byte) (int, error) { return 0, errors.New("unplugged") }

// TestOneReader proves that nothing piped in is lost between questions.
func TestOneReader(t *testing.T) {
	l := NewLines(strings.NewReader("stall\n0.4\nstart\n"), io.Discard, 80, true)
	var got []string
	for _, q := range []Question{moment, reading, moment} {
		a, err := l.Ask(q)
		if err != nil {
			t.Fatal(err)
		}
		got = append(got, a.Text)
	}
	if strings.Join(got, " ") != "stall 0.4 start" {
		t.Errorf("got %q", got)
	}
}

func TestEchoOfAPipe(t *testing.T) {
	var out strings.Builder
	if _, err := NewLines(strings.NewReader("stall\n"), &out, 80, true).Ask(moment); err != nil {
		t.Fatal(err)
	}
	if !strings.HasSuffix(out.String(), "> stall\n") {
		t.Errorf("the answer is not repeated:\n%s", out.String())
	}
}

func TestLongLine(t *testing.T) {
	a, screen, err := ask1(moment, strings.Repeat("x", 3*longestLine)+"\nstall\n")
	if err != nil || a.Text != "stall" || !strings.Contains(screen, "the line is too long") {
		t.Errorf("got %v, %v", a, err)
	}
}

// TestWidth proves that no line is wider than the terminal, whatever is asked.
func TestWidth(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		words := rapid.SliceOfN(rapid.StringMatching(`[a-zA-ZäΩµ.]{1,18}`), 1, 60)
		width := rapid.IntRange(40, 120).Draw(t, "width")
		q := Question{Title: "T", Ask: strings.Join(words.Draw(t, "ask"), " "), Lines: []string{strings.Join(words.Draw(t, "line"), " ")},
			Choices: []Choice{{"yes", strings.Join(words.Draw(t, "means"), " ")}}}
		var out strings.Builder
		if _, err := NewLines(strings.NewReader("yes\n"), &out, width, false).Ask(q); err != nil {
			t.Fatal(err)
		}
		for _, line := range strings.Split(out.String(), "\n") {
			if n := utf8.RuneCountInString(line); n > width {
				t.Fatalf("%d columns of %d: %q", n, width, line)
			}
		}
	})
}

// TestAnyInput proves that whatever is typed ends in an answer that the question allows, or at the end of the input.
func TestAnyInput(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q := rapid.SampledFrom([]Question{moment, reading, danger}).Draw(t, "question")
		typed := rapid.SliceOf(rapid.Byte()).Draw(t, "typed")
		a, _, err := ask1(q, string(typed))
		switch {
		case err != nil && !errors.Is(err, ErrEnd):
			t.Fatal(err)
		case err == nil && a.Kind == Given && q.Free == "" && q.exact(a.Text) == "":
			t.Fatalf("%q is no choice", a.Text)
		}
	})
}

func TestNumbersKeepTheirUnit(t *testing.T) {
	got := Wrapped("the peak is 610.6 V, rated 585 V, at least 100 Ω, no unit: 3 parts", "", "  ", 18)
	want := []string{"the peak is", "  610.6 V, rated", "  585 V, at least", "  100 Ω, no unit:", "  3 parts"}
	if strings.Join(got, "|") != strings.Join(want, "|") {
		t.Errorf("got %q", got)
	}
}

// TestEnterMayBeACommand: Enter alone stands for a command where a question says so, and never where a safety step rests
// on the answer.
func TestEnterMayBeACommand(t *testing.T) {
	q := Question{Choices: []Choice{{Word: "done"}}, Enter: "later"}
	if a, err := q.answer(""); err != nil || a.Kind != Later {
		t.Errorf("Enter alone gives %v, %v", a, err)
	}
	q.Danger = true
	if a, err := q.answer(""); err == nil {
		t.Errorf("Enter alone answers a question of danger: %v", a)
	}
}
