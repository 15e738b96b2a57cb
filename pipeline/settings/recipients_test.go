package settings

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

const told = `stations: [{id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}]
layouts:
  l: {delimiter: ",", names_line: 1, time: {columns: [t], format: YYYY-MM-DD, zone: station, covers: day}, station: {constant: TARN}, values: [{column: temp, variable: air_temp_mean, unit: degC}]}
feeds: [{name: f, folder: f, layout: l}]
sites:
  - id: strip
    station: TARN
    tags: [airfields]
    instructions: {exceeded: "Walk the edges.\nCall the office.", back within: Stand down.}
    surfaces: [{id: apron, design_values: [{kind: thaw, definition: curve, of: air, index: 900, unit: degC.d, direction: not_above, source: drawing}]}]
channels:
  - {name: post, mail: {host: mail.agency.example, from: thaw@agency.example, user: thaw, password_file: secret}}
  - {name: hook, webhook: {url: "https://agency.example/thaw", key_file: secret}}
  - {name: feed, cap: {sender: thaw@agency.example, sender_name: Agency, restriction: staff, listen: "127.0.0.1:0", base_url: "https://agency.example/cap/", feed_id: "tag:agency.example,2031:thaw", title: Thaw}}
recipients:
  - id: duty
    name: Duty engineer
    addresses: {post: duty@agency.example}
    hears: [{tags: [airfields], states: [exceeded, back within], channels: [post]}, {channels: [hook, post]}]
    unit: degF·d
    time_zone: America/Anchorage
    quiet: {from: "22:00", to: "06:30"}
    next: chief
  - {id: chief, hears: [{sites: [strip], surfaces: [apron], channels: [feed]}], gather_for: 0s, remind_every: 0s}
`

func parseTold(t *testing.T, text string) (*Settings, error) {
	t.Helper()
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "secret"), []byte("0123456789abcdef"), 0o600); err != nil {
		t.Fatal(err)
	}
	s, _, err := Parse("f.yaml", []byte(text), dir)
	return s, err
}

func TestRecipients(t *testing.T) {
	s, err := parseTold(t, told)
	if err != nil {
		t.Fatal(err)
	}
	zone, err := time.LoadLocation("America/Anchorage")
	if err != nil {
		t.Fatal(err)
	}
	all := []pipeline.State{pipeline.Exceeded, pipeline.Unknown, pipeline.Expected, pipeline.Near, pipeline.FellShort, pipeline.Within}
	want := []pipeline.Recipient{
		{ID: "duty", Name: "Duty engineer", Addresses: map[string]string{"post": "duty@agency.example"}, Hears: []pipeline.Hearing{
			{Tags: []string{"airfields"}, States: []pipeline.State{pipeline.Exceeded, pipeline.Within}, Channels: []string{"post"}},
			{States: all, Channels: []string{"hook", "post"}},
		}, Unit: pipeline.DegFDays, Zone: zone, Quiet: &pipeline.Quiet{From: 22 * time.Hour, To: 6*time.Hour + 30*time.Minute},
			GatherFor: 10 * time.Minute, RemindEvery: 24 * time.Hour, Next: "chief", NextAfter: 4 * time.Hour},
		{ID: "chief", Name: "chief", Addresses: map[string]string{}, Hears: []pipeline.Hearing{
			{Sites: []string{"strip"}, Surfaces: []string{"apron"}, States: all, Channels: []string{"feed"}}}, Unit: pipeline.DegCDays, Zone: time.UTC},
	}
	sameZone := cmp.Comparer(func(a, b *time.Location) bool { return a.String() == b.String() })
	if diff := cmp.Diff(want, s.Recipients, sameZone); diff != "" {
		t.Errorf("- wanted, + got:\n%s", diff)
	}
	if diff := cmp.Diff(map[pipeline.State]string{pipeline.Exceeded: "Walk the edges.\nCall the office.", pipeline.Within: "Stand down."}, s.Sites[0].Instructions); diff != "" {
		t.Errorf("instructions, - wanted, + got:\n%s", diff)
	}
	shown := s.Text()
	for _, line := range []string{"encryption: \"starttls\" # default", "status: \"Test\" # default", "gather_for: \"10m0s\" # default", "next_after: \"4h0m0s\" # default"} {
		if !strings.Contains(shown, line) {
			t.Errorf("not shown: %s", line)
		}
	}
	if strings.Contains(shown, "0123456789abcdef") {
		t.Error("a secret is shown")
	}
	again, _, err := Parse("f.yaml", []byte(shown), "/")
	if err != nil {
		t.Fatalf("what is shown cannot be read again: %v\n%s", err, shown)
	}
	if again.Hash != s.Hash {
		t.Errorf("what is shown is read as something else: %s", cmp.Diff(shown, again.Text()))
	}
	if diff := cmp.Diff(s.Recipients, again.Recipients, sameZone); diff != "" {
		t.Errorf("read again, - wanted, + got:\n%s", diff)
	}
}

