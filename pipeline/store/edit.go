package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Edit is a correction by hand as it is kept.
type Edit struct {
	EditID     int64
	Station    string
	Kind       pipeline.EditKind
	Variable   pipeline.Variable // 0 for all
	Sensor     string            // "" for all
	Feed       string            // "" for all
	FromUTC    time.Time         // starts of readings, half-open
	ToUTC      time.Time
	ValueC     float64 // of replace and offset
	ShiftS     int32   // of shift
	Author     string
	Reason     string
	RecordedAt time.Time
	UndoneAt   *time.Time
	UndoneBy   *string
	UndoReason *string
}

// AddEdit records an edit and marks its station to be made anew, in one
// transaction, and returns its number.
func (db *DB) AddEdit(ctx context.Context, e Edit) (id int64, err error) {
	var value *float64
	var shift *int32
	var variable *int16
	switch e.Kind {
	case pipeline.EditReplace, pipeline.EditOffset:
		value = &e.ValueC
	case pipeline.EditShift:
		shift = &e.ShiftS
	}
	if e.Variable != 0 {
		v := int16(e.Variable)
		variable = &v
	}
	err = db.within(ctx, func(tx pgx.Tx) error {
		err := tx.QueryRow(ctx, `insert into thaw.edits (station, kind, variable, sensor, feed, from_utc, to_utc, value_c, shift_s, author, reason)
			select station, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11 from thaw.stations where station = $1 returning edit_id`,
			e.Station, string(e.Kind), variable, e.Sensor, e.Feed, e.FromUTC, e.ToUTC, value, shift, e.Author, e.Reason).Scan(&id)
		if errors.Is(err, pgx.ErrNoRows) {
			return fmt.Errorf("there is no station %q", e.Station)
		}
		if err != nil {
			return err
		}
		return markAnew(ctx, tx, e.Station)
	})
	if err != nil {
		return 0, fmt.Errorf("record edit: %w", err)
	}
	return id, nil
}

// UndoEdit takes an edit back. The row stays.
func (db *DB) UndoEdit(ctx context.Context, id int64, by, reason string) error {
	err := db.within(ctx, func(tx pgx.Tx) error {
		var station string
		err := tx.QueryRow(ctx, `update thaw.edits set undone_at = clock_timestamp(), undone_by = $2, undo_reason = $3
			where edit_id = $1 and undone_at is null returning station`, id, by, reason).Scan(&station)
		if errors.Is(err, pgx.ErrNoRows) {
			return fmt.Errorf("there is no edit %d that applies", id)
		}
		if err != nil {
			return err
		}
		return markAnew(ctx, tx, station)
	})
	if err != nil {
		return fmt.Errorf("undo edit: %w", err)
	}
	return nil
}

func markAnew(ctx context.Context, tx pgx.Tx, station string) error {
	_, err := tx.Exec(ctx, `update thaw.stations set recompute = true where station = $1`, station)
	return err
}

const editColumns = `edit_id, station, kind, coalesce(variable, 0)::smallint, sensor, feed, from_utc, to_utc, coalesce(value_c, 0),
	coalesce(shift_s, 0), author, reason, recorded_at, undone_at, undone_by, undo_reason`

// Edits returns all edits ever made of a station, or of all if station is "",
// oldest first.
func (db *DB) Edits(ctx context.Context, station string) ([]Edit, error) {
	rows, err := db.pool.Query(ctx, `select `+editColumns+` from thaw.edits where $1 = '' or station = $1 order by edit_id`, station)
	if err != nil {
		return nil, fmt.Errorf("read edits: %w", err)
	}
	return collectEdits(rows)
}

// Edits returns the station's edits that apply, oldest first, after them its days
// of maintenance as exclusions.
func (t *Take) Edits(ctx context.Context, st *pipeline.Station) ([]Edit, error) {
	rows, err := t.tx.Query(ctx, `select `+editColumns+` from thaw.edits where station = $1 and undone_at is null order by edit_id`, t.station)
	if err != nil {
		return nil, fmt.Errorf("read edits of %s: %w", t.station, err)
	}
	edits, err := collectEdits(rows)
	if err != nil {
		return nil, err
	}
	spells, err := t.maintenance(ctx, st)
	return append(edits, spells...), err
}

func collectEdits(rows pgx.Rows) ([]Edit, error) {
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (Edit, error) {
		var e Edit
		var variable int16
		err := r.Scan(&e.EditID, &e.Station, &e.Kind, &variable, &e.Sensor, &e.Feed, &e.FromUTC, &e.ToUTC, &e.ValueC, &e.ShiftS,
			&e.Author, &e.Reason, &e.RecordedAt, &e.UndoneAt, &e.UndoneBy, &e.UndoReason)
		e.Variable = pipeline.Variable(variable)
		return e, err
	})
	if err != nil {
		return nil, fmt.Errorf("read edits: %w", err)
	}
	return out, nil
}
