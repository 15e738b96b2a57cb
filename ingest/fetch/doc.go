// Package fetch keeps a local copy of a file on a web server up to date, so that
// the feed's folder is read as any other:
//
//	https://host/path/file.csv -> conditional request -> folder/file.csv -> ingest/feed
//
// It asks only for what is new: by ETag and Last-Modified, and for a file that
// grows from the last bytes that it has (Range, RFC 9110), which must be what they
// were. A copy is
// replaced whole or not at all; what is appended is a prefix of what the server
// has, whenever the process is killed.
//
// It waits for no server for ever: there is a time limit on each request and on
// a body that stops coming; temporary trouble is tried again a few times, with
// growing pauses of random length, and otherwise left to the feed's schedule. One
// request goes to a host at a time.
//
// It refuses: redirects from https to http and more than five of them, a body
// that is not as long as was said, a range that is not what was asked for, and
// more bytes than are allowed. Credentials come from files at each request, go to
// no other host, and stand in no error.
package fetch