// Each mistake is named with its place, and what would be right.
func TestRecipientsRefused(t *testing.T) {
	for _, test := range []struct{ name, from, to, want string }{
		{"unknown channel", "channels: [post]", "channels: [pots]", `recipients[0].hears[0].channels: there is no channel "pots"; did you mean post?`},
		{"unknown tag", "tags: [airfields], states", "tags: [airfeilds], states", `there is no tag "airfeilds"`},
		{"unknown site", "sites: [strip]", "sites: [stripe]", `there is no site "stripe"; did you mean strip?`},
		{"unknown state", "[exceeded, back within]", "[exceeded, within]", `there is no state "within"`},
		{"no address", "addresses: {post: duty@agency.example}", "addresses: {}", "duty hears by post and has no address there"},
		{"bad address", "duty@agency.example", "duty at agency", `"duty at agency" is no e-mail address`},
		{"address of a channel with its own", "{post: duty@agency.example}", `{post: duty@agency.example, hook: "https://a.example/"}`, "channel hook says itself where notices go"},
		{"zone", "America/Anchorage", "Alaska", `recipients[0].time_zone: "Alaska" is no time zone`},
		{"the machine's zone", "America/Anchorage", "Local", `"Local" is no time zone`},
		{"quiet never ends", `to: "06:30"`, `to: "22:00"`, "it begins when it ends"},
		{"quiet", `to: "06:30"`, `to: "6.30"`, `"6.30" is none`},
		{"next is nobody", "next: chief", "next: cheif", `there is no recipient "cheif"`},
		{"next is oneself", "next: chief", "next: duty", "cannot stand in for itself"},
		{"next after, without next", "next: chief", "next_after: 2h", "nobody is next"},
		{"reminders", "remind_every: 0s", "remind_every: 1m", "1m0s is too often"},
		{"unit", "unit: degF·d", "unit: K.h", `"K.h" is not known; write one of degC.d, degF.d`},
		{"no secret", "key_file: secret", "key_file: nosuch", "channels[1].webhook.key_file"},
		{"secret in the file", "password_file: secret", "password: abc", "channels[0].mail.password: there is no such key"},
		{"in the clear", "host: mail.agency.example", "host: mail.agency.example, encryption: none", "say in why_none why"},
		{"http", "https://agency.example/thaw", "http://agency.example/thaw", "say in why_none why"},
		{"credentials in the address", "https://agency.example/thaw", "https://u:p@agency.example/thaw", "credentials stand in the address"},
		{"two ways", `{name: hook, webhook`, `{name: hook, mail: {host: h, from: a@b.example}, webhook`, "channel hook has 2 of them"},
		{"scope", "restriction: staff", "scope: Private", "channels[2].cap.addresses: it is missing"},
		{"a feed for all to read", "127.0.0.1:0", "0.0.0.0:80", `"0.0.0.0:80" is no loopback address`},
		{"twice", "{id: chief, hears", "{id: duty, hears", "recipient duty stands in line"},
		{"nothing to hear", "hears: [{sites: [strip], surfaces: [apron], channels: [feed]}], gather_for", "gather_for", "recipients[1].hears: it is missing"},
		{"instruction of no state", "{exceeded: ", "{exceded: ", "sites[0].instructions.exceded: there is no such key; did you mean exceeded?"},
	} {
		t.Run(test.name, func(t *testing.T) {
			if !strings.Contains(told, test.from) {
				t.Fatal("nothing to replace")
			}
			_, err := parseTold(t, strings.Replace(told, test.from, test.to, 1))
			if err == nil || !strings.Contains(err.Error(), test.want) || !strings.HasPrefix(err.Error(), "f.yaml:") {
				t.Errorf("%v\ndoes not say %s", err, test.want)
			}
		})
	}
}
