package alerts

import (
	"context"
	"fmt"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts/delivery"
	"thawledger/alerts/send"
	"thawledger/pipeline"
)

// box is a channel that keeps what it is given, unless it refuses to.
type box struct {
	mu     sync.Mutex
	refuse *delivery.Outcome
	got    []delivery.Notice
}

func (b *box) Deliver(_ context.Context, n delivery.Notice) delivery.Outcome {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.refuse != nil {
		return *b.refuse
	}
	b.got = append(b.got, n)
	return delivery.Taken("thanks")
}

// office is a world whose changes are told, with a clock of its own.
type office struct {
	*world
	now    time.Time
	sender *send.Sender
	boxes  map[string]*box
}

// newOffice tells recipients, each by a box of the channel's name.
func newOffice(t *testing.T, sites []pipeline.Site, recipients ...pipeline.Recipient) *office {
	t.Helper()
	o := &office{world: newWorld(t, "2031-08-01"), boxes: map[string]*box{}, now: time.Date(2031, 8, 1, 12, 0, 0, 0, time.UTC)}
	channels := map[string]delivery.Channel{}
	for i := range recipients {
		r := &recipients[i]
		r.Zone = time.UTC
		for _, c := range r.Channels() {
			if o.boxes[c] == nil {
				o.boxes[c] = &box{}
				channels[c] = o.boxes[c]
			}
		}
	}
	o.state(t, sites...)
	clock := func() time.Time { return o.now }
	o.service.Now, o.service.Sites, o.service.Recipients = clock, sites, recipients
	o.sender = send.New(send.Config{DB: o.DB, Channels: channels, Recipients: recipients, Sites: sites, Log: zap.NewNop(), Now: clock, Base: time.Minute, GiveUpAfter: 3 * time.Hour})
	return o
}

// after lets time pass and has everything done that is due then.
func (o *office) after(t *testing.T, d time.Duration) {
	t.Helper()
	o.now = o.now.Add(d)
	if err := o.sender.Gather(t.Context()); err != nil {
		t.Fatal(err)
	}
	if err := o.sender.DeliverDue(t.Context()); err != nil {
		t.Fatal(err)
	}
}

// mail returns what a box has got since it was last looked into: a line a notice,
// "news: apron within -> near; berm ...".
func (o *office) mail(t *testing.T, box string) (lines []string) {
	t.Helper()
	b := o.boxes[box]
	for _, n := range b.got {
		if err := n.Check(); err != nil {
			t.Error(err)
		}
		var items []string
		for _, i := range n.Items {
			text := strings.TrimSpace(fmt.Sprintf("%s %s -> %s", i.Surface, i.From, i.To))
			if i.Kind != n.Kind {
				text = string(i.Kind) + " " + text
			}
			if first, ok := i.First(); ok {
				text += " after " + o.nickname(t, first.Key)
			}
			items = append(items, strings.Join(strings.Fields(text), " "))
		}
		lines = append(lines, fmt.Sprintf("%s: %s", n.Kind, strings.Join(append(items, n.Cautions...), "; ")))
	}
	b.got = nil
	return lines
}

// nickname is a notice's number.
func (o *office) nickname(t *testing.T, key string) string {
	t.Helper()
	rows := o.Rows(t, `select notice_id from thaw.notices where key = $1`, key)
	if len(rows) != 1 {
		t.Fatalf("there is no notice %s", key)
	}
	return strings.Trim(rows[0], "()")
}

func (o *office) judged(t *testing.T, days ...index) {
	t.Helper()
	o.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, days...)
	o.pass(t)
}

func duty(channel string) pipeline.Recipient {
	return pipeline.Recipient{ID: "duty", Name: "Duty", Hears: []pipeline.Hearing{{Channels: []string{channel}}}, GatherFor: 10 * time.Minute, RemindEvery: 24 * time.Hour}
}

