package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"os/user"
	"strconv"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/pipeline"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

const editSynopsis = `edit exclude STATION --from TIME --to TIME --reason TEXT: do not use readings
thawledger edit offset  STATION --from TIME --to TIME --add DEGC --reason TEXT: add to values
thawledger edit shift   STATION --from TIME --to TIME --add DURATION --reason TEXT: add to times
thawledger edit replace STATION --day DATE --variable air_temp_max --value DEGC --reason TEXT: put another value in its place
thawledger edit undo NUMBER --reason TEXT
thawledger edit list [STATION]

Times are UTC, as 2031-07-20T13:00Z, or days of the station, as 2031-07-20 (--to: that day included).
Readings are never touched: an edit applies when daily values are made from them.`

// edit is the command `edit`.
func (p program) edit(ctx context.Context, args []string) error {
	if len(args) == 0 {
		p.flags("edit", editSynopsis).Usage()
		return errUsage
	}
	switch args[0] {
	case "list":
		return p.editList(ctx, args[1:])
	case "undo":
		return p.editUndo(ctx, args[1:])
	case "exclude", "offset", "shift", "replace":
		return p.editAdd(ctx, pipeline.EditKind(args[0]), args[1:])
	}
	p.flags("edit", editSynopsis).Usage()
	return errUsage
}

// editFlags are the flags that edits share.
type editFlags struct {
	*flag.FlagSet
	file, author, reason *string
}

func (p program) editFlags() editFlags {
	f := p.flags("edit", editSynopsis)
	return editFlags{f, f.String("settings", "settings.yaml", "settings `file`"),
		f.String("author", "", "`name` of whoever answers for it; the user's own if left out"), f.String("reason", "", "why, as a `text`; required")}
}

// answerable returns author and reason; a reason is never made up.
func (f editFlags) answerable() (author, reason string, err error) {
	author, reason = strings.TrimSpace(*f.author), strings.TrimSpace(*f.reason)
	if author == "" {
		if u, err := user.Current(); err == nil {
			author = u.Username
		}
	}
	switch {
	case reason == "":
		return "", "", errors.New("--reason is missing: say why")
	case author == "":
		return "", "", errors.New("--author is missing: say who answers for it")
	}
	return author, reason, nil
}

func (p program) editAdd(ctx context.Context, kind pipeline.EditKind, args []string) error {
	f := p.editFlags()
	from, to, day := f.String("from", "", "first `time`"), f.String("to", "", "`time` that it ends before, or last day"), f.String("day", "", "`date` of a replacement")
	variable := f.String("variable", "", "`variable` concerned; all if left out")
	sensor, feed := f.String("sensor", "", "`sensor` concerned; all if left out"), f.String("feed", "", "`feed` concerned; all if left out")
	add, value := f.String("add", "", "`amount` to add: degC for an offset, a duration such as -1h for a shift"), f.String("value", "", "`degC` of a replacement")
	words, err := parse(f.FlagSet, args, 1)
	if err != nil {
		return err
	}
	if len(words) == 0 {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*f.file)
	if err != nil {
		return err
	}
	st, err := stationNamed(set, words[0])
	if err != nil {
		return err
	}
	e := store.Edit{Station: st.ID, Kind: kind, Sensor: *sensor, Feed: *feed}
	if e.Author, e.Reason, err = f.answerable(); err != nil {
		return err
	}
	if *variable != "" {
		if e.Variable, err = pipeline.ParseVariable(*variable); err != nil {
			return fmt.Errorf("--variable: %w", err)
		}
	}
	if err := amounts(&e, *add, *value); err != nil {
		return err
	}
	if kind == pipeline.EditReplace {
		if e.Variable == 0 || e.Variable == pipeline.AirTemp {
			return errors.New("--variable: a replacement is of a day's air_temp_max, air_temp_min or air_temp_mean")
		}
		if e.Sensor == "" {
			e.Sensor = "air"
		}
		*from, *to = *day, *day
	}
	if e.FromUTC, e.ToUTC, err = span(st, *from, *to); err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	id, err := db.AddEdit(ctx, e)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "edit %d recorded; a running daemon makes the record of %s anew within seconds, `thawledger run` does otherwise\n", id, st.ID)
	return nil
}

