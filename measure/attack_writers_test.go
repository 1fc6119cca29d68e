package measure

import (
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"testing"
)

// writerCase names the file a writer process adds to; writerName is what it signs with, writerEntries how often.
const (
	writerCase    = "WRITER_CASE"
	writerName    = "WRITER_NAME"
	writerEntries = "WRITER_ENTRIES"
)

// TestWriterProcess is one writer of TestTwoWriters; alone it does nothing.
func TestWriterProcess(t *testing.T) {
	path := os.Getenv(writerCase)
	if path == "" {
		t.Skip("it is started by TestTwoWriters")
	}
	entries, err := strconv.Atoi(os.Getenv(writerEntries))
	must(t, err)
	answer := func(f *File, n int) *File {
		must(t, f.Observe(Observation{Test: "smell", Result: "burnt", Note: fmt.Sprintf("%s %d", os.Getenv(writerName), n)}))
		return f
	}
	again := func(n int) *File {
		f, err := Load(path)
		must(t, err)
		return answer(f, n)
	}
	refused := map[string]int{}
	for n, f := 0, again(0); n < entries; { // as a session does: read again only after another has changed the file
		var changed *ChangedError
		switch err := f.Save(); {
		case err == nil:
			fmt.Println("saved", os.Getenv(writerName), n)
			n++
			answer(f, n)
		case errors.Is(err, ErrLocked):
			refused["locked"]++
		case errors.As(err, &changed) && !changed.Gone && !changed.There:
			refused["changed"]++
			f = again(n)
		default:
			t.Fatal(err)
		}
	}
	fmt.Println("refused", refused)
}

// TestTwoWriters lets two programs add 200 answers each to one file at once. Every answer was saved or refused, and all
// that were saved are there in the end.
func TestTwoWriters(t *testing.T) {
	entries := 200
	if testing.Short() {
		entries = 20
	}
	_, path := newOnDisk(t, head)
	var outs [2]strings.Builder
	var writers [2]*exec.Cmd
	for i := range writers {
		w := exec.Command(os.Args[0], "-test.run", "^TestWriterProcess$")
		w.Env = append(os.Environ(), writerCase+"="+path, fmt.Sprintf("%s=writer %d", writerName, i), fmt.Sprintf("%s=%d", writerEntries, entries))
		w.Stdout, w.Stderr = &outs[i], &outs[i]
		must(t, w.Start())
		writers[i] = w
	}
	for i, w := range writers {
		if err := w.Wait(); err != nil {
			t.Errorf("%v\n%s", err, outs[i].String())
		}
	}
	f, err := Load(path)
	must(t, err)
	there := map[string]int{}
	for _, o := range f.Case.Observations {
		there[o.Note]++
	}
	saved := 0
	for i := range outs {
		for _, line := range strings.Split(outs[i].String(), "\n") {
			if note, ok := strings.CutPrefix(line, "saved "); ok {
				saved++
				if there[note] != 1 {
					t.Errorf("%s stands there %d times", note, there[note])
				}
			}
			if refused, ok := strings.CutPrefix(line, "refused "); ok {
				t.Logf("writer %d was refused and tried again: %s", i, refused)
			}
		}
	}
	t.Logf("%d answers acknowledged, %d on disk", saved, len(f.Case.Observations))
	if saved != len(writers)*entries || len(f.Case.Observations) != saved {
		t.Errorf("%d answers acknowledged, %d on disk, want %d", saved, len(f.Case.Observations), len(writers)*entries)
	}
	onlyFile(t, path)
}
