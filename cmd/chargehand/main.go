// Command chargehand commissions the tie of a battery, supercapacitor or other source to a common DC bus: desk checks and a
// dry run before travel, a walk at the switchboard with live readings against predictions, and a signed log afterwards.
//
// Start at run: it is the whole program with its surroundings handed in.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	code := run(ctx, os.Args[1:], surroundings{
		in: os.Stdin, out: os.Stdout, err: os.Stderr, env: os.LookupEnv, folder: ".",
	})
	stop()
	os.Exit(code)
}
