// Package store is the only importer of the database client. It holds the
// schema `thaw`, brings a database up to it, and has one file a family of
// questions: the ledger (batch.go, part.go), taking (take.go, readings.go,
// record.go), judging (judging.go) and what commands show (show.go).
//
// TimescaleDB is the store; PostgreSQL 15 and later works with the same schema
// as ordinary tables.
//
// Every write is idempotent: a transaction whose commit may or may not have
// arrived can always be tried again whole. Errors answer one question,
// Temporary: whether the database was out of reach rather than unwilling.
package store
