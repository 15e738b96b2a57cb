// Package deliverytest has the receivers that channels are tested against, and
// the tests that every channel passes.
//
// The receivers are real: they listen on a port of this machine and speak the
// whole protocol, and misbehave on request. The tests are in suite_test.go; a
// new channel adds a line to the table there, and a function that starts its
// receiver. Nothing here is part of the program.
package deliverytest
