package deliverytest

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"go.uber.org/goleak"

	"thawledger/alerts/delivery"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// channels are all channels; a new one is a line here and a function like
// startMail.
var channels = []struct {
	name  string
	start func(t *testing.T, b Behaviour, limit time.Duration) rig
}{
	{"mail", startMail},
	{"webhook", startWebhook},
	{"capfeed", startCapfeed},
}

// rig is a channel, and the receiver that it delivers to.
type rig struct {
	channel delivery.Channel
	stalled <-chan struct{} // gets a value when an attempt has come to a stop
	keys    func() []string // of the notices that the receiver took, read from what it was sent

	once   bool   // the receiver itself drops a key that it has
	secret string // must not show in any outcome
}

// absent is a receiver that is not there.
const absent Behaviour = -1

const ample = time.Minute // time limit of a delivery that must not be what ends it

func TestDeliversEverySample(t *testing.T) {
	each(t, Takes, ample, func(t *testing.T, r rig) {
		var want []string
		for _, n := range delivery.Samples() {
			out := deliver(t, r, n)
			if !out.Delivered || out.Again || out.Answer == "" {
				t.Errorf("%s: %+v", n.Key, out)
			}
			want = append(want, n.Key)
		}
		if got := r.keys(); !slices.Equal(got, want) {
			t.Errorf("received %v, want %v", got, want)
		}
	})
}

func TestRepeatsWithTheSameKey(t *testing.T) {
	each(t, Takes, ample, func(t *testing.T, r rig) {
		n := delivery.Samples()[7] // several items
		for range 2 {
			if out := deliver(t, r, n); !out.Delivered {
				t.Errorf("%+v", out)
			}
		}
		want := []string{n.Key, n.Key}
		if r.once {
			want = want[:1]
		}
		if got := r.keys(); !slices.Equal(got, want) {
			t.Errorf("received %v, want %v", got, want)
		}
	})
}

func TestManyAtOnce(t *testing.T) {
	each(t, Takes, ample, func(t *testing.T, r rig) {
		samples := delivery.Samples()
		outcomes := make(chan delivery.Outcome)
		for _, n := range samples {
			go func() { outcomes <- r.channel.Deliver(t.Context(), n) }()
		}
		var want []string
		for _, n := range samples {
			if out := <-outcomes; !out.Delivered {
				t.Errorf("%+v", out)
			}
			want = append(want, n.Key)
		}
		got := r.keys()
		slices.Sort(got)
		slices.Sort(want)
		if !slices.Equal(got, want) {
			t.Errorf("received %v, want %v", got, want)
		}
	})
}

func TestTriesAgainAfterTrouble(t *testing.T) {
	for _, test := range []struct {
		name      string
		behaviour Behaviour
		again     bool
		says      string
	}{
		{"nobody there", absent, true, ""},
		{"refused for now", RefusesForNow, true, Words},
		{"refused for good", RefusesForGood, false, Words},
		{"hangs up", ClosesEarly, true, ""},
	} {
		t.Run(test.name, func(t *testing.T) {
			each(t, test.behaviour, ample, func(t *testing.T, r rig) {
				out := deliver(t, r, delivery.Samples()[0])
				if out.Delivered || out.Again != test.again || out.Answer == "" || !strings.Contains(out.Answer, test.says) {
					t.Errorf("%+v, want again %v and %q", out, test.again, test.says)
				}
				if got := r.keys(); len(got) > 0 {
					t.Errorf("received %v", got)
				}
			})
		})
	}
}

func TestEndsWithItsContext(t *testing.T) {
	each(t, Stalls, ample, func(t *testing.T, r rig) {
		ctx, cancel := context.WithCancel(t.Context())
		outcome := make(chan delivery.Outcome, 1)
		go func() { outcome <- r.channel.Deliver(ctx, delivery.Samples()[0]) }()
		<-r.stalled
		cancel()
		if out := <-outcome; out.Delivered || !out.Again || !strings.Contains(out.Answer, "context canceled") {
			t.Errorf("%+v", out)
		}
	})
}

func TestEndsWithItsTimeLimit(t *testing.T) {
	each(t, Stalls, 50*time.Millisecond, func(t *testing.T, r rig) {
		if out := deliver(t, r, delivery.Samples()[0]); out.Delivered || !out.Again || !strings.Contains(out.Answer, "deadline") {
			t.Errorf("%+v", out)
		}
	})
}

