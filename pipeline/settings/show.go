package settings

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"net/url"
	"strconv"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// Text returns the settings in force as YAML that can be loaded again to the
// same: stations written out, defaults marked, secrets left out.
func (s *Settings) Text() string { return s.text }

// Show writes Text.
func (s *Settings) Show(w io.Writer) error {
	_, err := io.WriteString(w, s.text)
	return err
}

// finish writes the settings' text and hash.
func (s *Settings) finish() {
	plain := s.write(false)
	sum := sha256.Sum256(plain)
	s.Hash = hex.EncodeToString(sum[:])
	s.text = string(s.write(true))
}

// tree builds a mapping; entries that the file leaves to their defaults are
// marked as such.
type tree struct {
	node *yaml.Node
	path string
	s    *Settings
	mark bool
}

func (t *tree) key(key string, v *yaml.Node) {
	k := &yaml.Node{Kind: yaml.ScalarNode, Value: key, Style: keyStyle(key)}
	if t.mark && t.s.defaulted[t.at(key)] {
		v.LineComment = "default"
	}
	t.node.Content = append(t.node.Content, k, v)
}

// keyStyle quotes what would not be read back as text.
func keyStyle(key string) yaml.Style {
	if _, err := strconv.ParseFloat(key, 64); err == nil {
		return yaml.DoubleQuotedStyle
	}
	return 0
}

func (t *tree) at(key string) string {
	if t.path == "" {
		return key
	}
	return t.path + "." + key
}

func (t *tree) text(key, v string) {
	t.key(key, &yaml.Node{Kind: yaml.ScalarNode, Value: v, Style: yaml.DoubleQuotedStyle})
}

// word writes a text that is there only if it is not empty.
func (t *tree) word(key, v string) {
	if v != "" {
		t.text(key, v)
	}
}

func (t *tree) number(key string, v float64) {
	t.key(key, &yaml.Node{Kind: yaml.ScalarNode, Value: strconv.FormatFloat(v, 'g', -1, 64)})
}

func (t *tree) yes(key string, v bool) {
	t.key(key, &yaml.Node{Kind: yaml.ScalarNode, Value: strconv.FormatBool(v)})
}

func (t *tree) duration(key string, d time.Duration) { t.text(key, d.String()) }

func (t *tree) sub(key string, f func(*tree)) {
	c := &tree{&yaml.Node{Kind: yaml.MappingNode}, t.at(key), t.s, t.mark}
	f(c)
	t.key(key, c.node)
}

func (t *tree) list(key string, n int, f func(i int, c *tree)) {
	l := &yaml.Node{Kind: yaml.SequenceNode}
	for i := range n {
		c := &tree{&yaml.Node{Kind: yaml.MappingNode}, fmt.Sprintf("%s[%d]", t.at(key), i), t.s, t.mark}
		f(i, c)
		l.Content = append(l.Content, c.node)
	}
	t.key(key, l)
}

func (t *tree) texts(key string, list []string) {
	if len(list) > 0 {
		t.key(key, textNodes(list))
	}
}

func textNodes(list []string) *yaml.Node {
	l := &yaml.Node{Kind: yaml.SequenceNode, Style: yaml.FlowStyle}
	for _, v := range list {
		l.Content = append(l.Content, &yaml.Node{Kind: yaml.ScalarNode, Value: v, Style: yaml.DoubleQuotedStyle})
	}
	return l
}

