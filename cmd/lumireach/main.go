// Command lumireach estimates the expected discovery and exclusion reach of a
// search against integrated luminosity, by the asymptotic formulas and by toys.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	go func() {
		<-ctx.Done()
		stop() // a second signal ends the program at once
	}()
	os.Exit(run(ctx, os.Args, os.Stdout, os.Stderr))
}
