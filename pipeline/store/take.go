package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// ErrBusy says that another worker has the station in hand.
var ErrBusy = errors.New("station is in work elsewhere")

// Take is one transaction for one station: readings, daily values, indices,
// committed parts and a line in changes, all or nothing.
type Take struct {
	tx      pgx.Tx
	station string
	fresh   fresh
	// observed says that the station's observed days are not what they were.
	observed bool
}

// TakeStation runs f in a transaction that holds the station's lock, and
// commits if f returns nil. It returns ErrBusy at once if another has the lock.
func (db *DB) TakeStation(ctx context.Context, station string, f func(*Take) error) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		got, err := tryLock(ctx, tx, lockStation, station)
		if err != nil {
			return err
		}
		if !got {
			return ErrBusy
		}
		return f(&Take{tx: tx, station: station})
	})
}

// Recomputes returns the stations that are marked to be made anew.
func (db *DB) Recomputes(ctx context.Context) ([]string, error) {
	rows, err := db.pool.Query(ctx, `select station from thaw.stations where recompute order by station`)
	if err != nil {
		return nil, fmt.Errorf("read stations to be made anew: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// Reindexes returns the stations that are not marked to be made anew, but whose
// indices are.
func (db *DB) Reindexes(ctx context.Context) ([]string, error) {
	rows, err := db.pool.Query(ctx, `select station from thaw.stations where reindex and not recompute order by station`)
	if err != nil {
		return nil, fmt.Errorf("read stations whose indices are to be made anew: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// Refills returns the stations that are marked for nothing but to be filled anew.
func (db *DB) Refills(ctx context.Context) ([]string, error) {
	rows, err := db.pool.Query(ctx, `select station from thaw.stations where refill and not reindex and not recompute order by station`)
	if err != nil {
		return nil, fmt.Errorf("read stations to be filled anew: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// Reindexed takes the marks off that asked for gaps to be filled, or indices to
// be worked out, anew. It comes before anything is read: a station that sets the
// mark meanwhile waits for this transaction, and one that has set it is waited
// for, so that either its days are seen or its mark stays.
func (t *Take) Reindexed(ctx context.Context) error {
	_, err := t.tx.Exec(ctx, `update thaw.stations set reindex = false, refill = false where station = $1 and (reindex or refill)`, t.station)
	if err != nil {
		return fmt.Errorf("take mark off station %s: %w", t.station, err)
	}
	return nil
}

// Recomputed takes all marks off. It comes before anything is read: see Reindexed.
func (t *Take) Recomputed(ctx context.Context) error {
	_, err := t.tx.Exec(ctx, `update thaw.stations set recompute = false, reindex = false, refill = false where station = $1 and (recompute or reindex or refill)`, t.station)
	if err != nil {
		return fmt.Errorf("take mark off station %s: %w", t.station, err)
	}
	return nil
}

// Station reads the station's rules as they are now, under its lock, so that a
// worker with old settings computes by the new ones.
func (t *Take) Station(ctx context.Context) (*pipeline.Station, error) {
	var (
		offset, starts         int32
		mean, thawIn, freezeIn string
		bases                  string
		s                      = &pipeline.Station{ID: t.station}
	)
	err := t.tx.QueryRow(ctx, `select name, latitude_deg, longitude_deg, elevation_m, utc_offset_s, day_starts_s,
			mean_rule, min_hours, max_hole_hours, base_c, fill_days, thaw_year_starts, freeze_year_starts, measures, bases, climatology_fills
		from thaw.stations where station = $1`, t.station).Scan(&s.Name, &s.LatitudeD, &s.LongitudeD, &s.ElevationM, &offset, &starts,
		&mean, &s.MinHours, &s.MaxHole, &s.BaseC, &s.FillDays, &thawIn, &freezeIn, &s.Measures, &bases, &s.ClimateFills)
	if errors.Is(err, pgx.ErrNoRows) {
		return nil, fmt.Errorf("station %s is not in the settings", t.station)
	}
	if err != nil {
		return nil, fmt.Errorf("read station %s: %w", t.station, err)
	}
	s.UTCOffset, s.DayStarts = time.Duration(offset)*time.Second, time.Duration(starts)*time.Second
	s.Mean = pipeline.MeanRule(mean)
	for _, m := range []struct {
		text string
		into *pipeline.MonthDay
	}{{thawIn, &s.ThawYear}, {freezeIn, &s.FreezeYear}} {
		if _, err := fmt.Sscanf(m.text, "%02d-%02d", &m.into.Month, &m.into.Day); err != nil {
			return nil, fmt.Errorf("read station %s: %q is not a month and day", t.station, m.text)
		}
	}
	if s.Bases, err = parseBases(bases); err != nil {
		return nil, fmt.Errorf("read station %s: %w", t.station, err)
	}
	if s.Neighbours, err = neighbours(ctx, t.tx, t.station); err != nil {
		return nil, err
	}
	s.Joined, err = t.members(ctx)
	return s, err
}

// PartState is what the ledger knows of a part that was taken from the bus.
type PartState struct {
	Known     bool // the batch and part are in the ledger
	Committed bool // or read again since, so that nothing of it counts
	Stuck     bool
	Accepted  bool  // its batch may change approved days
	Rejected  bool  // its batch may not, as a person has decided
	Order     int64 // of its batch
	ArrivedAt time.Time
	FeedID    int16
}

// PartStates looks parts up, in the order given.
func (t *Take) PartStates(ctx context.Context, parts []*pipeline.Part) ([]PartState, error) {
	batches, numbers := make([]int64, len(parts)), make([]int32, len(parts))
	for i, p := range parts {
		batches[i], numbers[i] = p.Batch, p.Number
	}
	rows, err := t.tx.Query(ctx, `select u.n, p.committed_at is not null or b.state = 'reread', p.stuck_at is not null,
			coalesce(b.decision = 'accepted', false), coalesce(b.decision = 'rejected', false), b.batch_order, b.feed_id, b.arrived_at
		from unnest($1::bigint[], $2::int[]) with ordinality u (batch_id, part, n)
		join thaw.batch_parts p on p.batch_id = u.batch_id and p.part = u.part
		join thaw.batches b on b.batch_id = p.batch_id
		where p.station = $3`, batches, numbers, t.station)
	if err != nil {
		return nil, fmt.Errorf("look up parts: %w", err)
	}
	out := make([]PartState, len(parts))
	var n int64
	var s PartState
	_, err = pgx.ForEachRow(rows, []any{&n, &s.Committed, &s.Stuck, &s.Accepted, &s.Rejected, &s.Order, &s.FeedID, &s.ArrivedAt}, func() error {
		s.Known = true
		out[n-1] = s
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("look up parts: %w", err)
	}
	return out, nil
}

// Fate is what became of a part's readings.
type Fate struct {
	New, Changed, Unchanged, Repeated int
}

// CommitParts records what became of parts, in the order given. A stuck part
// that was committed after all is no longer stuck.
func (t *Take) CommitParts(ctx context.Context, parts []*pipeline.Part, fates []Fate) error {
	n := len(parts)
	batches, numbers := make([]int64, n), make([]int32, n)
	fresh, changed, unchanged, repeated := make([]int32, n), make([]int32, n), make([]int32, n), make([]int32, n)
	for i, p := range parts {
		batches[i], numbers[i] = p.Batch, p.Number
		fresh[i], changed[i], unchanged[i], repeated[i] = int32(fates[i].New), int32(fates[i].Changed), int32(fates[i].Unchanged), int32(fates[i].Repeated)
	}
	_, err := t.tx.Exec(ctx, `update thaw.batch_parts p set committed_at = clock_timestamp(), stuck_at = null, reason = null, again = false,
			readings_new = u.a, readings_changed = u.b, readings_unchanged = u.c, readings_repeated = u.d
		from unnest($1::bigint[], $2::int[], $3::int[], $4::int[], $5::int[], $6::int[]) u (batch_id, part, a, b, c, d)
		where p.batch_id = u.batch_id and p.part = u.part`, batches, numbers, fresh, changed, unchanged, repeated)
	if err != nil {
		return fmt.Errorf("commit parts: %w", err)
	}
	return nil
}

// AddChange leaves a line for the judge: surfaces on this station are to be
// judged from a day on. Its outlooks, the records that are joined from it and,
// after ObservedChanged, the stations that are filled from it are to be made anew;
// they are marked even if they are already, see Reindexed. It comes last in a
// transaction, and takes the rows of all of them in order, so that stations which
// are each other's neighbours do not wait for one another in a circle.
func (t *Take) AddChange(ctx context.Context, from pipeline.Day) error {
	_, err := t.tx.Exec(ctx, `select from thaw.stations where station = $1
			or station in (select station from thaw.station_members where member = $1)
			or station in (select station from thaw.station_neighbours where neighbour = $1)
		order by station for no key update`, t.station)
	if err != nil {
		return fmt.Errorf("lock marks of %s and those beside it: %w", t.station, err)
	}
	if t.observed {
		if err := t.markNeighbours(ctx); err != nil {
			return err
		}
	}
	if err := t.MarkJoined(ctx); err != nil {
		return err
	}
	if _, err := t.tx.Exec(ctx, outlookWanted, t.station); err != nil {
		return fmt.Errorf("ask for outlook of %s: %w", t.station, err)
	}
	return addChange(ctx, t.tx, t.station, from)
}

// MarkJoined marks records that are joined from this station and others to be
// made anew.
func (t *Take) MarkJoined(ctx context.Context) error {
	_, err := t.tx.Exec(ctx, `update thaw.stations set recompute = true
		where station in (select station from thaw.station_members where member = $1)`, t.station)
	if err != nil {
		return fmt.Errorf("mark records joined from %s: %w", t.station, err)
	}
	return nil
}
