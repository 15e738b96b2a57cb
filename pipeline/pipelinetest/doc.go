// Package pipelinetest gives tests real services: a PostgreSQL server a test
// process, a database a test. It is never part of the program.
//
// The server is the one whose binaries THAWLEDGER_TEST_PG names, or else the
// first that the machine has, TimescaleDB preferred and loaded unless
// THAWLEDGER_TEST_PLAIN is set; deploy/test runs everything once with each. Without one, tests are skipped with a loud line,
// and fail where CI is set.
package pipelinetest
