package capfeed

import (
	"cmp"
	"errors"
	"fmt"
	"net/url"
	"slices"
	"strings"
	"time"

	"thawledger/pipeline"
)

// Scope is who messages are meant for, in CAP 1.2's words. Public is not offered.
type Scope string

// The scopes.
const (
	Restricted Scope = "Restricted" // those whom Settings.Restriction describes
	Private    Scope = "Private"    // those whom Settings.Addresses names
)

// Settings are the settings of the feed and its messages.
type Settings struct {
	// Sender identifies the agency worldwide, as thaw@agency.example. Neither it
	// nor a message's identifier has spaces, commas, < or &. It must not change,
	// or updates would refer to messages that never were.
	Sender     string
	SenderName string // the agency's name
	Contact    string // whom to ask; may be empty

	Actual bool // messages say Actual; else they say Test and are to be disregarded

	Scope       Scope    // Restricted if empty
	Restriction string   // for Restricted: for whom, in words
	Addresses   []string // for Private

	Language   string   // of the texts, as en-US; en if empty
	Categories []string // CAP 1.2's; Geo and Infra if empty

	// RadiusKM is the circle about a site's position where it has no outline;
	// 1 km if 0.
	RadiusKM float64

	// Lasts is how long a message holds if nothing follows; seven days if 0.
	Lasts time.Duration

	// Grades stand in for those of single states.
	Grades map[pipeline.State]Grade

	// BaseURL is where Handler is reached from outside, as
	// https://agency.example/cap/
	BaseURL string
	// FeedID is the feed's name for good, an IRI such as
	// tag:agency.example,2031:thaw (RFC 4151).
	FeedID string
	Title  string // of the feed
	Most   int    // messages on the feed; 100 if 0

	// Timeout is the longest that keeping a message may take; 10 s if 0.
	Timeout time.Duration

	Now func() time.Time // the clock
}

// Check says everything that is wrong with the settings; nil if nothing is.
func (s *Settings) Check() error {
	var faults []error
	add := func(bad bool, format string, args ...any) {
		if bad {
			faults = append(faults, fmt.Errorf(format, args...))
		}
	}
	add(s.Sender == "" || strings.ContainsAny(s.Sender, " ,<&\t\r\n"), "sender %q is empty, or has a space, a comma, < or &", s.Sender)
	add(strings.TrimSpace(s.SenderName) == "", "the sender's name is missing")
	switch s.Scope {
	case "", Restricted:
		add(strings.TrimSpace(s.Restriction) == "", "scope is Restricted: say for whom")
		add(len(s.Addresses) > 0, "scope is Restricted: addresses are for Private")
	case Private:
		add(len(s.Addresses) == 0, "scope is Private: name the addresses")
		add(s.Restriction != "", "scope is Private: a restriction is for Restricted")
		for _, a := range s.Addresses {
			add(strings.TrimSpace(a) == "" || strings.ContainsAny(a, "\"\r\n"), "address %q is empty or has a quotation mark", a)
		}
	default:
		add(true, "scope %q is neither Restricted nor Private", s.Scope)
	}
	for _, c := range s.Categories {
		add(!slices.Contains(categories, c), "category %q is none of %s", c, strings.Join(categories, ", "))
	}
	for state, g := range s.Grades {
		if err := g.check(); err != nil {
			add(true, "grade of %s: %v", state, err)
		}
	}
	base, err := url.Parse(s.BaseURL)
	add(err != nil || base.Host == "" || base.Scheme != "https" && base.Scheme != "http" || !strings.HasSuffix(base.Path, "/") || base.RawQuery != "",
		"base address %q is not one such as https://agency.example/cap/", s.BaseURL)
	id, err := url.Parse(s.FeedID)
	add(err != nil || !id.IsAbs(), "feed's name %q is not one such as tag:agency.example,2031:thaw", s.FeedID)
	add(strings.TrimSpace(s.Title) == "", "the feed has no title")
	add(!(s.RadiusKM >= 0 && s.RadiusKM < 1000), "radius %v km is not from 0 to 1000", s.RadiusKM)
	add(s.Lasts < 0 || s.Timeout < 0 || s.Most < 0, "a limit is below 0")
	add(s.Now == nil, "there is no clock")
	return errors.Join(faults...)
}

func (s *Settings) scope() Scope           { return cmp.Or(s.Scope, Restricted) }
func (s *Settings) language() string       { return cmp.Or(s.Language, "en") }
func (s *Settings) lasts() time.Duration   { return cmp.Or(s.Lasts, 7*24*time.Hour) }
func (s *Settings) timeout() time.Duration { return cmp.Or(s.Timeout, 10*time.Second) }
func (s *Settings) radiusKM() float64      { return cmp.Or(s.RadiusKM, 1) }
func (s *Settings) most() int              { return cmp.Or(s.Most, 100) }

func (s *Settings) categories() []string {
	if len(s.Categories) == 0 {
		return []string{"Geo", "Infra"}
	}
	return s.Categories
}

// status is CAP 1.2's status of a message.
func (s *Settings) status(drill bool) string {
	switch {
	case drill:
		return "Exercise"
	case s.Actual:
		return "Actual"
	}
	return "Test"
}