// amounts reads what an edit adds or puts in the place of a value.
func amounts(e *store.Edit, add, value string) (err error) {
	given := map[string]string{"--add": add, "--value": value}
	want := map[pipeline.EditKind]string{pipeline.EditOffset: "--add", pipeline.EditShift: "--add", pipeline.EditReplace: "--value"}[e.Kind]
	for name, text := range given {
		if (text != "") != (name == want) {
			return fmt.Errorf("%s: it goes with %s", name, map[string]string{"--add": "offset and shift", "--value": "replace"}[name])
		}
	}
	switch e.Kind {
	case pipeline.EditShift:
		d, err := time.ParseDuration(add)
		if err != nil || d == 0 || d.Abs() > 48*time.Hour || d%time.Second != 0 {
			return fmt.Errorf("--add: %q is no duration such as -1h or 30m, of whole seconds and at most 48h", add)
		}
		e.ShiftS = int32(d / time.Second)
	case pipeline.EditOffset, pipeline.EditReplace:
		text := add + value
		if e.ValueC, err = strconv.ParseFloat(text, 64); err != nil || !(e.ValueC >= -100 && e.ValueC <= 100) {
			return fmt.Errorf("%s: %q is no temperature from -100 to 100 degC", want, text)
		}
	}
	return nil
}

// span reads two times, or days of the station, of which the second is included.
func span(st *pipeline.Station, from, to string) (a, b time.Time, err error) {
	at := func(name, text string, end pipeline.Day) (time.Time, error) {
		if d, err := pipeline.ParseDay(text); err == nil {
			return st.DayStart(d + end), nil
		}
		t, err := time.Parse("2006-01-02T15:04Z", text)
		if err != nil {
			return t, fmt.Errorf("%s: %q is neither a day such as 2031-07-20 nor a time such as 2031-07-20T13:00Z", name, text)
		}
		return t, nil
	}
	a, err = at("--from", from, 0)
	b, err2 := at("--to", to, 1)
	if err = errors.Join(err, err2); err == nil && !a.Before(b) {
		err = fmt.Errorf("--to %s is not after --from %s", to, from)
	}
	return a, b, err
}

func stationNamed(set *settings.Settings, id string) (*pipeline.Station, error) {
	for i := range set.Stations {
		if set.Stations[i].ID == id {
			return &set.Stations[i], nil
		}
	}
	return nil, fmt.Errorf("there is no station %q in the settings", id)
}

func (p program) editUndo(ctx context.Context, args []string) error {
	f := p.editFlags()
	words, err := parse(f.FlagSet, args, 1)
	if err != nil {
		return err
	}
	if len(words) == 0 {
		f.Usage()
		return errUsage
	}
	id, err := strconv.ParseInt(words[0], 10, 64)
	if err != nil {
		return fmt.Errorf("%q is not the number of an edit; `thawledger edit list` has them", words[0])
	}
	author, reason, err := f.answerable()
	if err != nil {
		return err
	}
	set, err := p.load(*f.file)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	if err := db.UndoEdit(ctx, id, author, reason); err != nil {
		return err
	}
	fmt.Fprintf(p.out, "edit %d undone\n", id)
	return nil
}

func (p program) editList(ctx context.Context, args []string) error {
	f := p.flags("edit", editSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	words, err := parse(f, args, 1)
	if err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	edits, err := db.Edits(ctx, strings.Join(words, ""))
	if err != nil {
		return err
	}
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "EDIT\tSTATION\tWHAT\tFROM (UTC)\tTO\tBY\tON\tREASON")
	for _, e := range edits {
		what, reason := string(e.Kind), e.Reason
		switch e.Kind {
		case pipeline.EditShift:
			what += " " + (time.Duration(e.ShiftS) * time.Second).String()
		case pipeline.EditOffset, pipeline.EditReplace:
			what += fmt.Sprintf(" %+.1f degC", e.ValueC)
		}
		for _, s := range []string{variableName(e.Variable), e.Sensor, e.Feed} {
			if s != "" {
				what += " " + s
			}
		}
		if e.UndoneAt != nil {
			reason += fmt.Sprintf(" (undone %s by %s: %s)", e.UndoneAt.UTC().Format(time.DateOnly), *e.UndoneBy, *e.UndoReason)
		}
		fmt.Fprintf(w, "%d\t%s\t%s\t%s\t%s\t%s\t%s\t%s\n", e.EditID, e.Station, what, e.FromUTC.UTC().Format("2006-01-02 15:04"),
			e.ToUTC.UTC().Format("2006-01-02 15:04"), e.Author, e.RecordedAt.UTC().Format(time.DateOnly), reason)
	}
	return w.Flush()
}

func variableName(v pipeline.Variable) string {
	if v == 0 {
		return ""
	}
	return v.String()
}
