package main

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"golang.org/x/sys/unix"
)

// terminal is a pseudo-terminal with the program at its other end. It answers no question, as a serial line does not.
type terminal struct {
	t      *testing.T
	master *os.File
	cmd    *exec.Cmd
	mu     sync.Mutex
	screen bytes.Buffer
	ended  chan struct{}
}

// onTerminal starts the program on a terminal of 80 × 24 in a folder.
func onTerminal(t *testing.T, folder string, args ...string) *terminal {
	t.Helper()
	master, err := os.OpenFile("/dev/ptmx", os.O_RDWR, 0)
	if err != nil {
		t.Skip("there is no pseudo-terminal here:", err)
	}
	fd := int(master.Fd())
	n, err := unix.IoctlGetInt(fd, unix.TIOCGPTN)
	if err == nil {
		err = unix.IoctlSetPointerInt(fd, unix.TIOCSPTLCK, 0)
	}
	if err != nil {
		t.Skip("no pseudo-terminal can be opened:", err)
	}
	if err := unix.IoctlSetWinsize(fd, unix.TIOCSWINSZ, &unix.Winsize{Row: 24, Col: 80}); err != nil {
		t.Fatal(err)
	}
	slave, err := os.OpenFile(fmt.Sprintf("/dev/pts/%d", n), os.O_RDWR|syscall.O_NOCTTY, 0)
	if err != nil {
		t.Skip("no pseudo-terminal can be opened:", err)
	}
	defer slave.Close()
	term := &terminal{t: t, master: master, cmd: exec.Command("drivemend", args...), ended: make(chan struct{})}
	term.cmd.Dir, term.cmd.Stdin, term.cmd.Stdout, term.cmd.Stderr = folder, slave, slave, slave
	term.cmd.Env = append(os.Environ(), "TERM=xterm", "CI=", "NO_COLOR=")
	term.cmd.SysProcAttr = &syscall.SysProcAttr{Setsid: true, Setctty: true}
	if err := term.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	go term.watch()
	t.Cleanup(func() { _ = term.cmd.Process.Kill(); master.Close() })
	return term
}

// watch gathers what is written until the program is gone.
func (term *terminal) watch() {
	defer close(term.ended)
	buf := make([]byte, 4096)
	for {
		n, err := term.master.Read(buf)
		term.mu.Lock()
		term.screen.Write(buf[:n])
		term.mu.Unlock()
		if err != nil {
			return
		}
	}
}

func (term *terminal) text() string {
	term.mu.Lock()
	defer term.mu.Unlock()
	return term.screen.String()
}

// until waits for a text on the screen.
func (term *terminal) until(want string) {
	term.t.Helper()
	for end := time.Now().Add(15 * time.Second); time.Now().Before(end); time.Sleep(20 * time.Millisecond) {
		if strings.Contains(term.text(), want) {
			return
		}
	}
	term.t.Fatalf("%q does not come up; the screen:\n%q", want, term.text())
}

func (term *terminal) press(keys string) {
	term.t.Helper()
	time.Sleep(100 * time.Millisecond) // the field takes keys a moment after it is drawn
	if _, err := io.WriteString(term.master, keys); err != nil {
		term.t.Fatal(err)
	}
}

// status waits for the end and gives the exit status.
func (term *terminal) status() int {
	term.t.Helper()
	select {
	case <-term.ended:
	case <-time.After(15 * time.Second):
		term.t.Fatalf("it does not end; the screen:\n%q", term.text())
	}
	err := term.cmd.Wait()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		term.t.Fatal(err)
	}
	return term.cmd.ProcessState.ExitCode()
}

// TestTerminalIsNotQuestioned proves that no command asks the terminal anything as it starts: one that does not answer
// would cost five seconds each time.
func TestTerminalIsNotQuestioned(t *testing.T) {
	term := onTerminal(t, t.TempDir(), "keys", "bus.nominal")
	if s := term.status(); s != exitDone {
		t.Errorf("status %d", s)
	}
	for _, query := range []string{"\x1b]1", "\x1b[6n"} {
		if strings.Contains(term.text(), query) {
			t.Errorf("the terminal is asked %q:\n%q", query, term.text())
		}
	}
}

// TestAloneOnATerminal proves that drivemend alone offers what to do and writes nothing.
func TestAloneOnATerminal(t *testing.T) {
	folder := t.TempDir()
	term := onTerminal(t, folder)
	term.until("resume")
	term.press("\x03")
	if s := term.status(); s != exitDone {
		t.Errorf("status %d:\n%q", s, term.text())
	}
	if files, err := os.ReadDir(folder); err != nil || len(files) != 0 {
		t.Errorf("it wrote %v, %v", files, err)
	}
}

// TestSessionOnATerminal goes through the isolation with menus and fields, tries Enter alone, and stops.
func TestSessionOnATerminal(t *testing.T) {
	folder := t.TempDir()
	term := onTerminal(t, folder, "bench", "pump")
	term.until("Start it?")
	term.press("\r")
	term.until("Is the isolator open")
	term.press("\r")
	term.until("Enter alone confirms nothing")
	term.press("yes\r")
	term.until("Is the motor unplugged")
	term.press("unplugged\r")
	term.until("Does anything else feed")
	term.press("none\r")
	term.until("photographed as it was found")
	term.press("lat\r")
	term.until("What feeds the bus?")
	term.press("\r")
	term.until("Enter alone answers nothing")
	term.press("\x1b[B\r")
	term.until("working voltage of the DC bus")
	term.press("\x03")
	if s := term.status(); s != exitDone {
		t.Errorf("status %d:\n%q", s, term.text())
	}
	raw, err := os.ReadFile(folder + "/pump.yaml")
	if err != nil || !strings.Contains(string(raw), "supply: battery") || !strings.Contains(string(raw), "motor: unplugged") {
		t.Errorf("on disk is %q, %v", raw, err)
	}
}