func TestDeliversNothingOnceStopped(t *testing.T) {
	each(t, Takes, ample, func(t *testing.T, r rig) {
		ctx, cancel := context.WithCancel(t.Context())
		cancel()
		if out := r.channel.Deliver(ctx, delivery.Samples()[0]); out.Delivered || !out.Again {
			t.Errorf("%+v", out)
		}
		if got := r.keys(); len(got) > 0 {
			t.Errorf("received %v", got)
		}
	})
}

func TestRefusesFaultyNotices(t *testing.T) {
	for name, bend := range map[string]func(*delivery.Notice){
		"key that breaks a header": func(n *delivery.Notice) { n.Key = "k\r\nBcc: all@fellmoor.example" },
		"figure that is none":      func(n *delivery.Notice) { n.Items[0].Margin.CDays = math.NaN() },
		"nothing to tell":          func(n *delivery.Notice) { n.Items = nil },
	} {
		t.Run(name, func(t *testing.T) {
			each(t, Takes, ample, func(t *testing.T, r rig) {
				n := delivery.Samples()[0]
				bend(&n)
				if out := deliver(t, r, n); out.Delivered || out.Again {
					t.Errorf("%+v", out)
				}
				if got := r.keys(); len(got) > 0 {
					t.Errorf("received %v", got)
				}
			})
		})
	}
}

// Names are typed in by people, and reach headers, HTML and XML.
func TestHostileNames(t *testing.T) {
	each(t, Takes, ample, func(t *testing.T, r rig) {
		n := delivery.Samples()[0]
		n.Recipient.Name = "Duty\r\nBcc: all@fellmoor.example\r\n\r\nbody"
		n.Items[0].SiteName = "<script>alert(1)</script>\r\nThawledger-Key: forged\x00\x1b"
		n.Items[0].Instruction = "]]></description>\x00\r\n.\r\nQUIT\r\n" + strings.Repeat("long ", 3000)
		n.Items[0].Design.Source = "\xff\xfe"
		if out := deliver(t, r, n); !out.Delivered {
			t.Errorf("%+v", out)
		}
		if got := r.keys(); !slices.Equal(got, []string{n.Key}) {
			t.Errorf("received %q", got)
		}
	})
}

// Every folder beside this one that has a Deliver is in the table.
func TestNoChannelIsLeftOut(t *testing.T) {
	found := 0
	files, err := filepath.Glob("../*/*.go")
	if err != nil {
		t.Fatal(err)
	}
	for _, file := range files {
		folder := filepath.Base(filepath.Dir(file))
		if strings.HasSuffix(file, "_test.go") || folder == "deliverytest" {
			continue
		}
		source, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(string(source), ") Deliver(ctx context.Context") {
			continue
		}
		found++
		if !slices.ContainsFunc(channels, func(c struct {
			name  string
			start func(t *testing.T, b Behaviour, limit time.Duration) rig
		}) bool {
			return c.name == folder
		}) {
			t.Errorf("channel %s is not tested", folder)
		}
	}
	if found != len(channels) {
		t.Errorf("%d channels found, %d tested", found, len(channels))
	}
}

func each(t *testing.T, b Behaviour, limit time.Duration, run func(t *testing.T, r rig)) {
	for _, c := range channels {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			run(t, c.start(t, b, limit))
		})
	}
}

// deliver also sees to it that no secret shows.
func deliver(t *testing.T, r rig, n delivery.Notice) delivery.Outcome {
	t.Helper()
	out := r.channel.Deliver(t.Context(), n)
	if r.secret != "" && strings.Contains(out.Answer, r.secret) {
		t.Errorf("outcome shows the secret: %+v", out)
	}
	if strings.ContainsAny(out.Answer, "\r\n") || len([]rune(out.Answer)) > 300 {
		t.Errorf("answer is not one line: %q", out.Answer)
	}
	return out
}

// sampleNumber is the place of a key among the samples.
func sampleNumber(key string) int {
	return slices.IndexFunc(delivery.Samples(), func(n delivery.Notice) bool { return n.Key == key })
}