// everyChangeEnds is that no change is lost or told twice by one channel.
func (o *office) everyChangeEnds(t *testing.T) {
	t.Helper()
	same(t, "changes to be told that ended nowhere", o.Rows(t, `select change_id, r.recipient, r.channel
		from thaw.standing_changes c cross join (select distinct recipient, channel from thaw.notice_changes where handed_from = '') r
		where announce and not exists (select from thaw.notice_changes w where w.change_id = c.change_id and (w.recipient, w.channel) = (r.recipient, r.channel)
			and w.settled_at is not null)`), nil)
}

func TestNoticesGather(t *testing.T) {
	site := strip(surface("apron", thaw(100)), surface("deep", thaw(400)))
	site.Instructions = map[pipeline.State]string{pipeline.Exceeded: "Walk the edges."}
	o := newOffice(t, []pipeline.Site{site}, duty("post"))
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 91))
	o.after(t, 9*time.Minute)
	same(t, "before its time", o.mail(t, "post"), nil)
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 91), at("2031-06-03", 105))
	o.after(t, time.Minute)
	n := slices.Clone(o.boxes["post"].got)
	same(t, "gathered", o.mail(t, "post"), []string{"news: apron -> exceeded"})
	if i := n[0].Items[0]; *i.ToDate.Central != 105 || i.Design.CDays != 100 || i.Margin.CDays != -5 || i.Instruction != "Walk the edges." || i.Since == nil ||
		*i.Since != date("2031-06-03") || !i.Confirmed || i.Exceedance != 1 || i.SiteName != "Strip" || i.Chart == nil || len(i.Chart.Season) != 3 ||
		len(i.Cautions) != 1 || !strings.Contains(i.Cautions[0], "near") {
		t.Errorf("%+v", i)
	}
	if n[0].Recipient.Name != "Duty" || !n[0].Written.Equal(o.now) {
		t.Errorf("%+v", n[0])
	}
	o.exec(t, `insert into thaw.changes (station, from_day) values ('FELL', '2031-06-02')`)
	o.pass(t)
	o.after(t, time.Hour)
	same(t, "judged again", o.mail(t, "post"), nil)
	o.everyChangeEnds(t)
}

// Withdrawals and updates cite the first notice; what came and went is told as it
// stands, or not at all.
func TestNoticesCite(t *testing.T) {
	o := newOffice(t, []pipeline.Site{strip(surface("apron", thaw(100)))}, duty("post"))
	for i, step := range []struct {
		cDays []float64
		want  []string
	}{
		{[]float64{95}, []string{"news: apron -> near"}},
		{[]float64{105}, []string{"update: apron near -> exceeded after 1"}},
		{[]float64{96}, []string{"withdrawal: apron exceeded -> near after 1"}},
		{[]float64{101, 97}, nil}, // within the time for gathering
		{[]float64{80}, []string{"withdrawal: apron near -> within after 1"}},
		{[]float64{92, 85}, nil},
		{[]float64{120}, []string{"news: apron within -> exceeded"}},
		{[]float64{80, 95}, []string{"withdrawal: apron exceeded -> near after 5"}},
	} {
		for _, c := range step.cDays {
			o.judged(t, at("2031-06-01", 60), at("2031-06-02", c))
		}
		o.after(t, 15*time.Minute)
		same(t, fmt.Sprint("step ", i), o.mail(t, "post"), step.want)
	}
	o.everyChangeEnds(t)
	same(t, "set aside", o.Rows(t, `select count(*) from thaw.notice_changes where set_aside is not null`), []string{"(4)"})
}

// A design value that is replaced while a change waits, and judged only later,
// does not lose it; what is told by it is told of the same standing.
func TestNoticesOfAReplacedDesignValue(t *testing.T) {
	atOnce := duty("post")
	atOnce.GatherFor = 0 // or it would wait for the judging
	o := newOffice(t, []pipeline.Site{strip(surface("apron", thaw(100)))}, atOnce)
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 105))
	o.state(t, strip(surface("apron", thaw(104))))
	o.after(t, 10*time.Minute)
	same(t, "before it is judged", o.mail(t, "post"), []string{"news: apron -> exceeded"})
	o.pass(t)
	o.after(t, 20*time.Minute)
	same(t, "judged to the same", o.mail(t, "post"), nil)
	o.state(t, strip(surface("apron", thaw(110))))
	o.pass(t)
	o.after(t, 20*time.Minute)
	same(t, "judged otherwise", o.mail(t, "post"), []string{"withdrawal: apron exceeded -> near after 1"})
	o.everyChangeEnds(t)
}

