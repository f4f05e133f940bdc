// Command evenstep judges and calibrates the grays of reading-room monitors from the command line.
// It needs no display. Run "evenstep help" for the commands.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
	"time"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // a second signal ends a program that waits for its input
	p := program{
		in:     os.Stdin,
		out:    os.Stdout,
		err:    os.Stderr,
		now:    time.Now,
		getenv: os.Getenv,
		self:   os.Executable,
	}
	code := p.run(ctx, os.Args[1:])
	stop()
	os.Exit(code)
}
