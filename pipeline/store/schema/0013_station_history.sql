-- What happened to a station, and records that are joined from several.

create table thaw.station_history (
    history_id  bigint generated always as identity primary key,
    station     text collate "C" not null references thaw.stations,
    what        text not null check (what in ('sensor', 'shield', 'height', 'moved', 'calibrated', 'visit', 'maintenance', 'outage')),
    from_day    date not null,
    to_day      date not null,
    note        text not null,
    recorded_at timestamptz not null default clock_timestamp(),
    retired_at  timestamptz,
    check (from_day <= to_day)
);
comment on table thaw.station_history is 'Dated facts of stations, as the settings state them. A row is never changed: one that is stated no longer is retired.';
comment on column thaw.station_history.history_id is 'Number of the row.';
comment on column thaw.station_history.station is 'Station.';
comment on column thaw.station_history.what is 'sensor, shield, height, moved, calibrated: a possible break of the record; visit; maintenance: readings of these days are not used; outage: planned, no readings are to be expected.';
comment on column thaw.station_history.from_day is 'First day (the station''s day).';
comment on column thaw.station_history.to_day is 'Last day.';
comment on column thaw.station_history.note is 'What was done.';
comment on column thaw.station_history.recorded_at is 'When it became known to the program.';
comment on column thaw.station_history.retired_at is 'When it was stated no longer; null while it is.';
create unique index station_history_stated on thaw.station_history (station, what, from_day, to_day, md5(note)) where retired_at is null;

create table thaw.station_members (
    station   text collate "C" not null references thaw.stations,
    place     smallint not null,
    member    text collate "C" not null references thaw.stations,
    until_day date,
    adjust_c  double precision[] not null check (cardinality(adjust_c) = 12),
    error_c   double precision not null check (error_c >= 0),
    source    text not null,
    primary key (station, place)
);
create index on thaw.station_members (member);
comment on table thaw.station_members is 'Records that are joined from those of several stations, one after another.';
comment on column thaw.station_members.station is 'The joined record.';
comment on column thaw.station_members.place is 'Its members in order, from 1.';
comment on column thaw.station_members.member is 'Station whose daily values it takes.';
comment on column thaw.station_members.until_day is 'Last day of the member; null for the last.';
comment on column thaw.station_members.adjust_c is 'degC added to the member''s daily values, January to December.';
comment on column thaw.station_members.error_c is 'Standard error of the adjustment, degC.';
comment on column thaw.station_members.source is 'Where the adjustment is from.';
