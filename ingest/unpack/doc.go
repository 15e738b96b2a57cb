// Package unpack turns a delivery, as received, into the UTF-8 text that
// ingest/csvfeed reads:
//
//	bytes -> gzip, zstd or neither -> expanded, within limits -> text -> UTF-8
//	   \-> zip: a fault            \-> too much: a fault      \-> not of the declared encoding: a fault
//
// Compression is recognised by a delivery's first bytes, never by its name. It is
// undone once: gzip within gzip comes out as the bytes that it is, which csvfeed
// sets aside line by line. The encoding is declared, never guessed. Only a byte
// order mark is believed against the declaration, and then the delivery is
// refused, since one of the two is wrong.
//
// What it promises: UTF-8 passes through as it is, marks and invalid bytes
// included, without being looked at; from every other encoding comes valid
// UTF-8. Memory does not grow with the delivery or what it expands to: a zstd
// window may be 32 MiB, and all else is a few hundred KiB. No goroutine is
// started.
//
// What it refuses, with a *FaultError that says where and what would be right:
// a zip archive, damaged or shortened compression, anything after the last gzip
// member or zstd frame, zstd with a dictionary or a larger window, more text
// than the limits allow, another byte order mark than the declared encoding's,
// and bytes that stand for nothing in it. The text that came before a fault is
// part of a spoilt delivery and counts for nothing.
//
// Encodings: utf-16 goes by its byte order mark, and without one is little
// endian, as the WHATWG Encoding Standard has it (RFC 2781 would have big
// endian). A mark in text declared utf-16le or utf-16be must agree with it. Marks
// of UTF-16 are dropped. latin-1 is ISO 8859-1, where 0x80 to 0x9F are control
// characters, and not the WHATWG's, which is windows-1252. windows-1252 is
// the WHATWG's index but for 0x81, 0x8D, 0x8F, 0x90 and 0x9D: that maps them to
// control characters, Microsoft's table leaves them undefined, and here they are
// a fault, since no station means them.
package unpack
