package capfeed_test

import (
	"bytes"
	"encoding/xml"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"go.uber.org/goleak"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/capfeed"
	"thawledger/alerts/delivery/text"
	"thawledger/pipeline"
)

// What every channel does is tested in deliverytest; here is what only the feed
// does.

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

var noon = time.Date(2031, 8, 21, 12, 0, 0, 0, time.UTC)

func settings() capfeed.Settings {
	return capfeed.Settings{
		Sender: "thaw@fellmoor.example", SenderName: "Fellmoor ground office", Contact: "ground office, 555-0117",
		Restriction: "engineers responsible for the sites", BaseURL: "https://fellmoor.example/cap/",
		FeedID: "tag:fellmoor.example,2031:thaw", Title: "Thaw of frozen ground", Now: func() time.Time { return noon },
	}
}

func build(t *testing.T, n delivery.Notice, s capfeed.Settings) []capfeed.Message {
	t.Helper()
	if err := s.Check(); err != nil {
		t.Fatal(err)
	}
	messages, err := capfeed.Build(n, &s, loaded(t))
	if err != nil {
		t.Fatal(err)
	}
	return messages
}

func loaded(t *testing.T) *text.Texts {
	t.Helper()
	texts, err := text.Load("")
	if err != nil {
		t.Fatal(err)
	}
	return texts
}

// parsed is a message as a receiver reads it.
type parsed struct {
	XMLName     xml.Name
	Identifier  string `xml:"identifier"`
	Sender      string `xml:"sender"`
	Sent        string `xml:"sent"`
	Status      string `xml:"status"`
	MsgType     string `xml:"msgType"`
	Scope       string `xml:"scope"`
	Restriction string `xml:"restriction"`
	Addresses   string `xml:"addresses"`
	Note        string `xml:"note"`
	References  string `xml:"references"`
	Info        struct {
		Urgency     string   `xml:"urgency"`
		Severity    string   `xml:"severity"`
		Certainty   string   `xml:"certainty"`
		Response    []string `xml:"responseType"`
		Onset       string   `xml:"onset"`
		Effective   string   `xml:"effective"`
		Expires     string   `xml:"expires"`
		Headline    string   `xml:"headline"`
		Description string   `xml:"description"`
		Instruction string   `xml:"instruction"`
		Area        struct {
			Desc    string `xml:"areaDesc"`
			Circle  string `xml:"circle"`
			Polygon string `xml:"polygon"`
		} `xml:"area"`
	} `xml:"info"`
}

func parse(t *testing.T, m capfeed.Message) parsed {
	t.Helper()
	var p parsed
	if err := xml.Unmarshal(m.XML, &p); err != nil {
		t.Fatalf("%v in\n%s", err, m.XML)
	}
	return p
}

// xmllint validates documents against a schema. Where there is no xmllint
// (Debian: libxml2-utils) the test is skipped, and with CI set it fails.
func xmllint(t *testing.T, schema string, documents ...[]byte) (string, bool) {
	t.Helper()
	program, err := exec.LookPath("xmllint")
	if err != nil {
		if os.Getenv("CI") != "" {
			t.Fatal("xmllint is missing: install libxml2-utils")
		}
		t.Skip("NOT VALIDATED: xmllint is missing, install libxml2-utils")
	}
	args := []string{"--nonet", "--noout", "--schema", schema}
	folder := t.TempDir()
	for i, d := range documents {
		name := filepath.Join(folder, string(rune('a'+i))+".xml")
		if err := os.WriteFile(name, d, 0o600); err != nil {
			t.Fatal(err)
		}
		args = append(args, name)
	}
	said, err := exec.CommandContext(t.Context(), program, args...).CombinedOutput()
	return string(said), err == nil
}

// schemas are ours, and the published one where the tests are told of a copy.
func schemas() []string {
	out := []string{"testdata/cap12.xsd"}
	if published := os.Getenv("THAWLEDGER_CAP_XSD"); published != "" {
		out = append(out, published)
	}
	return out
}

func TestMessagesAreValid(t *testing.T) {
	var all [][]byte
	for _, s := range variants() {
		for _, n := range delivery.Samples() {
			n.Items[0].Chart = nil
			for _, m := range build(t, n, s) {
				all = append(all, m.XML)
			}
		}
	}
	hostile := delivery.Samples()[0]
	hostile.Items[0].SiteName = "<&]]>\x00\x1b\xff"
	hostile.Items[0].Instruction = "]]></instruction>\x0b & more"
	all = append(all, build(t, hostile, settings())[0].XML)
	for _, schema := range schemas() {
		if said, ok := xmllint(t, schema, all...); !ok {
			t.Errorf("%s:\n%s", schema, said)
		}
	}
}