func (s *Settings) write(mark bool) []byte {
	t := &tree{&yaml.Node{Kind: yaml.MappingNode}, "", s, mark}
	t.word("data", s.Data)
	t.sub("store", func(t *tree) {
		if s.urlFile != "" {
			t.text("url_file", s.urlFile)
		} else {
			t.word("url", withoutPassword(s.Store.URL))
		}
		if s.Store.Binaries != "" {
			t.sub("private", func(t *tree) { t.text("binaries", s.Store.Binaries) })
		}
	})
	t.sub("bus", func(t *tree) {
		t.word("listen", s.Bus.Listen)
		if s.Bus.URL != "" {
			t.text("url", withoutPassword(s.Bus.URL))
			t.word("credentials_file", s.Bus.CredentialsFile)
			t.number("replicas", float64(s.Bus.Replicas))
		}
	})
	t.sub("work", func(t *tree) {
		t.number("commit_readings", float64(s.Work.CommitReadings))
		t.duration("republish_after", s.Work.RepublishAfter)
		t.number("republish_allowed", float64(s.Work.RepublishAllowed))
		t.number("failures_allowed", float64(s.Work.FailuresAllowed))
		t.duration("idle_deadline", s.Work.IdleDeadline)
	})
	if s.Listen.Address != "" {
		t.sub("push", func(t *tree) {
			t.text("listen", s.Listen.Address)
			t.word("certificate_file", s.Listen.CertificateFile)
			t.word("key_file", s.Listen.KeyFile)
			t.yes("plain", s.Listen.Plain)
		})
	}
	t.list("stations", len(s.Stations), func(i int, t *tree) { writeStation(t, &s.Stations[i]) })
	t.sub("layouts", func(t *tree) {
		for _, name := range s.order {
			t.sub(name, func(t *tree) { writeLayout(t, s.Layouts[name]) })
		}
	})
	t.list("feeds", len(s.Feeds), func(i int, t *tree) { writeFeed(t, &s.Feeds[i]) })
	t.list("sites", len(s.Sites), func(i int, t *tree) { writeSite(t, &s.Sites[i]) })
	if len(s.Channels) > 0 {
		t.list("channels", len(s.Channels), func(i int, t *tree) { writeChannel(t, &s.Channels[i]) })
	}
	if len(s.Recipients) > 0 {
		t.list("recipients", len(s.Recipients), func(i int, t *tree) { writeRecipient(t, &s.Recipients[i]) })
	}
	var out bytes.Buffer
	e := yaml.NewEncoder(&out)
	e.SetIndent(2)
	if err := e.Encode(t.node); err != nil {
		panic("settings: " + err.Error()) // nodes built above can always be written
	}
	e.Close()
	return out.Bytes()
}

// withoutPassword leaves a password in an address out.
func withoutPassword(address string) string {
	u, err := url.Parse(address)
	if err != nil || u.User == nil {
		return address
	}
	if _, has := u.User.Password(); has {
		u.User = url.User(u.User.Username())
	}
	return u.String()
}

func writeStation(t *tree, st *pipeline.Station) {
	t.text("id", st.ID)
	t.text("name", st.Name)
	t.number("latitude", st.LatitudeD)
	t.number("longitude", st.LongitudeD)
	t.number("elevation_m", st.ElevationM)
	t.text("utc_offset", offsetText(st.UTCOffset))
	t.text("day_starts", fmt.Sprintf("%02d:%02d", int(st.DayStarts.Hours()), int(st.DayStarts.Minutes())%60))
	if len(st.Joined) == 0 {
		t.sub("daily_mean", func(t *tree) {
			t.text("rule", string(st.Mean))
			t.number("min_hours", float64(st.MinHours))
			t.number("longest_hole", float64(st.MaxHole))
		})
	}
	t.number("base_c", st.BaseC)
	t.number("fill_days", float64(st.FillDays))
	if len(st.Bases) > 0 {
		t.list("base_by_date", len(st.Bases), func(i int, t *tree) {
			t.text("from", st.Bases[i].From.String())
			t.number("base_c", st.Bases[i].BaseC)
		})
	}
	t.text("measures", string(st.Measures))
	t.texts("neighbours", st.Neighbours)
	t.yes("climatology_fills", st.ClimateFills)
	t.text("thaw_year", st.ThawYear.String())
	t.text("freeze_year", st.FreezeYear.String())
	if len(st.Facts) > 0 {
		t.list("history", len(st.Facts), func(i int, t *tree) {
			f := &st.Facts[i]
			t.text("what", string(f.What))
			t.text("from", f.From.String())
			t.text("to", f.To.String())
			t.word("note", f.Note)
		})
	}
	if len(st.Joined) > 0 {
		t.list("joined", len(st.Joined), func(i int, t *tree) { writeMember(t, &st.Joined[i]) })
	}
}

