package text

import (
	"cmp"
	"fmt"
	"html/template"
	"slices"
	"strings"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/chart"
	"thawledger/pipeline"
)

// View is what templates are given. Every string is ready to print, without a
// final line break; one that is empty is not known and is best left out.
type View struct {
	Kind     string // news, update, withdrawal, reminder or drill
	Exercise bool   // it is a drill

	// Headline is the whole notice on one line, without the exercise, reminder
	// or withdrawal mark, which is Mark: "Exercise: ", "Reminder: ",
	// "Withdrawn: " or empty.
	Headline string
	Mark     string

	Recipient string
	Written   string // when, in the recipient's time zone
	Items     []ItemView

	Cautions []string
	Caution  string // pipeline.Caution; every text has to show it

	SeenURL, HoldURL string
	Key              string
}

// ItemView is one change, in sentences.
type ItemView struct {
	Kind  string
	State string // exceeded, unknown, expected, near, within, fell_short

	Where   string // site and surface
	Says    string // what is so, without a capital: "thaw index past its design value"
	Claim   string // Says with a capital
	Figures string // "1703 of 1700 degC.d"

	Since   string // since when, and to what day the figures go
	HowFar  string
	HowSure string
	Outlook string
	Rank    string // among past seasons
	Data    string // what it rests on
	Design  string // the design value as its document states it
	Changed string // what changed since the last notice, or what brought this about
	Cites   string // the earlier notice and the exceedance

	Instruction []string // lines; empty if the site has none for this state
	Cautions    []string

	Chart *ChartView // nil if there is none
}

// ChartView is a picture.
type ChartView struct {
	Source template.URL // where the HTML finds it
	Alt    string       // the same in words
	Width  int          // of the picture as it is best shown, in CSS pixels
	Height int
}

// order is how serious a state is, most serious first.
var order = []pipeline.State{pipeline.Exceeded, pipeline.FellShort, pipeline.Unknown, pipeline.Expected, pipeline.Near, pipeline.Within}

// NewView puts a notice that has passed its check into sentences, the most
// serious item first. charts says under which address the HTML finds the chart
// of an item, by its About; it returns "" for none.
func NewView(n delivery.Notice, charts func(about string) string) View {
	u := unitOf(n.Recipient.Unit)
	v := View{
		Kind: string(n.Kind), Exercise: n.Kind == delivery.Drill, Mark: mark(n.Kind),
		Recipient: delivery.OneLine(n.Recipient.Name, 120), Written: clock(n.Written, n.Recipient.Zone),
		Caution: pipeline.Caution, SeenURL: n.SeenURL, HoldURL: n.HoldURL, Key: n.Key,
	}
	for _, c := range n.Cautions {
		v.Cautions = append(v.Cautions, delivery.OneLine(c, 500))
	}
	items := mostSeriousFirst(n.Items)
	for i := range items {
		v.Items = append(v.Items, itemView(&items[i], u, n, charts))
	}
	lead := v.Items[0]
	v.Headline = fmt.Sprintf("%s: %s (%s)", lead.Where, lead.Says, lead.Figures)
	if more := len(v.Items) - 1; more > 0 {
		v.Headline += fmt.Sprintf(" and %d more", more)
		// One mark for all would be wrong for some.
		if v.Mark == "" && lead.Kind != string(n.Kind) {
			v.Mark = mark(delivery.Kind(lead.Kind))
		}
	}
	return v
}

func mostSeriousFirst(items []delivery.Item) []delivery.Item {
	items = slices.Clone(items)
	slices.SortStableFunc(items, func(a, b delivery.Item) int {
		return cmp.Compare(slices.Index(order, a.To), slices.Index(order, b.To))
	})
	return items
}

func mark(k delivery.Kind) string {
	switch k {
	case delivery.Drill:
		return "Exercise: "
	case delivery.Reminder:
		return "Reminder: "
	case delivery.Withdrawal:
		return "Withdrawn: "
	}
	return ""
}

func itemView(i *delivery.Item, u unit, n delivery.Notice, charts func(string) string) ItemView {
	v := ItemView{
		Kind: string(i.Kind), State: string(i.To),
		Where: where(i), Says: says(i), Figures: figures(i, u),
		Since: since(i), HowFar: howFar(i, u), HowSure: howSure(i, u), Outlook: outlook(i, u), Rank: rank(i),
		Data: data(i, n), Design: design(i, u), Changed: changed(i), Cites: cites(i, n.Recipient.Zone),
	}
	v.Claim = capital(v.Says)
	for line := range strings.Lines(i.Instruction) {
		if line = delivery.OneLine(line, 500); line != "" {
			v.Instruction = append(v.Instruction, line)
		}
	}
	for _, c := range i.Cautions {
		v.Cautions = append(v.Cautions, delivery.OneLine(c, 500))
	}
	if source := charts(i.About); source != "" && i.Chart != nil {
		v.Chart = &ChartView{Source: template.URL(source), Alt: alt(i, u), Width: chart.Width * 2 / 3, Height: chart.Height * 2 / 3}
	}
	return v
}

func where(i *delivery.Item) string {
	return delivery.OneLine(cmp.Or(i.SiteName, i.Site), 60) + ", " + delivery.OneLine(cmp.Or(i.SurfaceName, i.Surface), 60)
}