// Many surfaces, day after day, loaded while nobody looked: one message a
// recipient and channel; past seasons are not told.
func TestNoticesDoNotStorm(t *testing.T) {
	var surfaces []pipeline.Surface
	for i := range 30 {
		surfaces = append(surfaces, surface(fmt.Sprintf("s%02d", i), thaw(float64(100+10*i))))
	}
	both := duty("post")
	both.Hears[0].Channels = []string{"post", "hook"}
	other := pipeline.Recipient{ID: "other", Name: "Other", Hears: []pipeline.Hearing{{Surfaces: []string{"s01"}, States: []pipeline.State{pipeline.Exceeded}, Channels: []string{"post2"}}}}
	o := newOffice(t, []pipeline.Site{strip(surfaces...)}, both, other)
	o.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 900))
	o.pass(t)
	var days []index
	for day := range 20 {
		days = append(days, at((date("2031-06-01")+pipeline.Day(day)).String(), float64(40+10*day)))
		o.judged(t, days...)
		if err := o.sender.Gather(t.Context()); err != nil {
			t.Fatal(err)
		}
	}
	o.after(t, time.Hour)
	// 230: surfaces up to 230 are exceeded and up to 250 near.
	for _, name := range []string{"post", "hook"} {
		got := o.boxes[name].got
		if len(got) != 1 || len(got[0].Items) != 16 {
			t.Fatalf("%s: %d messages", name, len(got))
		}
		if i := got[0].Items[0]; i.Chart == nil || got[0].Items[15].Chart != nil || i.Rank == nil || i.Rank.Place != 2 || i.Rank.Of != 2 {
			t.Errorf("%s: %+v", name, i)
		}
	}
	same(t, "the other", o.mail(t, "post2"), []string{"news: s01 near -> exceeded"})
	keys := o.Rows(t, `select count(*), count(distinct key), count(distinct message_id) from thaw.notices`)
	same(t, "notices, keys, messages", keys, []string{"(3,3,2)"})
	o.after(t, time.Hour)
	same(t, "later", append(o.mail(t, "hook")[1:], o.mail(t, "post2")...), nil)
}

func TestNoticesHeld(t *testing.T) {
	o := newOffice(t, []pipeline.Site{strip(surface("apron", thaw(100)), surface("deep", thaw(120)))}, duty("post"))
	until := o.now.Add(48 * time.Hour)
	o.exec(t, `insert into thaw.holds (site, surface, by_whom, why, from_at, until_at) values ('strip', 'apron', 'Ada', 'survey', $1, $2)`, o.now, until)
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 95))
	o.after(t, time.Hour)
	same(t, "held", o.mail(t, "post"), nil)
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 95), at("2031-06-03", 110))
	o.after(t, time.Hour)
	same(t, "another surface", o.mail(t, "post"), []string{"news: deep within -> near"})
	o.after(t, 45*time.Hour)
	same(t, "still held", o.mail(t, "post"), nil)
	o.after(t, time.Hour)
	same(t, "as it stands then", o.mail(t, "post"), []string{"news: apron -> exceeded"})
	o.everyChangeEnds(t)
}

