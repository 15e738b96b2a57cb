package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
	"testing"

	"thawledger/pipeline/pipelinetest"
)

// TestMain lets a test start the program in a process of its own: this binary,
// with THAWLEDGER_TEST_AS=daemon, is thawledger.
func TestMain(m *testing.M) {
	if os.Getenv("THAWLEDGER_TEST_AS") == "daemon" {
		ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
		code := program{out: os.Stdout, err: os.Stderr, hurry: second(ctx)}.main(ctx, os.Args[1:])
		stop()
		os.Exit(code)
	}
	pipelinetest.Main(m)
}
