// Command thawledger keeps account of how much thaw each surface on frozen
// ground has taken, from station CSV feeds to design values. See README.md.
package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"
	_ "time/tzdata" // the machine may have none
)

// program is what a command may use of the world, so that tests can give their own.
type program struct {
	out, err io.Writer
	stdin    io.Reader       // os.Stdin if nil
	hurry    <-chan struct{} // a second signal
}

// errUsage says that a command was called wrongly; its flags have said how.
var errUsage = errors.New("wrong call")

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	p := program{out: os.Stdout, err: os.Stderr, hurry: second(ctx)}
	os.Exit(p.main(ctx, os.Args[1:]))
}

// second returns a channel that closes at the signal after the one that ended ctx.
func second(ctx context.Context) <-chan struct{} {
	hurry := make(chan struct{})
	go func() {
		<-ctx.Done()
		again := make(chan os.Signal, 1)
		signal.Notify(again, os.Interrupt, syscall.SIGTERM)
		<-again
		close(hurry)
	}()
	return hurry
}

// main runs a command and returns its exit status: 0 done, 1 failed, 2 called
// wrongly.
func (p program) main(ctx context.Context, args []string) int {
	err := p.run(ctx, args)
	switch {
	case err == nil:
		return 0
	case errors.Is(err, flag.ErrHelp):
		return 0
	case errors.Is(err, errUsage):
		return 2
	}
	fmt.Fprintf(p.err, "thawledger: %v\n", err)
	return 1
}
