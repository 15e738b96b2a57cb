package capfeed

import (
	"encoding/xml"
	"fmt"
	"strings"
	"time"

	"thawledger/pipeline"
)

// namespace is the standard's.
const namespace = "urn:oasis:names:tc:emergency:cap:1.2"

// alert is a CAP 1.2 message, its elements in the order that the schema wants
// (section 3.4). What is not used here is left out.
type alert struct {
	XMLName     xml.Name `xml:"urn:oasis:names:tc:emergency:cap:1.2 alert"`
	Identifier  string   `xml:"identifier"`
	Sender      string   `xml:"sender"`
	Sent        string   `xml:"sent"`
	Status      string   `xml:"status"`
	MsgType     string   `xml:"msgType"`
	Source      string   `xml:"source,omitempty"`
	Scope       Scope    `xml:"scope"`
	Restriction string   `xml:"restriction,omitempty"`
	Addresses   string   `xml:"addresses,omitempty"`
	Note        string   `xml:"note,omitempty"`
	References  string   `xml:"references,omitempty"`
	Info        info     `xml:"info"`
}

type info struct {
	Language    string   `xml:"language"`
	Category    []string `xml:"category"`
	Event       string   `xml:"event"`
	Response    []string `xml:"responseType"`
	Urgency     string   `xml:"urgency"`
	Severity    string   `xml:"severity"`
	Certainty   string   `xml:"certainty"`
	Effective   string   `xml:"effective"`
	Onset       string   `xml:"onset,omitempty"`
	Expires     string   `xml:"expires"`
	SenderName  string   `xml:"senderName"`
	Headline    string   `xml:"headline"`
	Description string   `xml:"description"`
	Instruction string   `xml:"instruction,omitempty"`
	Contact     string   `xml:"contact,omitempty"`
	Parameter   []named  `xml:"parameter"`
	Area        area     `xml:"area"`
}

type named struct {
	Name  string `xml:"valueName"`
	Value string `xml:"value"`
}

type area struct {
	Desc    string `xml:"areaDesc"`
	Polygon string `xml:"polygon,omitempty"`
	Circle  string `xml:"circle,omitempty"`
}

// instant writes a time as the standard wants it, in UTC, to the second. UTC is
// -00:00; Z is not allowed.
func instant(t time.Time) string { return t.UTC().Format("2006-01-02T15:04:05") + "-00:00" }

// startOf writes the first instant of a day, taken in UTC.
func startOf(d pipeline.Day) string { return instant(d.Time()) }

// addresses joins addresses as the standard wants them: by spaces, those with
// spaces in quotation marks (section 3.2.1).
func addresses(list []string) string {
	out := make([]string, len(list))
	for i, a := range list {
		if out[i] = strings.TrimSpace(a); strings.ContainsAny(out[i], " \t") {
			out[i] = `"` + out[i] + `"`
		}
	}
	return strings.Join(out, " ")
}

// number writes a figure so that reading it gives the same float64.
func number(v float64) string { return fmt.Sprintf("%g", v) }
