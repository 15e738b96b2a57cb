package capfeed

import (
	"cmp"
	"encoding/xml"
	"fmt"
	"strings"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
	"thawledger/pipeline"
)

// Message is one CAP message, and what the feed says of it.
type Message struct {
	Identifier string // letters, digits and . _ - ~ only
	Sent       time.Time
	Headline   string
	XML        []byte // the CAP document

	// Kept is when it was put on the feed; the caller's Keeper sets it.
	Kept time.Time
}

// Build makes the CAP messages of a notice, one an item, in the items' order.
// The same notice and settings give the same bytes.
func Build(n delivery.Notice, s *Settings, texts *text.Texts) ([]Message, error) {
	if err := n.Check(); err != nil {
		return nil, err
	}
	var out []Message
	for i := range n.Items {
		m, err := build(n, &n.Items[i], s, texts)
		if err != nil {
			return nil, fmt.Errorf("message about %s: %w", n.Items[i].About, err)
		}
		out = append(out, m)
	}
	return out, nil
}

// identifier names the message about an item in a notice. Neither part of it can
// hold the character between them.
func identifier(key, about string) string { return key + "~" + about }

func build(n delivery.Notice, i *delivery.Item, s *Settings, texts *text.Texts) (Message, error) {
	words, err := inWords(n, i, texts)
	if err != nil {
		return Message{}, err
	}
	sent := n.Written.UTC().Truncate(time.Second)
	grade := gradeOf(i, s.Grades)
	a := alert{
		Identifier: identifier(n.Key, i.About), Sender: s.Sender, Sent: instant(sent), Status: s.status(i.Kind == delivery.Drill),
		MsgType: msgType(i), Source: "thawledger", Scope: s.scope(), Restriction: s.Restriction, Addresses: addresses(s.Addresses),
		References: references(i, s.Sender),
		Info: info{
			Language: s.language(), Category: s.categories(), Event: event(i), Response: grade.Responses,
			Urgency: grade.Urgency, Severity: grade.Severity, Certainty: grade.Certainty,
			Effective: instant(sent), Onset: onset(i), Expires: instant(sent.Add(s.lasts())),
			SenderName: s.SenderName, Headline: delivery.OneLine(words.Subject, maxHeadline), Description: strings.TrimSpace(words.Plain),
			Instruction: strings.TrimSpace(i.Instruction), Contact: s.Contact, Parameter: parameters(n, i), Area: areaOf(i, s.radiusKM()),
		},
	}
	if i.Kind == delivery.Drill {
		a.Note = "Exercise " + n.Key // section 3.2.1: the exercise is to be named here
	}
	body, err := xml.MarshalIndent(a, "", "  ")
	if err != nil {
		return Message{}, fmt.Errorf("write CAP: %w", err)
	}
	return Message{Identifier: a.Identifier, Sent: sent, Headline: a.Info.Headline, XML: append([]byte(xml.Header), append(body, '\n')...)}, nil
}

// maxHeadline is the length that displays are said to have room for (section
// 3.2.2, headline).
const maxHeadline = 160

// inWords writes the item as a notice of its own. A recipient's own links stay
// out: many read a feed.
func inWords(n delivery.Notice, i *delivery.Item, texts *text.Texts) (text.Written, error) {
	alone := *i
	alone.Chart = nil
	n.Items, n.Kind, n.SeenURL, n.HoldURL = []delivery.Item{alone}, i.Kind, "", ""
	n.Recipient.Name = ""
	return texts.Write(n)
}

// msgType is Alert unless the message refers to earlier ones, as the standard
// wants it for all other types.
func msgType(i *delivery.Item) string {
	switch {
	case len(i.Earlier) == 0:
		return "Alert"
	case i.Kind == delivery.Withdrawal:
		return "Cancel"
	}
	return "Update"
}

// references lists the earlier messages as sender,identifier,sent.
func references(i *delivery.Item, sender string) string {
	var out []string
	for _, c := range i.Earlier {
		out = append(out, sender+","+identifier(c.Key, i.About)+","+instant(c.Written.Truncate(time.Second)))
	}
	return strings.Join(out, " ")
}

func event(i *delivery.Item) string {
	if i.Index == pipeline.Freeze {
		return "Freezing of ground"
	}
	return "Thaw of frozen ground"
}

// onset is when what the message tells of begins: the middle of the outlook's
// dates, or the first day of the state.
func onset(i *delivery.Item) string {
	switch {
	case i.To == pipeline.Expected && i.Outlook != nil && i.Outlook.Date != nil:
		return startOf(i.Outlook.Date.P50)
	case i.Since != nil && i.Kind != delivery.Drill:
		return startOf(*i.Since)
	}
	return ""
}

// parameters are the figures, for programs. Units are in the names.
func parameters(n delivery.Notice, i *delivery.Item) []named {
	out := []named{
		{"notice_key", n.Key}, {"site", i.Site}, {"surface", i.Surface}, {"index", string(i.Index)}, {"season", i.Season},
		{"state", string(i.To)}, {"day", i.Day.String()},
		{"index_low_c_days", number(i.ToDate.Low)}, {"index_high_c_days", number(i.ToDate.High)}, {"design_c_days", number(i.Design.CDays)},
		{"days_filled", fmt.Sprint(i.Data.DaysFilled)}, {"days_missing", fmt.Sprint(i.Data.DaysMissing)},
	}
	if c := i.ToDate.Central; c != nil {
		out = append(out, named{"index_central_c_days", number(*c)})
	}
	if i.Outlook != nil {
		out = append(out, named{"probability_of_passing", number(i.Outlook.Probability)})
	}
	if i.Exceedance > 0 {
		out = append(out, named{"exceedance", fmt.Sprint(i.Exceedance)})
	}
	return append(out, named{"caution", pipeline.Caution})
}

// areaOf is the site's outline, or a circle about it, or its name alone.
func areaOf(i *delivery.Item, radiusKM float64) area {
	a := area{Desc: delivery.OneLine(cmp.Or(i.SiteName, i.Site)+", "+cmp.Or(i.SurfaceName, i.Surface), 200)}
	p := i.Place
	switch {
	case p == nil:
	case len(p.Outline) >= 3:
		// Section 3.2.4: at least four points, the first and the last the same.
		var points []string
		for _, q := range append(append([]delivery.Point{}, p.Outline...), p.Outline[0]) {
			points = append(points, position(q.Lat, q.Lon))
		}
		a.Polygon = strings.Join(points, " ")
	default:
		a.Circle = position(p.Lat, p.Lon) + " " + fmt.Sprintf("%.3f", radiusKM)
	}
	return a
}

// position is latitude,longitude in degrees; six decimals are a decimetre.
func position(lat, lon float64) string { return fmt.Sprintf("%.6f,%.6f", lat, lon) }
