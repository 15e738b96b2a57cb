package pipeline

import "time"

// Remote is a file on a web server.
type Remote struct {
	URL          string // http or https, without credentials
	User         string // with PasswordFile: basic authentication
	PasswordFile string
	BearerFile   string // file that holds a bearer token
	Timeout      time.Duration
}

// Push says how files of a feed may be pushed to us.
type Push struct {
	TokenFile string // file that holds the feed's token
	MaxBytes  int64
}