// variants are settings that differ in what the schema is about.
func variants() []capfeed.Settings {
	private := settings()
	private.Scope, private.Restriction, private.Addresses = capfeed.Private, "", []string{"duty@fellmoor.example", "ice road office"}
	private.Actual, private.Contact, private.Language = true, "", "en-CA"
	private.Categories = []string{"Transport"}
	return []capfeed.Settings{settings(), private}
}

// The schemas find what is wrong, so that "valid" means something.
func TestSchemasFindFaults(t *testing.T) {
	good := string(build(t, delivery.Samples()[3], settings())[0].XML)
	for _, schema := range schemas() {
		for name, change := range map[string][2]string{
			"time in Z":         {"-00:00</sent>", "Z</sent>"},
			"status":            {"<status>Test<", "<status>Real<"},
			"type":              {"<msgType>Update<", "<msgType>update<"},
			"urgency":           {"<urgency>Future<", "<urgency>Soon<"},
			"element unknown":   {"<source>", "<source/><source>"},
			"wrong order":       {"</sender>", "</sender><scope>Private</scope>"},
			"without severity":  {"<severity>Moderate</severity>", ""},
			"another namespace": {"cap:1.2", "cap:1.1"},
		} {
			bad := strings.Replace(good, change[0], change[1], 1)
			if bad == good {
				t.Fatalf("%s: %q is not in the message:\n%s", name, change[0], good)
			}
			if _, ok := xmllint(t, schema, []byte(bad)); ok {
				t.Errorf("%s: %s finds nothing", name, schema)
			}
		}
	}
}

func TestMessage(t *testing.T) {
	n := delivery.Samples()[0]
	n.Written = time.Date(2031, 8, 21, 6, 0, 0, 999, time.FixedZone("", -8*3600))
	m := build(t, n, settings())[0]
	got := parse(t, m)
	for name, pair := range map[string][2]string{
		"namespace":   {got.XMLName.Space, "urn:oasis:names:tc:emergency:cap:1.2"},
		"identifier":  {got.Identifier, "n-31-0821-1~fellmoor.runway.12.2031"},
		"sender":      {got.Sender, "thaw@fellmoor.example"},
		"sent":        {got.Sent, "2031-08-21T14:00:00-00:00"},
		"status":      {got.Status, "Test"},
		"type":        {got.MsgType, "Alert"},
		"scope":       {got.Scope, "Restricted"},
		"restriction": {got.Restriction, "engineers responsible for the sites"},
		"references":  {got.References, ""},
		"note":        {got.Note, ""},
		"onset":       {got.Info.Onset, "2031-08-20T00:00:00-00:00"},
		"expires":     {got.Info.Expires, "2031-08-28T14:00:00-00:00"},
		"headline":    {got.Info.Headline, "Fellmoor airstrip, runway: thaw index past its design value (1703 of 1700 degC.d)"},
		"area":        {got.Info.Area.Desc, "Fellmoor airstrip, runway"},
		"circle":      {got.Info.Area.Circle, "68.210000,-151.400000 1.000"},
	} {
		if pair[0] != pair[1] {
			t.Errorf("%s: %q, want %q", name, pair[0], pair[1])
		}
	}
	if !strings.HasSuffix(got.Info.Description, pipeline.Caution) || !strings.HasPrefix(got.Info.Instruction, "Walk the runway") {
		t.Errorf("description %q, instruction %q", got.Info.Description, got.Info.Instruction)
	}
	if strings.Contains(string(m.XML), "thaw.fellmoor.example/seen") || strings.Contains(string(m.XML), "Duty engineer") {
		t.Error("a recipient's own links or name are on the feed")
	}
}

