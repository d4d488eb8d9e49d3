package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

// untilHangup is ctx until the terminal hangs up. Until done is called, no signal short of SIGKILL ends the program by
// itself: it has a supply to switch off first. A closed pipe or terminal behind stderr is an error of the write, no more.
func untilHangup(ctx context.Context) (_ context.Context, done func()) {
	ctx, stop := signal.NotifyContext(ctx, syscall.SIGHUP)
	held := make(chan os.Signal, 1)
	signal.Notify(held, os.Interrupt, syscall.SIGTERM, syscall.SIGPIPE)
	return ctx, func() {
		stop()
		signal.Stop(held)
	}
}
