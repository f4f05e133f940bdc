package main

import (
	"fmt"

	"github.com/go-gl/glfw/v3.4/glfw"
)

// tryWindow says why no window can be opened; nil where one can, with the pixels that the screen has for
// it. The toolkit would go on without a window, or stop with a trace of its insides, so a hidden window
// is tried first.
func tryWindow() (width, height int, err error) {
	defer func() {
		if r := recover(); r != nil { // the binding panics where the system's library fails in an odd way
			err = fmt.Errorf("%v", r)
		}
	}()
	if err := glfw.Init(); err != nil {
		return 0, 0, err
	}
	defer glfw.Terminate()
	glfw.WindowHint(glfw.Visible, glfw.False)
	glfw.WindowHint(glfw.ContextVersionMajor, 2)
	glfw.WindowHint(glfw.ContextVersionMinor, 0)
	w, err := glfw.CreateWindow(16, 16, "Evenstep", nil, nil)
	if err != nil {
		return 0, 0, err
	}
	w.Destroy()
	if m := glfw.GetPrimaryMonitor(); m != nil {
		_, _, width, height = m.GetWorkarea()
	}
	return width, height, nil
}