func TestStatusAndType(t *testing.T) {
	actual := settings()
	actual.Actual = true
	for _, test := range []struct {
		name         string
		sample       int
		s            capfeed.Settings
		status, kind string
		references   string
	}{
		{"news", 0, actual, "Actual", "Alert", ""},
		{"news, not actual", 0, settings(), "Test", "Alert", ""},
		{"update", 3, actual, "Actual", "Update", "thaw@fellmoor.example,n-31-0808-1~fellmoor.runway.12.2031,2031-08-08T14:00:00-00:00"},
		{"withdrawal", 5, actual, "Actual", "Cancel", "thaw@fellmoor.example,n-31-0808-1~fellmoor.runway.12.2031,2031-08-08T14:00:00-00:00 " +
			"thaw@fellmoor.example,n-31-0820-1~fellmoor.runway.12.2031,2031-08-20T14:00:00-00:00"},
		{"reminder", 8, actual, "Actual", "Update", "thaw@fellmoor.example,n-31-0820-1~fellmoor.runway.12.2031,2031-08-20T14:00:00-00:00"},
		{"drill", 9, actual, "Exercise", "Alert", ""},
		{"drill, not actual", 9, settings(), "Exercise", "Alert", ""},
	} {
		got := parse(t, build(t, delivery.Samples()[test.sample], test.s)[0])
		if got.Status != test.status || got.MsgType != test.kind || got.References != test.references {
			t.Errorf("%s: %s %s %q", test.name, got.Status, got.MsgType, got.References)
		}
		if exercise := got.Status == "Exercise"; exercise != strings.HasPrefix(got.Note, "Exercise n-31-0821-10") {
			t.Errorf("%s: note %q", test.name, got.Note)
		}
	}
}

// What a message refers to is what the earlier message called itself.
func TestReferencesAreTheEarlierMessages(t *testing.T) {
	first := delivery.Samples()[0]
	was := parse(t, build(t, first, settings())[0])
	later := delivery.Samples()[0]
	later.Key, later.Kind, later.Written = "n-31-0825-1", delivery.Withdrawal, first.Written.AddDate(0, 0, 4)
	later.Items[0].Kind = delivery.Withdrawal
	later.Items[0].Earlier = []delivery.Cited{{Key: first.Key, Written: first.Written}}
	if got := parse(t, build(t, later, settings())[0]); got.References != was.Sender+","+was.Identifier+","+was.Sent {
		t.Errorf("%q", got.References)
	}
}

func TestOneMessageAnItem(t *testing.T) {
	n := delivery.Samples()[7]
	messages := build(t, n, settings())
	if len(messages) != 3 {
		t.Fatalf("%d messages", len(messages))
	}
	for i, m := range messages {
		if m.Identifier != n.Key+"~"+n.Items[i].About {
			t.Errorf("%s", m.Identifier)
		}
		if got := parse(t, m); strings.Contains(got.Info.Headline, "more") {
			t.Errorf("headline of one item: %q", got.Info.Headline)
		}
	}
}

func TestSameBytesTwice(t *testing.T) {
	a, b := build(t, delivery.Samples()[7], settings()), build(t, delivery.Samples()[7], settings())
	for i := range a {
		if !bytes.Equal(a[i].XML, b[i].XML) {
			t.Error("the same notice gives two messages")
		}
	}
}

// The table in the code's comment, row by row. The words are the standard's
// (section 3.2.2); the choice among them is ours.
func TestGrades(t *testing.T) {
	probable, less := &delivery.Outlook{Probability: 0.7}, &delivery.Outlook{Probability: 0.5}
	for _, test := range []struct {
		name string
		bend func(*delivery.Item)
		want string
	}{
		{"exceeded, confirmed", func(i *delivery.Item) { i.To, i.Confirmed = pipeline.Exceeded, true }, "Future Moderate Observed Assess Execute"},
		{"exceeded", func(i *delivery.Item) { i.To, i.Confirmed = pipeline.Exceeded, false }, "Future Moderate Likely Assess Execute"},
		{"nothing to carry out", func(i *delivery.Item) { i.To, i.Instruction = pipeline.Exceeded, "" }, "Future Moderate Likely Assess"},
		{"fell short", func(i *delivery.Item) { i.To = pipeline.FellShort }, "Future Moderate Observed Assess Execute"},
		{"expected, probable", func(i *delivery.Item) { i.To, i.Outlook = pipeline.Expected, probable }, "Future Moderate Likely Prepare Monitor"},
		{"expected, half", func(i *delivery.Item) { i.To, i.Outlook = pipeline.Expected, less }, "Future Moderate Possible Prepare Monitor"},
		{"near", func(i *delivery.Item) { i.To = pipeline.Near }, "Future Minor Possible Monitor"},
		{"unknown", func(i *delivery.Item) { i.To = pipeline.Unknown }, "Unknown Unknown Unknown Monitor Assess"},
		{"within", func(i *delivery.Item) { i.To = pipeline.Within }, "Past Minor Observed AllClear"},
		{"withdrawn", func(i *delivery.Item) { i.Kind, i.To = delivery.Withdrawal, pipeline.Within }, "Past Minor Unlikely AllClear"},
		{"withdrawn, still near", func(i *delivery.Item) { i.Kind, i.To = delivery.Withdrawal, pipeline.Near }, "Past Minor Unlikely Monitor"},
	} {
		n := delivery.Samples()[0]
		n.Items[0].Earlier = []delivery.Cited{{Key: "n", Written: n.Written}}
		test.bend(&n.Items[0])
		n.Kind = n.Items[0].Kind
		got := parse(t, build(t, n, settings())[0]).Info
		if s := strings.Join(append([]string{got.Urgency, got.Severity, got.Certainty}, got.Response...), " "); s != test.want {
			t.Errorf("%s: %s, want %s", test.name, s, test.want)
		}
	}
	own := settings()
	own.Grades = map[pipeline.State]capfeed.Grade{pipeline.Exceeded: {Urgency: "Expected", Severity: "Severe", Certainty: "Observed", Responses: []string{"Execute"}}}
	if got := parse(t, build(t, delivery.Samples()[0], own)[0]).Info; got.Urgency != "Expected" || got.Severity != "Severe" {
		t.Errorf("own grade: %s %s", got.Urgency, got.Severity)
	}
}

