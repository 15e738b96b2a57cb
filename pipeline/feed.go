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
// or by its number from 1.
type Layout struct {
	Name      string        `json:"name"`
	Encoding  string        `json:"encoding,omitempty"` // as package unpack names it; "" for utf-8
	Delimiter string        `json:"delimiter"`          // one character, or "space" for any run of white space
	Comment   string        `json:"comment"`            // lines that begin so are comments; "" for none
	NamesLine int           `json:"names_line"`         // line that holds the column names, from 1; 0 for none
	Time      TimeColumns   `json:"time"`
	Station   StationColumn `json:"station"`
	Values    []ValueColumn `json:"values"`
	// MaxSetAside is the share (0 to 1) of data rows that may be set aside
	// before the whole batch is held back as read by the wrong layout.
	MaxSetAside float64 `json:"max_set_aside"`
}

// TimeColumns says how a row's time is read: the cells of Columns, joined by
// one space, are read by Format, whose fields are YYYY YY MM M DD D DDD (day of
// the year) hh h mm ss; other characters stand for themselves.
type TimeColumns struct {
	Columns []string `json:"columns"`
	Format  string   `json:"format"`
	// Zone is "station" for the station's standard time, or a fixed offset
	// such as "Z", "+03:00" or "-09:00".
	Zone   string `json:"zone"`
	Covers Covers `json:"covers"`
	SpanS  int32  `json:"span_s"` // of ending and beginning; 86400 for day, 0 for instant
}

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
// name, or the same for all. Exactly one of Column, FileName and Constant is set.
type StationColumn struct {
	Column   string            `json:"column,omitempty"`
	FileName string            `json:"file_name,omitempty"` // regular expression; its first group is the id
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
	Column   string      `json:"column"`
	Variable string      `json:"variable"`
	Unit     TempUnit    `json:"unit"`
	Sensor   string      `json:"sensor"`
	LevelM   float64     `json:"level_m"`
	Missing  []string    `json:"missing"` // cells that say that there is no value; an empty cell always does
	Flag     *FlagColumn `json:"flag,omitempty"`
}

// FlagColumn gives a value its quality mark. A flag that Marks does not name
// sets the cell aside; an empty flag gives Empty.
type FlagColumn struct {
	Column string             `json:"column"`
	Empty  Quality            `json:"empty"`
	Marks  map[string]Quality `json:"marks"` // QualityMissing: the cell has no value whatever it shows
}
