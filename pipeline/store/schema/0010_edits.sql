-- Corrections that people make. A reading is never touched by one: an edit
-- applies when daily values are made, and undoing it leaves no trace but itself.

create table thaw.edits (
    edit_id     bigint generated always as identity primary key,
    station     text collate "C" not null references thaw.stations,
    kind        text not null check (kind in ('exclude', 'replace', 'offset', 'shift')),
    variable    smallint check (variable between 1 and 4),
    sensor      text collate "C" not null default '',
    feed        text collate "C" not null default '',
    from_utc    timestamptz not null,
    to_utc      timestamptz not null,
    value_c     double precision,
    shift_s     integer,
    author      text not null check (author <> ''),
    reason      text not null check (reason <> ''),
    recorded_at timestamptz not null default clock_timestamp(),
    undone_at   timestamptz,
    undone_by   text,
    undo_reason text,
    check (from_utc < to_utc),
    check ((kind in ('replace', 'offset')) = (value_c is not null)),
    check ((kind = 'shift') = (shift_s is not null)),
    check (kind <> 'replace' or variable in (2, 3, 4)),
    check ((undone_at is null) = (undone_by is null) and (undone_at is null) = (undo_reason is null))
);
create index on thaw.edits (station) where undone_at is null;
comment on table thaw.edits is 'Corrections made by hand, with author and reason. They apply when daily values are made; the readings stay as they came.';
comment on column thaw.edits.edit_id is 'Number of the edit.';
comment on column thaw.edits.station is 'Station.';
comment on column thaw.edits.kind is 'exclude: readings are not used; replace: a day''s maximum, minimum or mean is value_c; offset: value_c is added to values; shift: shift_s is added to times.';
comment on column thaw.edits.variable is 'Variable concerned, as thaw.series numbers them; null for all.';
comment on column thaw.edits.sensor is 'Sensor concerned; empty for all.';
comment on column thaw.edits.feed is 'Feed concerned; empty for all.';
comment on column thaw.edits.from_utc is 'First start of readings concerned.';
comment on column thaw.edits.to_utc is 'Starts before this are concerned.';
comment on column thaw.edits.value_c is 'Value in degC: put in the place (replace), or added (offset).';
comment on column thaw.edits.shift_s is 'Seconds added to times.';
comment on column thaw.edits.author is 'Who made it.';
comment on column thaw.edits.reason is 'Why.';
comment on column thaw.edits.recorded_at is 'When it was made.';
comment on column thaw.edits.undone_at is 'When it was taken back; null while it applies.';
comment on column thaw.edits.undone_by is 'Who took it back.';
comment on column thaw.edits.undo_reason is 'Why.';
