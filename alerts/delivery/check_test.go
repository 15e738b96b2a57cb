package delivery

import (
	"math"
	"strings"
	"testing"
	"time"

	"thawledger/pipeline"
)

func TestSamplesPassTheCheck(t *testing.T) {
	seen := map[pipeline.State]bool{}
	kinds := map[Kind]bool{}
	for _, n := range Samples() {
		if err := n.Check(); err != nil {
			t.Error(err)
		}
		kinds[n.Kind] = true
		for _, i := range n.Items {
			seen[i.To] = true
		}
	}
	if len(seen) != 6 || len(kinds) != 5 {
		t.Errorf("samples show %d of 6 states and %d of 5 kinds", len(seen), len(kinds))
	}
}

func TestCheckSaysWhatIsWrong(t *testing.T) {
	for _, test := range []struct {
		name string
		bend func(*Notice)
		says string
	}{
		{"key breaks a header", func(n *Notice) { n.Key = "a\r\nBcc: x" }, "key"},
		{"no key", func(n *Notice) { n.Key = "" }, "key"},
		{"key too long", func(n *Notice) { n.Key = strings.Repeat("k", 81) }, "key"},
		{"kind", func(n *Notice) { n.Kind = "alarm" }, "kind"},
		{"no items", func(n *Notice) { n.Items = nil }, "no items"},
		{"never written", func(n *Notice) { n.Written = time.Time{} }, "when it was written"},
		{"unit of nothing shown", func(n *Notice) { n.Recipient.Unit = pipeline.KelvinHours }, "K.h"},
		{"drill among news", func(n *Notice) { n.Items[0].Kind = Drill }, "stands alone"},
		{"not a number", func(n *Notice) { n.Items[0].ToDate.Central = ptr(math.NaN()) }, "not a figure"},
		{"infinite margin", func(n *Notice) { n.Items[0].Margin.Days = ptr(math.Inf(1)) }, "not a figure"},
		{"bounds that are none", func(n *Notice) { n.Items[0].ToDate.Low = math.NaN() }, "no bounds"},
		{"bounds crossed", func(n *Notice) { n.Items[0].ToDate.Low = 9999 }, "no bounds"},
		{"no design value", func(n *Notice) { n.Items[0].Design.CDays = 0 }, "design value"},
		{"withdraws nothing", func(n *Notice) { n.Items[0].Kind = Withdrawal }, "cite"},
		{"off the map", func(n *Notice) { n.Items[0].Place.Lat = 91 }, "Earth"},
		{"rank", func(n *Notice) { n.Items[0].Rank.Place = 32 }, "rank"},
		{"probability in percent", func(n *Notice) { n.Items[0].Outlook.Probability = 70 }, "probability"},
		{"state", func(n *Notice) { n.Items[0].To = "bad" }, "state"},
		{"twice about one thing", func(n *Notice) { n.Items = append(n.Items, n.Items[0]) }, "two items"},
		{"about", func(n *Notice) { n.Items[0].About = "a/b" }, "about"},
	} {
		t.Run(test.name, func(t *testing.T) {
			n := Samples()[0]
			test.bend(&n)
			err := n.Check()
			if err == nil || !strings.Contains(err.Error(), test.says) {
				t.Errorf("%v does not say %q", err, test.says)
			}
		})
	}
}

func TestOneLine(t *testing.T) {
	for _, test := range []struct{ in, want string }{
		{"550 no such\r\n 550-user\there", "550 no such 550-user here"},
		{"  a  ", "a"},
		{"bell\a and \x1b[31mred", "bell and [31mred"},
		{"bad \xff byte", "bad byte"},
		{"123456789", "123456789"},
		{"1234567890 and more", "1234567..."},
		{"", ""},
	} {
		if got := OneLine(test.in, 10+len(test.want)-min(len(test.want), 10)); got != test.want {
			t.Errorf("%q: %q, want %q", test.in, got, test.want)
		}
	}
}

func TestShare(t *testing.T) {
	n := Samples()[4]
	if s, known := n.Items[0].Share(); known {
		t.Errorf("an open index has share %v", s)
	}
	n = Samples()[0]
	if s, known := n.Items[0].Share(); !known || math.Abs(s-1703.2/1700) > 1e-15 {
		t.Errorf("share %v", s)
	}
}
