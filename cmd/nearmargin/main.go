// Command nearmargin tells in what tectonic setting a place lies, for one place,
// for a file of them, or as a service.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	p := &program{env: os.Getenv, stdin: os.Stdin, stdout: os.Stdout, stderr: os.Stderr}
	status := p.run(ctx, os.Args[1:])
	stop()
	os.Exit(status)
}
