package main

import (
	"bufio"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"evenstep/display/store"
)

// desk is a display of its own with a window manager, on which the program is worked by key and pointer.
type desk struct {
	t       *testing.T
	display string
	program string
	home    string
}

// need finds an outside program. Where it is missing the test is skipped, and under CI=true fails.
func need(t *testing.T, names ...string) {
	t.Helper()
	for _, n := range names {
		if _, err := exec.LookPath(n); err != nil {
			if os.Getenv("CI") == "true" {
				t.Fatalf("%s is missing", n)
			}
			t.Skipf("%s is missing", n)
		}
	}
}

// newDesk builds the program and starts a display.
func newDesk(t *testing.T, geometry string) *desk {
	t.Helper()
	need(t, "Xvfb", "openbox", "xdotool", "xclip", "go")
	d := &desk{t: t, home: t.TempDir()}
	d.program = filepath.Join(t.TempDir(), "evenstep-desktop")
	if out, err := exec.Command("go", "build", "-o", d.program, ".").CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	server := exec.Command("Xvfb", "-displayfd", "3", "-screen", "0", geometry)
	server.ExtraFiles = []*os.File{w}
	d.start(server)
	w.Close()
	number, err := bufio.NewReader(r).ReadString('\n')
	if err != nil {
		t.Fatalf("the display does not start: %v", err)
	}
	d.display = ":" + strings.TrimSpace(number)
	d.start(d.command("openbox"))
	return d
}

func (d *desk) start(c *exec.Cmd) {
	d.t.Helper()
	if err := c.Start(); err != nil {
		d.t.Fatal(err)
	}
	d.t.Cleanup(func() {
		_ = c.Process.Kill()
		_ = c.Wait()
	})
}

func (d *desk) command(name string, args ...string) *exec.Cmd {
	c := exec.Command(name, args...)
	c.Env = append(os.Environ(), "DISPLAY="+d.display, "HOME="+d.home, "XDG_CONFIG_HOME="+d.home, "XDG_RUNTIME_DIR="+d.home, "LANG=en_US.UTF-8")
	return c
}

func (d *desk) do(name string, args ...string) string {
	d.t.Helper()
	out, err := d.command(name, args...).CombinedOutput()
	if err != nil {
		d.t.Fatalf("%s %s: %v: %s", name, strings.Join(args, " "), err, out)
	}
	return string(out)
}

// open starts the program on a register and waits for its window.
func (d *desk) open(register string, env ...string) *exec.Cmd {
	d.t.Helper()
	c := d.command(d.program, "--register", register)
	c.Env = append(c.Env, env...)
	c.Stderr = os.Stderr
	d.start(c)
	d.do("xdotool", "search", "--sync", "--onlyvisible", "--name", "^Evenstep$", "windowfocus", "--sync")
	return c
}

// keys presses keys one after the other, slowly enough for a toolkit that reads them once a frame.
func (d *desk) keys(names ...string) {
	d.t.Helper()
	d.do("xdotool", append([]string{"key", "--delay", "25"}, names...)...)
}

// typed types a text and presses Enter.
func (d *desk) typed(s string) {
	d.t.Helper()
	d.do("xdotool", "type", "--delay", "15", s)
	d.keys("Return")
}

// click presses the pointer's button at a place in the window, in pixels from its top left.
func (d *desk) click(x, y int) {
	d.t.Helper()
	window := strings.Fields(d.do("xdotool", "search", "--onlyvisible", "--name", "^Evenstep$"))[0]
	d.do("xdotool", "mousemove", "--sync", "--window", window, strconv.Itoa(x), strconv.Itoa(y), "click", "1")
}

// until waits for something to be so in the register.
func (d *desk) until(register, what string, so func(*store.Store) bool) {
	d.t.Helper()
	s, err := store.Open(register)
	if err != nil {
		d.t.Fatal(err)
	}
	defer s.Close()
	deadline := time.After(30 * time.Second)
	tick := time.NewTicker(30 * time.Millisecond)
	defer tick.Stop()
	for !so(s) {
		select {
		case <-deadline:
			d.picture("failed")
			d.t.Fatalf("after half a minute it is not so that %s", what)
		case <-tick.C:
		}
	}
}

// picture keeps a picture of the screen where EVENSTEP_PICTURES names a folder.
func (d *desk) picture(name string) {
	dir := os.Getenv("EVENSTEP_PICTURES")
	if dir == "" {
		return
	}
	_ = d.command("import", "-window", "root", filepath.Join(dir, name+".png")).Run()
}

// kill ends the program as a power cut would.
func kill(t *testing.T, c *exec.Cmd) {
	t.Helper()
	if err := c.Process.Signal(syscall.SIGKILL); err != nil && !errors.Is(err, os.ErrProcessDone) {
		t.Fatal(err)
	}
	_ = c.Wait()
}

// quit closes the window as a person does, and checks that the program ends by itself.
func (d *desk) quit(c *exec.Cmd) {
	d.t.Helper()
	d.keys("alt+F4") // the window manager asks the window to close
	done := make(chan error, 1)
	go func() { done <- c.Wait() }()
	select {
	case err := <-done:
		if err != nil {
			d.t.Errorf("the program ended with %v", err)
		}
	case <-time.After(20 * time.Second):
		d.t.Error("the program does not end when its window is closed")
	}
}
