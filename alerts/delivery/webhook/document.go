package webhook

import (
	"cmp"
	"encoding/json"
	"fmt"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
	"thawledger/pipeline"
)

// Version is the version of the body.
const Version = 1

// Document is the body, as notice.v1.schema.json has it. Indices are in degC.d
// whatever unit the words are in. A field that is not known is null, not absent.
type Document struct {
	Version   int           `json:"version"`
	Key       string        `json:"key"`
	Kind      delivery.Kind `json:"kind"`
	Recipient string        `json:"recipient"`
	WrittenAt string        `json:"written_at"`
	Subject   string        `json:"subject"`
	Text      string        `json:"text"`
	Items     []Item        `json:"items"`
	Cautions  []string      `json:"cautions"`
	SeenURL   *string       `json:"seen_url"`
	HoldURL   *string       `json:"hold_url"`
	Caution   string        `json:"caution"`
}

// Item is one change.
type Item struct {
	About       string             `json:"about"`
	Kind        delivery.Kind      `json:"kind"`
	Site        string             `json:"site"`
	SiteName    string             `json:"site_name"`
	Surface     string             `json:"surface"`
	SurfaceName string             `json:"surface_name"`
	Latitude    *float64           `json:"latitude_deg"`
	Longitude   *float64           `json:"longitude_deg"`
	Index       pipeline.Kind      `json:"index"`
	Season      string             `json:"season"`
	Direction   pipeline.Direction `json:"direction"`
	From        *pipeline.State    `json:"from_state"`
	To          pipeline.State     `json:"to_state"`
	Confirmed   bool               `json:"confirmed"`
	Since       *string            `json:"since"`
	Why         string             `json:"why"`
	Day         string             `json:"day"`

	IndexLow     float64  `json:"index_low_c_days"`
	IndexCentral *float64 `json:"index_central_c_days"`
	IndexHigh    float64  `json:"index_high_c_days"`
	Share        *float64 `json:"share_of_design"`
	MarginCDays  *float64 `json:"margin_c_days"`
	MarginDays   *float64 `json:"margin_days"`

	Design  Design   `json:"design"`
	Outlook *Outlook `json:"outlook"`
	Rank    *Rank    `json:"rank"`

	NewestReadingAt  *string `json:"newest_reading_at"`
	DaysFilled       int     `json:"days_filled"`
	DaysMissing      int     `json:"days_missing"`
	LastVisit        *string `json:"last_visit"`
	Provisional      bool    `json:"record_provisional"`
	OnsetProvisional bool    `json:"onset_provisional"`

	Instruction string   `json:"instruction"`
	Exceedance  *int64   `json:"exceedance"`
	EarlierKeys []string `json:"earlier_keys"`
	Cautions    []string `json:"cautions"`
}

// Design is the design value.
type Design struct {
	CDays      float64             `json:"c_days"`
	Stated     float64             `json:"stated"`
	Unit       pipeline.IndexUnit  `json:"unit"`
	Definition pipeline.Definition `json:"definition"`
	Of         pipeline.Of         `json:"of"`
	Source     string              `json:"source"`
	NFactor    *float64            `json:"n_factor"`
}

// Outlook is what past seasons make of this one.
type Outlook struct {
	Probability float64  `json:"probability"`
	Date10      *string  `json:"date_10"`
	Date50      *string  `json:"date_50"`
	Date90      *string  `json:"date_90"`
	End10       *float64 `json:"season_end_10_c_days"`
	End50       *float64 `json:"season_end_50_c_days"`
	End90       *float64 `json:"season_end_90_c_days"`
	Seasons     int      `json:"past_seasons"`
}

// Rank is the place among the seasons on record, 1 being the highest.
type Rank struct {
	Place int `json:"place"`
	Of    int `json:"of"`
}

// body writes the notice; the same notice gives the same bytes.
func body(n delivery.Notice, w text.Written) ([]byte, error) {
	d := Document{
		Version: Version, Key: n.Key, Kind: n.Kind, Recipient: n.Recipient.Name, WrittenAt: instant(n.Written),
		Subject: w.Subject, Text: w.Plain, Items: []Item{}, Cautions: append([]string{}, n.Cautions...),
		SeenURL: unlessEmpty(n.SeenURL), HoldURL: unlessEmpty(n.HoldURL), Caution: pipeline.Caution,
	}
	for i := range n.Items {
		d.Items = append(d.Items, item(&n.Items[i]))
	}
	out, err := json.Marshal(d)
	if err != nil {
		return nil, fmt.Errorf("write notice as JSON: %w", err)
	}
	return out, nil
}

func item(i *delivery.Item) Item {
	out := Item{
		About: i.About, Kind: i.Kind, Site: i.Site, SiteName: cmp.Or(i.SiteName, i.Site), Surface: i.Surface, SurfaceName: cmp.Or(i.SurfaceName, i.Surface),
		Index: i.Index, Season: i.Season, Direction: i.Direction, From: unlessEmpty(i.From), To: i.To, Confirmed: i.Confirmed,
		Since: day(i.Since), Why: i.Why, Day: i.Day.String(),
		IndexLow: i.ToDate.Low, IndexCentral: i.ToDate.Central, IndexHigh: i.ToDate.High,
		Design:     Design{i.Design.CDays, i.Design.Stated, i.Design.Unit, i.Design.Definition, i.Design.Of, i.Design.Source, i.Design.NFactor},
		DaysFilled: i.Data.DaysFilled, DaysMissing: i.Data.DaysMissing, LastVisit: day(i.Data.LastVisit), Provisional: i.Data.Provisional,
		OnsetProvisional: i.OnsetProvisional, Instruction: i.Instruction, Exceedance: unlessEmpty(i.Exceedance),
		EarlierKeys: []string{}, Cautions: append([]string{}, i.Cautions...),
	}
	if i.Place != nil {
		out.Latitude, out.Longitude = &i.Place.Lat, &i.Place.Lon
	}
	if share, known := i.Share(); known {
		out.Share = &share
	}
	if i.Margin != nil {
		out.MarginCDays, out.MarginDays = &i.Margin.CDays, i.Margin.Days
	}
	if o := i.Outlook; o != nil {
		out.Outlook = &Outlook{Probability: o.Probability, Seasons: o.Seasons}
		if d := o.Date; d != nil {
			out.Outlook.Date10, out.Outlook.Date50, out.Outlook.Date90 = day(&d.P10), day(&d.P50), day(&d.P90)
		}
		if e := o.End; e != nil {
			out.Outlook.End10, out.Outlook.End50, out.Outlook.End90 = &e.P10, &e.P50, &e.P90
		}
	}
	if i.Rank != nil {
		out.Rank = &Rank{i.Rank.Place, i.Rank.Of}
	}
	if !i.Data.Newest.IsZero() {
		out.NewestReadingAt = unlessEmpty(instant(i.Data.Newest))
	}
	for _, c := range i.Earlier {
		out.EarlierKeys = append(out.EarlierKeys, c.Key)
	}
	return out
}

// instant is an instant in UTC, to the second.
func instant(t time.Time) string { return t.UTC().Format(time.RFC3339) }

func day(d *pipeline.Day) *string {
	if d == nil {
		return nil
	}
	s := d.String()
	return &s
}

func unlessEmpty[T comparable](v T) *T {
	if v == *new(T) {
		return nil
	}
	return &v
}