func writeMember(t *tree, m *pipeline.Member) {
	t.text("station", m.Station)
	if m.Until != nil {
		t.text("until", m.Until.String())
	}
	l := &yaml.Node{Kind: yaml.SequenceNode, Style: yaml.FlowStyle}
	for _, c := range m.AdjustC {
		l.Content = append(l.Content, &yaml.Node{Kind: yaml.ScalarNode, Value: strconv.FormatFloat(c, 'g', -1, 64)})
	}
	t.key("adjust_c", l)
	t.number("error_c", m.ErrorC)
	t.word("source", m.Source)
}

func offsetText(d time.Duration) string {
	sign := "+"
	if d < 0 {
		sign, d = "-", -d
	}
	return fmt.Sprintf("%s%02d:%02d", sign, int(d.Hours()), int(d.Minutes())%60)
}

func writeFeed(t *tree, f *pipeline.Feed) {
	t.text("name", f.Name)
	t.word("folder", f.Folder)
	if m := f.Remote; m != nil {
		t.sub("url", func(t *tree) {
			t.text("address", m.URL)
			t.word("user", m.User)
			t.word("password_file", m.PasswordFile)
			t.word("bearer_file", m.BearerFile)
			t.duration("timeout", m.Timeout)
		})
	}
	if f.Push != nil {
		t.sub("push", func(t *tree) {
			t.text("token_file", f.Push.TokenFile)
			t.number("max_megabytes", float64(f.Push.MaxBytes>>20))
		})
	}
	t.text("pattern", f.Pattern)
	t.yes("subfolders", f.Subfolders)
	t.duration("settle", f.Settle)
	t.text("every", f.Schedule)
	t.number("rank", float64(f.Rank))
	t.yes("replaces_span", f.ReplacesSpan)
	t.yes("grows", f.Grows)
	t.text("layout", f.Layout.Name)
	t.sub("station", func(t *tree) { writeStationColumn(t, &f.Layout.Station) })
}

func writeSite(t *tree, site *pipeline.Site) {
	t.text("id", site.ID)
	t.text("name", site.Name)
	t.text("station", site.Station)
	writeSiteWords(t, site)
	t.list("surfaces", len(site.Surfaces), func(i int, t *tree) {
		s := &site.Surfaces[i]
		t.text("id", s.ID)
		t.text("name", s.Name)
		t.list("n_factors", len(s.Factors), func(i int, t *tree) {
			f := &s.Factors[i]
			t.text("kind", string(f.Kind))
			t.text("from", f.From.String())
			t.number("value", f.Value)
			if f.Low != f.High {
				t.number("low", f.Low)
				t.number("high", f.High)
			}
			t.text("source", f.Source)
		})
		t.word("measured_by", s.MeasuredBy)
		writeGround(t, s.Ground)
		t.list("design_values", len(s.Designs), func(i int, t *tree) {
			d := &s.Designs[i]
			t.text("kind", string(d.Kind))
			t.text("definition", string(d.Definition))
			t.text("of", string(d.Of))
			if d.DepthM != nil {
				t.number("depth_m", *d.DepthM)
			} else {
				t.number("index", d.Index)
				t.text("unit", string(d.Unit))
			}
			t.number("base_c", d.BaseC)
			t.text("direction", string(d.Direction))
			t.text("from", d.From.String())
			t.number("near_share", d.NearShare)
			t.text("source", d.Source)
		})
	})
}
