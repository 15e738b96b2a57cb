package pipeline

import "time"

// Feed is where a station's CSV comes from, how often, and how its rows become
// readings.
type Feed struct {
	Name    string
	Folder  string // folder that files arrive in; "" for a feed that is only fetched or pushed
	Pattern string // which of its files, as path.Match has it
	// Subfolders says that files lie in folders below it too.
	Subfolders bool
	Settle     time.Duration // a file is taken when name, size and time have stood still for so long
	Schedule   string        // cron schedule, UTC
	Rank       int           // between feeds the highest rank makes the daily value
	// ReplacesSpan says that a file replaces all that the feed said of a station
	// between the first and the last reading that the file has of it: what is
	// absent then is withdrawn.
	ReplacesSpan bool
	// Grows says that lines are only ever added to a file: once it was read, only
	// what was added is.
	Grows  bool
	Remote *Remote // where files are fetched from; nil for nowhere
	Push   *Push   // how files may be pushed; nil for not at all
	Layout Layout
}

// Layout says how rows become readings. A column is named as the header has it,
// or by its number from 1. Where a column may have other names (Or), the file
// must have exactly one of them.
//
// The header of a file is its preamble (PreambleEnds) and what comes before its
// data: the lines of names and units, and all lines up to DataLine. NamesLine,
// UnitsLine and DataLine are counted from 1, after the preamble.
type Layout struct {
	Name      string `json:"name"`
	Encoding  string `json:"encoding,omitempty"` // as package unpack names it; "" for utf-8
	Delimiter string `json:"delimiter"`          // one character, or "space" for any run of white space; "" with Widths
	// Widths says how many characters each column is wide, for columns that no
	// delimiter parts. The last takes all that is left of a line.
	Widths       []int         `json:"widths,omitempty"`
	Quote        string        `json:"quote,omitempty"`         // "none" for quotes that are text as any other; "" as RFC 4180 has them
	Decimal      string        `json:"decimal,omitempty"`       // "," for a decimal comma; "" for a point
	Comment      string        `json:"comment"`                 // lines that begin so are comments; "" for none
	PreambleEnds string        `json:"preamble_ends,omitempty"` // regular expression that fits the last line of the preamble first; "" for none
	NamesLine    int           `json:"names_line"`              // line that holds the column names; 0 for none
	UnitsLine    int           `json:"units_line,omitempty"`    // line that holds the columns' units; 0 for none
	DataLine     int           `json:"data_line,omitempty"`     // first line of data; 0 for that after names and units
	Time         TimeColumns   `json:"time"`
	Station      StationColumn `json:"station"`
	Values       []ValueColumn `json:"values"`
	// MaxSetAside is the share (0 to 1) of data rows that may be set aside
	// before the whole batch is held back as read by the wrong layout.
	MaxSetAside float64 `json:"max_set_aside"`
}

// TimeColumns says how a row's time is read: the cells of Columns, joined by
// one space, are read by Format, whose fields are YYYY YY MMM (name of the month)
// MM M DD D DDD (day of the year) hh h hmm (1 to 4 digits) mm ss .f (fraction of
// the second, which must be 0) AM (or PM); other characters stand for
// themselves. The formats epoch and epoch_ms are seconds and milliseconds since
// 1970-01-01T00:00:00Z.
type TimeColumns struct {
	Columns []string   `json:"columns"`
	Or      [][]string `json:"or,omitempty"` // other names of each of Columns; empty if none has any
	Format  string     `json:"format"`
	// Zone is "station" for the station's standard time, a fixed offset such as
	// "Z", "+03:00" or "-09:00", or a named zone such as "America/Edmonton".
	Zone string `json:"zone"`
	// Ambiguous and Skipped say what is done with times that the clocks of a named
	// zone show twice, and with those that they do not show at all.
	Ambiguous Ambiguous `json:"ambiguous,omitempty"`
	Skipped   Skipped   `json:"skipped,omitempty"`
	Covers    Covers    `json:"covers"`
	SpanS     int32     `json:"span_s"` // of ending and beginning; 86400 for day, 0 for instant
}

// Ambiguous says which of two instants a time is that clocks show twice.
type Ambiguous string

// What is done with a time that clocks show twice.
const (
	AmbiguousEarlier  Ambiguous = "earlier"
	AmbiguousLater    Ambiguous = "later"
	AmbiguousSetAside Ambiguous = "set_aside"
)

// Skipped says what is done with a time that clocks leave out.
type Skipped string

// What is done with a time that clocks leave out.
const (
	SkippedShift    Skipped = "shift" // it is read as if the clocks had not yet been put forward
	SkippedSetAside Skipped = "set_aside"
)

// Covers says what span a row's time stands for.
type Covers string

// What a row's time stands for.
const (
	CoversInstant   Covers = "instant"
	CoversDay       Covers = "day"       // the station's day of that date
	CoversEnding    Covers = "ending"    // SpanS seconds that end at the time
	CoversBeginning Covers = "beginning" // SpanS seconds that begin at the time
)

// StationColumn says which station a row is of: a column, a part of the file's
// name or of its header, or the same for all. Exactly one of Column, FileName,
// Preamble and Constant is set.
type StationColumn struct {
	Column   string            `json:"column,omitempty"`
	Or       []string          `json:"or,omitempty"`        // other names of Column
	FileName string            `json:"file_name,omitempty"` // regular expression; its first group is the id
	Preamble string            `json:"preamble,omitempty"`  // the same, for the first line before the names that it fits
	Constant string            `json:"constant,omitempty"`
	Map      map[string]string `json:"map,omitempty"` // the feed's id to ours; an id that is not in it stands for itself
	// Clocks holds what the days and times of each of the feed's stations
	// depend on, filled in from the stations when settings are read, so that a
	// layout kept with a batch reads the same bytes the same way for ever.
	Clocks map[string]StationClock `json:"clocks"`
}

// StationClock is a station's standard time and day boundary.
type StationClock struct {
	UTCOffsetS int32 `json:"utc_offset_s"`
	DayStartsS int32 `json:"day_starts_s"`
}

// ValueColumn says how one column's cells become readings.
type ValueColumn struct {
	Column string   `json:"column"`
	Or     []string `json:"or,omitempty"` // other names of Column
	// When says which rows this is of: those that have one of the texts in each of
	// the columns that are its keys. Without it it is of all rows.
	When     map[string][]string `json:"when,omitempty"`
	Variable string              `json:"variable"`
	Unit     TempUnit            `json:"unit"`
	// UnitText is what the line of units must have for the column; "" for anything.
	UnitText string `json:"unit_text,omitempty"`
	// The value in Unit is cell times Scale plus Offset; a Scale of 0 stands for 1.
	Scale   float64     `json:"scale,omitempty"`
	Offset  float64     `json:"offset,omitempty"`
	Sensor  string      `json:"sensor"`
	LevelM  float64     `json:"level_m"`
	Missing []string    `json:"missing"` // cells that say that there is no value; an empty cell always does
	Flag    *FlagColumn `json:"flag,omitempty"`
}

// FlagColumn gives a value its quality mark. A flag that Marks does not name
// sets the cell aside; an empty flag gives Empty.
type FlagColumn struct {
	Column string             `json:"column"`
	Or     []string           `json:"or,omitempty"` // other names of Column
	Empty  Quality            `json:"empty"`
	Marks  map[string]Quality `json:"marks"` // QualityMissing: the cell has no value whatever it shows
}
