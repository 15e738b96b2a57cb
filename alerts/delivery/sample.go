package delivery

import (
	"math"
	"time"

	"thawledger/pipeline"
)

// Samples are notices of every kind, every state and every gap in what is
// known, about invented places: templates are tried on them when the program
// starts, and every channel is tested with them. Each call makes new ones.
func Samples() []Notice {
	west := time.FixedZone("", -8*3600)
	written := time.Date(2031, 8, 21, 14, 0, 0, 0, time.UTC)
	duty := Recipient{Name: "Duty engineer, Fellmoor", Address: "duty@fellmoor.example", Zone: west}

	exceeded := sampleItem(written)

	near := sampleItem(written)
	near.To, near.From, near.Confirmed, near.Exceedance = pipeline.Near, pipeline.Within, false, 41
	setIndex(&near, 1551.2, 1551.2, false)
	near.Margin = &Margin{CDays: 148.8, Days: ptr(13.4)}
	near.Rank = &Rank{Place: 4, Of: 31}
	near.Data.DaysFilled, near.Since = 0, ptr(pipeline.DayOf(2031, 8, 8))
	near.Instruction = ""
	near.Outlook = &Outlook{Probability: 0.37, Seasons: 30,
		Date: &DateSpread{P10: pipeline.DayOf(2031, 9, 3), P50: pipeline.DayOf(2031, 9, 11), P90: pipeline.DayOf(2031, 9, 20)},
		End:  &IndexSpread{P10: 1598, P50: 1664, P90: 1733}}

	expected := near
	expected.To, expected.From, expected.Kind = pipeline.Expected, pipeline.Near, Update
	expected.Since = nil
	expected.Earlier = []Cited{{Key: "n-31-0808-1", Written: written.AddDate(0, 0, -13)}}
	expected.Outlook = &Outlook{
		Probability: 0.7, Seasons: 30,
		Date: &DateSpread{P10: pipeline.DayOf(2031, 8, 29), P50: pipeline.DayOf(2031, 9, 2), P90: pipeline.DayOf(2031, 9, 14)},
		End:  &IndexSpread{P10: 1664, P50: 1738, P90: 1821},
	}

	unknown := near
	unknown.Kind, unknown.From, unknown.To, unknown.Why = Update, pipeline.Near, pipeline.Unknown, "gap"
	unknown.Earlier = expected.Earlier
	setIndex(&unknown, 1648, 1741, true)
	unknown.Margin, unknown.Rank, unknown.Outlook, unknown.Chart, unknown.Since = nil, nil, nil, nil, nil
	unknown.Data = Data{DaysFilled: 2, DaysMissing: 9, Newest: written.Add(-30 * time.Hour)}
	unknown.Cautions = []string{"The station has sent nothing usable for nine days of this season."}

	withdrawn := sampleItem(written)
	withdrawn.Kind, withdrawn.From, withdrawn.To, withdrawn.Why = Withdrawal, pipeline.Exceeded, pipeline.Near, "correction"
	withdrawn.Confirmed = false
	withdrawn.Earlier = []Cited{{Key: "n-31-0808-1", Written: written.AddDate(0, 0, -13)}, {Key: "n-31-0820-1", Written: written.AddDate(0, 0, -1)}}
	setIndex(&withdrawn, 1699.7, 1699.7, false)
	withdrawn.Margin = &Margin{CDays: 0.3, Days: ptr(0.03)}
	withdrawn.Outlook = nil

	returned := near
	returned.Kind, returned.From, returned.To, returned.Why, returned.Since = Update, pipeline.Near, pipeline.Within, "correction", nil
	returned.Earlier = expected.Earlier
	setIndex(&returned, 1508, 1508, false)
	returned.Margin, returned.Outlook, returned.Chart = &Margin{CDays: 192}, nil, nil

	short := sampleItem(written)
	short.Since, short.Day, short.Data.Newest = nil, pipeline.DayOf(2031, 7, 14), time.Date(2031, 7, 15, 0, 0, 0, 0, time.UTC)
	short.About, short.Site, short.SiteName, short.Surface, short.SurfaceName = "cold-bight.ice-road.7.2030-31", "cold-bight", "Cold Bight", "ice-road", "ice road"
	short.Index, short.Season, short.Direction = pipeline.Freeze, "2030-31", pipeline.NotBelow
	short.From, short.To, short.Why, short.Confirmed = pipeline.Within, pipeline.FellShort, "season over", false
	short.Design = Design{CDays: 2400, Stated: 57600, Unit: pipeline.KelvinHours, Definition: pipeline.NotStated, Of: pipeline.OfAir, Source: "ice road manual, 1998", NearShare: 0.9}
	setIndex(&short, 2287.5, 2287.5, false)
	short.Margin, short.Outlook, short.Chart = &Margin{CDays: 112.5}, nil, nil
	short.Rank = &Rank{Place: 29, Of: 31}
	short.OnsetProvisional, short.Place, short.Exceedance = false, nil, 44
	short.Instruction = "Measure the ice before the first load. Ask the road office."

	reminded := sampleItem(written)
	reminded.Kind = Reminder
	reminded.Earlier = []Cited{{Key: "n-31-0820-1", Written: written.AddDate(0, 0, -1)}}

	drill := near
	drill.Kind, drill.From, drill.To, drill.Why, drill.Exceedance = Drill, "", pipeline.Within, "exercise", 0
	setIndex(&drill, 0, 0, false)
	drill.Margin, drill.Rank, drill.Outlook, drill.Chart, drill.Since = &Margin{CDays: 1700}, nil, nil, nil, nil
	drill.OnsetProvisional = true

	notice := func(key string, kind Kind, items ...Item) Notice {
		return Notice{Key: key, Kind: kind, Recipient: duty, Written: written, Items: items,
			SeenURL: "https://thaw.fellmoor.example/seen/" + key, HoldURL: "https://thaw.fellmoor.example/hold/" + key}
	}
	inFahrenheit := notice("n-31-0821-2", News, exceeded)
	inFahrenheit.Recipient = Recipient{Name: "Runway office", Address: "Runway office <runway@fellmoor.example>", Unit: pipeline.DegFDays}
	inFahrenheit.SeenURL, inFahrenheit.HoldURL = "", ""
	apron := unknown
	apron.About, apron.Surface, apron.SurfaceName = "fellmoor.apron.13.2031", "apron", "apron"
	gathered := notice("n-31-0821-8", Update, apron, short, exceeded)
	gathered.Cautions = []string{"Some of these figures rest on a record that nobody has approved yet."}
	return []Notice{
		notice("n-31-0821-1", News, exceeded),
		inFahrenheit,
		notice("n-31-0821-3", News, near),
		notice("n-31-0821-4", Update, expected),
		notice("n-31-0821-5", Update, unknown),
		notice("n-31-0821-6", Withdrawal, withdrawn),
		notice("n-31-0821-7", News, short),
		gathered,
		notice("n-31-0821-9", Reminder, reminded),
		notice("n-31-0821-10", Drill, drill),
		notice("n-31-0821-11", Update, returned),
	}
}