func TestNoticesReminded(t *testing.T) {
	chief := pipeline.Recipient{ID: "chief", Name: "Chief", Hears: []pipeline.Hearing{{Surfaces: []string{"none"}, Channels: []string{"desk"}}}}
	d := duty("post")
	d.Next, d.NextAfter = "chief", 4*time.Hour
	o := newOffice(t, []pipeline.Site{strip(surface("apron", thaw(100)), surface("none", thaw(5000)))}, d, chief)
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 105))
	o.after(t, 10*time.Minute)
	key := o.boxes["post"].got[0].Key
	same(t, "told", o.mail(t, "post"), []string{"news: apron -> exceeded"})
	o.after(t, 3*time.Hour)
	o.after(t, 59*time.Minute)
	same(t, "too early", append(o.mail(t, "desk"), o.mail(t, "post")...), nil)
	o.after(t, time.Minute)
	o.after(t, time.Minute)
	o.after(t, time.Hour)
	same(t, "handed on, once", o.mail(t, "desk"), []string{"news: apron -> exceeded"})
	o.after(t, 18*time.Hour)
	same(t, "not yet", o.mail(t, "post"), nil)
	o.after(t, time.Hour)
	same(t, "reminded", o.mail(t, "post"), []string{"reminder: apron exceeded -> exceeded after 1"})
	o.after(t, 24*time.Hour)
	same(t, "reminded again", o.mail(t, "post"), []string{"reminder: apron exceeded -> exceeded after 1"})
	if err := o.Seen(t.Context(), key, "Ada", "command", o.now); err != nil {
		t.Fatal(err)
	}
	o.after(t, 96*time.Hour)
	same(t, "seen", append(o.mail(t, "post"), o.mail(t, "desk")...), nil)
	if err := o.Seen(t.Context(), "n-nosuch", "Ada", "command", o.now); err == nil {
		t.Error("a notice that there is not can be seen")
	}
}

// Quiet hours keep, and the morning tells all in one message.
func TestNoticesQuiet(t *testing.T) {
	d := duty("post")
	d.Quiet = &pipeline.Quiet{From: 22 * time.Hour, To: 6 * time.Hour}
	o := newOffice(t, []pipeline.Site{strip(surface("apron", thaw(100)), surface("deep", thaw(120)))}, d)
	o.now = time.Date(2031, 8, 1, 21, 55, 0, 0, time.UTC)
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 95))
	for range 4 {
		o.after(t, time.Hour)
	}
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 95), at("2031-06-03", 125))
	o.after(t, 4*time.Hour+4*time.Minute)
	same(t, "at 05:59", o.mail(t, "post"), nil)
	o.after(t, time.Minute)
	same(t, "at 06:00", o.mail(t, "post"), []string{"news: apron -> exceeded; deep within -> exceeded"})
}

// What cannot be delivered is given up on record, and the operator hears of it.
func TestNoticesGivenUp(t *testing.T) {
	operator := pipeline.Recipient{ID: pipeline.Operator, Name: "Operator", Hears: []pipeline.Hearing{{Surfaces: []string{"none"}, Channels: []string{"console"}}}}
	o := newOffice(t, []pipeline.Site{strip(surface("apron", thaw(100)), surface("none", thaw(5000)))}, duty("post"), operator)
	o.boxes["post"].refuse = &delivery.Outcome{Again: true, Answer: "mailbox is full"}
	o.judged(t, at("2031-06-01", 60), at("2031-06-02", 105))
	for range 30 {
		o.after(t, 10*time.Minute)
	}
	lines := o.mail(t, "console")
	if len(lines) != 1 || !strings.HasPrefix(lines[0], "news: apron -> exceeded; Notice n-") || !strings.HasSuffix(lines[0], "attempts: mailbox is full") {
		t.Errorf("%q", lines)
	}
	row := o.Rows(t, `select delivered_at is null, given_up_at is not null, attempts > 4, (select count(*) from thaw.notice_attempts a where a.notice_id = n.notice_id and outcome = 'not now') = attempts
		from thaw.notices n where recipient = 'duty'`)
	same(t, "on record", row, []string{"(t,t,t,t)"})
	// What is refused for good is not tried again.
	o.boxes["post"].refuse = &delivery.Outcome{Answer: "no such user"}
	o.after(t, 24*time.Hour)
	o.after(t, time.Minute)
	same(t, "given up at once", o.Rows(t, `select attempts, reason from thaw.notices where recipient = 'duty' and kind = 'reminder'`), []string{`(1,"refused for good: no such user")`})
}
