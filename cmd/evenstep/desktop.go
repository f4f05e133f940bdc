package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
)

// startDesktop runs the window program, which lies beside this one or in PATH.
func (p program) startDesktop(ctx context.Context) error {
	name := "evenstep-desktop"
	if runtime.GOOS == "windows" {
		name += ".exe"
	}
	path := ""
	if self, err := p.self(); err == nil {
		if beside := filepath.Join(filepath.Dir(self), name); executable(beside) {
			path = beside
		}
	}
	if path == "" {
		found, err := exec.LookPath(name)
		if err != nil {
			return system(fmt.Errorf("%s is neither beside this program nor in PATH; the window is a program of its own; install it there, or use the commands: run \"evenstep help\"", name))
		}
		path = found
	}
	cmd := exec.CommandContext(ctx, path)
	cmd.Stdin, cmd.Stdout, cmd.Stderr = p.in, p.out, p.err
	err := cmd.Run()
	var exit *exec.ExitError
	if errors.As(err, &exit) {
		return &failure{code: exit.ExitCode(), err: errors.New("")} // the window program has said why
	}
	if err != nil {
		return system(fmt.Errorf("%s does not start: %w", path, err))
	}
	return nil
}

func executable(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.Mode().IsRegular() && (runtime.GOOS == "windows" || info.Mode()&0o111 != 0)
}
