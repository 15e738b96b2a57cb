// Package webhook delivers notices to a web address, as signed JSON.
//
//	POST <address>
//	Content-Type: application/json
//	Thawledger-Time: 2031-08-21T14:00:03Z       when this attempt was made
//	Thawledger-Key: n-31-0821-1                 the notice's key: the same at every attempt
//	Thawledger-Proof: hmac-sha256 5f0c...       see below
//
//	{"version":1,"key":"n-31-0821-1", ...}      notice.v1.schema.json
//
// The proof is HMAC-SHA256 (RFC 2104, FIPS 180-4), in lower-case hexadecimal,
// under a key that both sides hold in a file, over the bytes of the
// Thawledger-Time header, a full stop, and the body as sent. A receiver works it
// out for itself, compares in constant time, refuses a time too far from its own
// clock, and drops a key that it has had; Verifier does that, for receivers
// written in Go. The key that counts is the one in the body: headers other than
// the time are not covered by the proof.
//
// Any answer of 200 to 299 means taken. 408, 425, 429, 500 to 599 and trouble
// with the connection are tried again, not before what a Retry-After header
// asks for (RFC 9110, section 10.2.3), up to a limit. Other answers are final. A
// redirect is followed only within the same host and only where the method stays
// (307, 308).
//
// The body's version changes when a field is taken away or changes its meaning,
// not when one is added: receivers ignore fields that they do not know.
package webhook
