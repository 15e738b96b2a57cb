package delivery

import (
	"time"

	"thawledger/pipeline"
)

// Kind says why a notice is sent.
type Kind string

// The kinds of a notice and of its items.
const (
	News       Kind = "news"       // a change not told of before
	Update     Kind = "update"     // a later change of something told of before
	Withdrawal Kind = "withdrawal" // what was told rested on figures that have been corrected
	Reminder   Kind = "reminder"   // told before, still so, not yet marked as seen
	Drill      Kind = "drill"      // an exercise: nothing happened
)

// Notice is the content of one message to one recipient. All indices in it are
// in degC.d, whatever unit they are shown in.
type Notice struct {
	// Key names the notice. It is the same at every attempt, and no other notice
	// has it. 1 to 80 of the characters a-z A-Z 0-9 . _ -
	Key string

	// Kind is the kind of all items, or Update if their kinds differ.
	Kind Kind

	Recipient Recipient
	Written   time.Time // when the notice was made; the same at every attempt

	// Items are the changes told of: one, or several that were gathered.
	Items []Item

	Cautions []string // about the whole notice, in whole sentences

	// SeenURL marks the notice as seen, HoldURL puts further notices off. Either
	// may be empty.
	SeenURL, HoldURL string
}

// Recipient is who a notice goes to and how figures are shown there.
type Recipient struct {
	Name    string
	Address string // an e-mail address or whatever the channel sends to; may be empty where settings say it

	// Unit is the unit that indices are shown in: pipeline.DegCDays (also if
	// empty) or pipeline.DegFDays.
	Unit pipeline.IndexUnit

	// Zone is the time zone that times are shown in; nil is UTC.
	Zone *time.Location
}

// Item is one change of one standing.
type Item struct {
	// About names the standing that the item is about: one surface, one design
	// value, one season. All notices about it have the same About, nothing else
	// has it. 1 to 80 characters as in a key.
	About string

	Kind Kind

	Site, SiteName       string
	Surface, SurfaceName string
	Place                *Place // nil if the site's position is not known

	Index     pipeline.Kind // thaw or freeze
	Season    string        // as 2031 or 2031-32
	Direction pipeline.Direction

	From, To  pipeline.State // From is empty for a first judgement
	Confirmed bool           // even the lowest possible index is at or past the design value
	Since     *pipeline.Day  // first day of the state To; nil if not known
	Why       string         // what brought the change about, in a few words

	Day    pipeline.Day // standing date: the last complete day
	ToDate Figures      // the index to the end of Day
	Design Design

	Margin  *Margin  // nil if not known
	Outlook *Outlook // nil if there is none
	Rank    *Rank    // nil if there are no past seasons to compare with
	Data    Data

	// Instruction is the site's own for this state: what to look at, whom to
	// call. May be empty and may have several lines.
	Instruction string

	Exceedance int64 // its number; 0 if there is none

	// Earlier are the notices already sent to this recipient about the same
	// exceedance, oldest first. Updates and withdrawals cite the first.
	Earlier []Cited

	OnsetProvisional bool // a relapse may still move the season's start

	Cautions []string // about this item, in whole sentences
	Chart    *Chart   // nil for no chart
}

// Place is where a site is: WGS 84, degrees, north and east positive.
type Place struct {
	Lat, Lon float64

	// Outline is the site's outline, without repeating its first point; fewer
	// than three points are none.
	Outline []Point
}

// Point is a position in degrees, WGS 84.
type Point struct{ Lat, Lon float64 }

// Figures are an index and its bounds, degC.d.
type Figures struct {
	Low, High float64
	Central   *float64 // nil where missing days leave it open
}

// Design is the design value that an index is compared with.
type Design struct {
	CDays float64 // degC.d, of the same definition and place as Figures

	// As its document states it.
	Stated     float64
	Unit       pipeline.IndexUnit
	Definition pipeline.Definition
	Of         pipeline.Of
	Source     string

	NearShare float64  // share from which an index is near
	NFactor   *float64 // applied to the air index; nil if none was
}

// Margin is how far an index is from its design value.
type Margin struct {
	CDays float64 // design value less index, degC.d: negative once it is past

	// Days is the margin at the last week's mean rate: days to go, or, negative,
	// days' worth past. Nil if the index did not rise in that week.
	Days *float64
}

// Outlook is what past seasons' remaining days make of this season.
type Outlook struct {
	Probability float64      // of passing the design value, 0 to 1
	Date        *DateSpread  // when, in the seasons that pass it; nil if none does
	End         *IndexSpread // the index at the season's end; nil if not worked out
	Seasons     int          // past seasons used
}

// DateSpread is when something falls in 10, 50 and 90 of 100 cases at the latest.
type DateSpread struct{ P10, P50, P90 pipeline.Day }

// IndexSpread is what an index is in 10, 50 and 90 of 100 cases at most, degC.d.
type IndexSpread struct{ P10, P50, P90 float64 }

// Rank is the place of this season's index to date among the seasons on record
// at the same date, this one counted: 1 is the highest.
type Rank struct{ Place, Of int }

// Data says what an item rests on.
type Data struct {
	Newest      time.Time // end of the newest reading's span; zero if not known
	DaysFilled  int
	DaysMissing int
	LastVisit   *pipeline.Day // to the station; nil if not known
	Provisional bool          // no person has approved the record through Day
}

// Cited is an earlier notice.
type Cited struct {
	Key     string
	Written time.Time
}

// Chart is what a picture of the season shows, degC.d, each by day and in order.
type Chart struct {
	Season      []ChartDay
	Past        []ChartPast // may go on past the last day of Season; may be empty
	PastSeasons int
}

// ChartDay is the index to date at the end of a day; Low and High are equal
// where nothing is missing.
type ChartDay struct {
	Day       pipeline.Day
	Low, High float64
}

// ChartPast is what past seasons' index to date was on a day.
type ChartPast struct {
	Day           pipeline.Day
	P10, P50, P90 float64
}

// Share is the index as a share of the design value; not known while missing
// days leave the index open.
func (i *Item) Share() (float64, bool) {
	if i.ToDate.Central == nil || i.Design.CDays <= 0 {
		return 0, false
	}
	return *i.ToDate.Central / i.Design.CDays, true
}

// First returns the first notice about the item's exceedance.
func (i *Item) First() (Cited, bool) {
	if len(i.Earlier) == 0 {
		return Cited{}, false
	}
	return i.Earlier[0], true
}