// sampleItem is the thaw index of an invented runway three days past its design
// value.
func sampleItem(written time.Time) Item {
	i := Item{
		About: "fellmoor.runway.12.2031", Kind: News,
		Site: "fellmoor", SiteName: "Fellmoor airstrip", Surface: "runway", SurfaceName: "runway",
		Place: &Place{Lat: 68.21, Lon: -151.4},
		Index: pipeline.Thaw, Season: "2031", Direction: pipeline.NotAbove,
		From: pipeline.Near, To: pipeline.Exceeded, Why: "progress", Since: ptr(pipeline.DayOf(2031, 8, 20)),
		Day: pipeline.DayOf(2031, 8, 20),
		Design: Design{CDays: 1700, Stated: 3060, Unit: pipeline.DegFDays, Definition: pipeline.Curve, Of: pipeline.OfSurface,
			Source: "design report of 1985, table 4", NearShare: 0.9, NFactor: ptr(1.7)},
		Margin: &Margin{CDays: -3.2, Days: ptr(-0.3)},
		Outlook: &Outlook{Probability: 1, Seasons: 30, Date: &DateSpread{P10: pipeline.DayOf(2031, 8, 20), P50: pipeline.DayOf(2031, 8, 20), P90: pipeline.DayOf(2031, 8, 20)},
			End: &IndexSpread{P10: 1822, P50: 1871, P90: 1939}},
		Rank:        &Rank{Place: 2, Of: 31},
		Data:        Data{Newest: written.Add(-2 * time.Hour), DaysFilled: 2, LastVisit: ptr(pipeline.DayOf(2031, 6, 3)), Provisional: true},
		Instruction: "Walk the runway edges between markers 3 and 7 and look for new dips.\nCall the airfield office before the first landing: 555-0117.",
		Exceedance:  42,
	}
	setIndex(&i, 1699.1, 1707.4, false)
	i.ToDate.Central = ptr(1703.2)
	return i
}

// setIndex sets the index to date, and a chart that ends there.
func setIndex(i *Item, low, high float64, open bool) {
	i.ToDate = Figures{Low: low, High: high}
	if !open {
		i.ToDate.Central = ptr((low + high) / 2)
	}
	first := pipeline.DayOf(2031, 5, 9)
	last := pipeline.DayOf(2031, 9, 30)
	c := &Chart{PastSeasons: 30}
	// A season's index rises slowly at both ends: half a cosine.
	rise := func(d pipeline.Day) float64 {
		return (1 - math.Cos(math.Pi*float64(d-first)/float64(last-first))) / 2
	}
	for d := first; d <= last; d++ {
		if d <= i.Day {
			share := rise(d) / rise(i.Day)
			c.Season = append(c.Season, ChartDay{Day: d, Low: low * share, High: high * share})
		}
		c.Past = append(c.Past, ChartPast{Day: d, P10: 1290 * rise(d), P50: 1480 * rise(d), P90: 1690 * rise(d)})
	}
	i.Chart = c
}

func ptr[T any](v T) *T { return &v }
