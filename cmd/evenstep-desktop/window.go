package main

import (
	"fmt"

	"github.com/go-gl/glfw/v3.4/glfw"
)

// windowTrouble says why no window can be opened; nil where one can. The toolkit would go on without a
// window, or stop with a trace of its insides, so a hidden window is tried first.
func windowTrouble() (err error) {
	defer func() {
		if r := recover(); r != nil { // the binding panics where the system's library fails in an odd way
			err = fmt.Errorf("%v", r)
		}
	}()
	if err := glfw.Init(); err != nil {
		return err
	}
	defer glfw.Terminate()
	glfw.WindowHint(glfw.Visible, glfw.False)
	glfw.WindowHint(glfw.ContextVersionMajor, 2)
	glfw.WindowHint(glfw.ContextVersionMinor, 0)
	w, err := glfw.CreateWindow(16, 16, "Evenstep", nil, nil)
	if err != nil {
		return err
	}
	w.Destroy()
	return nil
}
