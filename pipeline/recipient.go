package pipeline

import (
	"slices"
	"time"
)

// Operator is the id of the recipient, if there is one, who is told of notices
// that could not be delivered.
const Operator = "operator"

// Recipient is somebody who is told how surfaces stand.
type Recipient struct {
	ID   string
	Name string
	// Addresses are where the recipient is reached, by channel. A channel that
	// says itself where its notices go needs none.
	Addresses map[string]string
	Hears     []Hearing
	Unit      IndexUnit // DegCDays or DegFDays
	Zone      *time.Location
	Quiet     *Quiet // nil for none

	// GatherFor is how long a change waits for others to go with it in one
	// message.
	GatherFor time.Duration
	// RemindEvery is how often the recipient is reminded of an exceedance that
	// still stands and that nobody has marked as seen; 0 for never.
	RemindEvery time.Duration
	// Next is who is told instead if nobody has marked an exceedance as seen
	// within NextAfter; "" for nobody.
	Next      string
	NextAfter time.Duration
}

// Hearing is what a recipient wants to hear of. An empty list is all there are.
type Hearing struct {
	Sites    []string // a site is meant by its id or by a tag
	Tags     []string
	Surfaces []string
	States   []State
	Channels []string
}

// Of says whether a surface is meant.
func (h *Hearing) Of(site *Site, surface string) bool {
	if len(h.Sites)+len(h.Tags) > 0 && !slices.Contains(h.Sites, site.ID) &&
		!slices.ContainsFunc(h.Tags, func(tag string) bool { return slices.Contains(site.Tags, tag) }) {
		return false
	}
	return len(h.Surfaces) == 0 || slices.Contains(h.Surfaces, surface)
}

// Channels returns the channels that the recipient is told by, in the order in
// which the settings first name them.
func (r *Recipient) Channels() (out []string) {
	for i := range r.Hears {
		for _, c := range r.Hears[i].Channels {
			if !slices.Contains(out, c) {
				out = append(out, c)
			}
		}
	}
	return out
}

// Quiet is the hours of the night in which a recipient is told nothing: by the
// clock on the recipient's wall, From included and To not. They may go across
// midnight.
type Quiet struct {
	From, To time.Duration // after midnight, whole minutes, different
}

// Channel is a way by which notices are sent; one of Mail, Webhook and CAP is
// not nil.
type Channel struct {
	Name    string
	Mail    *MailChannel
	Webhook *WebhookChannel
	CAP     *CAPChannel
}

// Addressed says whether a recipient needs an address of its own.
func (c *Channel) Addressed() bool {
	return c.Mail != nil || c.Webhook != nil && c.Webhook.Address == ""
}

// MailChannel is an SMTP server.
type MailChannel struct {
	Host         string
	Port         int    // 0 for the usual one
	Encryption   string // starttls, tls or none
	WhyNone      string // with none
	From         string
	ReplyTo      string
	User         string // with PasswordFile, or neither
	PasswordFile string
}

// WebhookChannel is a web address that notices are posted to.
type WebhookChannel struct {
	Address string // "" for each recipient's own
	WhyNone string // why an address may be http
	KeyFile string
}

// CAPChannel is a feed of CAP 1.2 messages.
type CAPChannel struct {
	Sender, SenderName, Contact string
	Actual                      bool
	Scope                       string // Restricted or Private
	Restriction                 string
	Addresses                   []string
	Language                    string
	Listen                      string // host:port at which the feed is served
	BaseURL, FeedID, Title      string
}
