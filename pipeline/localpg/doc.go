// Package localpg runs a private PostgreSQL server under a data folder, for as
// long as the daemon that owns it lives.
//
//	Find -> Pick -> Start -> DSN ... Exited, Stop
//
// The folder (Config.Dir) then holds
//
//	cluster/          what PostgreSQL itself keeps; its user's, mode 0700
//	made.json         which PostgreSQL made it, with or without TimescaleDB
//	socket/           the only way in; mode 0700
//	server.log        what the server says, 8 MB at most; server.log.1 before it
//
// # What it promises
//
// A folder is either whole or not there: initdb works in a folder beside
// `cluster`, which is renamed when complete. Settings that matter are given on
// the command line at each start; others can be added to
// cluster/postgresql.conf. Nothing listens on the network. If the daemon is
// killed, the kernel tells the server to shut down; a server or its processes
// that live on regardless are stopped by the next Start. What was committed
// stays committed, unless Config.Durable is off.
//
// Run by root, the server gets an account of its own (postgres, else
// thawledger, else nobody; a folder that exists keeps its owner).
// Whoever may enter the socket's folder (that account, and root) is
// the database's superuser "thawledger"; nobody asks for a password.
//
// # What it refuses
//
// A cluster of another major version, and one made with TimescaleDB on an
// installation without it. Binaries older than PostgreSQL 15. A folder that the
// server's account can't reach.
//
// The caller holds a lock on the data folder: Start takes any server that it
// finds there for one left over. Linux only.
package localpg