// Section 3.2.4: a polygon has four points or more, the first is the last.
func TestOutline(t *testing.T) {
	n := delivery.Samples()[0]
	n.Items[0].Place.Outline = []delivery.Point{{Lat: 68.2, Lon: -151.5}, {Lat: 68.3, Lon: -151.5}, {Lat: 68.3, Lon: -151.3}}
	got := parse(t, build(t, n, settings())[0]).Info.Area
	if got.Circle != "" || got.Polygon != "68.200000,-151.500000 68.300000,-151.500000 68.300000,-151.300000 68.200000,-151.500000" {
		t.Errorf("%+v", got)
	}
	n.Items[0].Place = nil
	if got := parse(t, build(t, n, settings())[0]).Info.Area; got.Circle != "" || got.Polygon != "" || got.Desc == "" {
		t.Errorf("%+v", got)
	}
}

// Section 3.2.1: addresses are parted by spaces, one with spaces is quoted.
func TestAddresses(t *testing.T) {
	if got := parse(t, build(t, delivery.Samples()[0], variants()[1])[0]); got.Scope != "Private" || got.Addresses != `duty@fellmoor.example "ice road office"` || got.Restriction != "" {
		t.Errorf("%s %q %q", got.Scope, got.Addresses, got.Restriction)
	}
}

func TestSettings(t *testing.T) {
	for _, test := range []struct {
		name string
		bend func(*capfeed.Settings)
		says string
	}{
		{"sender with a comma", func(s *capfeed.Settings) { s.Sender = "thaw,fellmoor" }, "sender"},
		{"no name", func(s *capfeed.Settings) { s.SenderName = "" }, "name"},
		{"restricted to nobody", func(s *capfeed.Settings) { s.Restriction = " " }, "say for whom"},
		{"private to nobody", func(s *capfeed.Settings) { s.Scope, s.Restriction = capfeed.Private, "" }, "name the addresses"},
		{"public", func(s *capfeed.Settings) { s.Scope = "Public" }, "neither Restricted nor Private"},
		{"category", func(s *capfeed.Settings) { s.Categories = []string{"Ice"} }, "category"},
		{"grade", func(s *capfeed.Settings) {
			s.Grades = map[pipeline.State]capfeed.Grade{pipeline.Near: {Urgency: "Soon"}}
		}, "urgency"},
		{"base without slash", func(s *capfeed.Settings) { s.BaseURL = "https://fellmoor.example/cap" }, "base address"},
		{"feed's name", func(s *capfeed.Settings) { s.FeedID = "thaw" }, "feed's name"},
		{"title", func(s *capfeed.Settings) { s.Title = "" }, "title"},
		{"radius", func(s *capfeed.Settings) { s.RadiusKM = -1 }, "radius"},
		{"clock", func(s *capfeed.Settings) { s.Now = nil }, "clock"},
	} {
		s := settings()
		test.bend(&s)
		if err := s.Check(); err == nil || !strings.Contains(err.Error(), test.says) {
			t.Errorf("%s: %v does not say %q", test.name, err, test.says)
		}
	}
}
