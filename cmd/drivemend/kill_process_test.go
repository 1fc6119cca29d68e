//go:build linux

package main

import (
	"bytes"
	"errors"
	"io"
	"os"
	"os/exec"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"golang.org/x/sys/unix"
)

// piped is the program with its input and output on pipes.
type piped struct {
	t     *testing.T
	cmd   *exec.Cmd
	in    io.WriteCloser
	mu    sync.Mutex
	out   bytes.Buffer
	err   bytes.Buffer // to be read when the program has ended
	grown chan struct{}
	ended chan struct{}
}

// onPipe starts the program in a folder. Its clock stands still, so that two runs print the same bytes.
func onPipe(t *testing.T, folder string, args ...string) *piped {
	t.Helper()
	p := &piped{t: t, cmd: exec.Command("drivemend", args...), grown: make(chan struct{}, 1), ended: make(chan struct{})}
	p.cmd.Dir = folder
	p.cmd.Env = append(os.Environ(), scriptClock+"=2026-12-01T09:00:00+01:00")
	in, err := p.cmd.StdinPipe()
	if err != nil {
		t.Fatal(err)
	}
	out, err := p.cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	p.in, p.cmd.Stderr = in, &p.err
	if err := p.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	go p.read(out)
	return p
}

// read takes what is printed until the program has ended.
func (p *piped) read(out io.Reader) {
	defer close(p.ended)
	part := make([]byte, 64<<10)
	for {
		n, err := out.Read(part)
		p.mu.Lock()
		p.out.Write(part[:n])
		p.mu.Unlock()
		select {
		case p.grown <- struct{}{}:
		default:
		}
		if err != nil {
			return
		}
	}
}

// printed is everything that was printed so far.
func (p *piped) printed() []byte {
	p.mu.Lock()
	defer p.mu.Unlock()
	return bytes.Clone(p.out.Bytes())
}

// errors is what the program said on standard error before it ended.
func (p *piped) errors() string { return p.err.String() }

// waits waits until what is printed satisfies a condition; false when the program has ended before.
func (p *piped) waits(enough func(out []byte) bool) bool {
	late := time.After(time.Minute)
	for {
		if enough(p.printed()) {
			return true
		}
		select {
		case <-p.grown:
		case <-p.ended:
			return enough(p.printed())
		case <-late:
			p.kill()
			p.t.Fatalf("nothing more is printed after:\n%s", p.printed())
		}
	}
}

// answer types one line.
func (p *piped) answer(text string) { _, _ = io.WriteString(p.in, text+"\n") }

// kill ends the program at once, and tells whether that is what ended it, or its exit status.
func (p *piped) kill() (killed bool, status int) {
	_ = p.cmd.Process.Signal(unix.SIGKILL)
	<-p.ended
	var exit *exec.ExitError
	if err := p.cmd.Wait(); errors.As(err, &exit) && exit.ExitCode() < 0 {
		return true, -1
	}
	return false, p.cmd.ProcessState.ExitCode()
}

// finish closes the input and gives the exit status.
func (p *piped) finish() int {
	p.in.Close()
	<-p.ended
	_ = p.cmd.Wait()
	return p.cmd.ProcessState.ExitCode()
}

// event is a step of saving as it shows in the folder.
type event struct {
	mask   uint32
	ending string
}

// saveEvents are the steps of saving in their order: lock taken, new file made, written, closed, renamed, lock given back.
var saveEvents = []event{
	{unix.IN_OPEN, ".lock"}, {unix.IN_CREATE, ".part"}, {unix.IN_MODIFY, ".part"}, {unix.IN_CLOSE_WRITE, ".part"},
	{unix.IN_MOVED_TO, ".yaml"}, {unix.IN_DELETE, ".lock"},
}

// folderWatch waits for events of a folder.
type folderWatch struct {
	file *os.File
	rest []byte
}

// watchFolder begins to watch a folder.
func watchFolder(t *testing.T, folder string) *folderWatch {
	t.Helper()
	fd, err := unix.InotifyInit1(unix.IN_CLOEXEC | unix.IN_NONBLOCK)
	if err != nil {
		t.Skip("folders cannot be watched here:", err)
	}
	file := os.NewFile(uintptr(fd), "folder watch")
	mask := uint32(0)
	for _, e := range saveEvents {
		mask |= e.mask
	}
	if _, err := unix.InotifyAddWatch(fd, folder, mask); err != nil {
		t.Fatal(err)
	}
	return &folderWatch{file: file}
}

// until waits for an event; false when it does not come within some seconds.
func (w *folderWatch) until(want event) bool {
	_ = w.file.SetReadDeadline(time.Now().Add(20 * time.Second))
	buffer := make([]byte, 16<<10)
	for {
		for len(w.rest) >= unix.SizeofInotifyEvent {
			mask := le32(w.rest[4:])
			end := unix.SizeofInotifyEvent + int(le32(w.rest[12:]))
			name := strings.TrimRight(string(w.rest[unix.SizeofInotifyEvent:end]), "\x00")
			w.rest = w.rest[end:]
			if mask&want.mask != 0 && strings.HasSuffix(name, want.ending) {
				return true
			}
		}
		n, err := w.file.Read(buffer)
		if err != nil {
			return false
		}
		w.rest = slices.Clone(buffer[:n])
	}
}

func le32(b []byte) uint32 {
	return uint32(b[0]) | uint32(b[1])<<8 | uint32(b[2])<<16 | uint32(b[3])<<24
}
