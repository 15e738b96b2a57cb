-- Normalised readings. A reading's key is station, feed, sensor, variable,
-- level, length and start of its span. All but the start is a series; the
-- rows themselves (reading_values) hold a series number, so that they stay
-- narrow. thaw.readings joins the two for reading.

create table thaw.series (
    series_id integer generated always as identity primary key,
    station   text collate "C" not null references thaw.stations,
    feed_id   smallint not null references thaw.feeds,
    sensor    text collate "C" not null,
    variable  smallint not null check (variable between 1 and 4),
    level_m   double precision not null,
    span_s    integer not null check (span_s >= 0),
    unique (station, feed_id, sensor, variable, level_m, span_s)
);
comment on table thaw.series is 'What readings have in common apart from their time.';
comment on column thaw.series.series_id is 'Number of the series.';
comment on column thaw.series.station is 'Station.';
comment on column thaw.series.feed_id is 'Feed that it came by.';
comment on column thaw.series.sensor is 'Sensor, as the layout names it.';
comment on column thaw.series.variable is '1 air_temp (at an instant), 2 air_temp_mean, 3 air_temp_max, 4 air_temp_min.';
comment on column thaw.series.level_m is 'Height of the sensor in m, + above, - below ground.';
comment on column thaw.series.span_s is 'Length in s of what a reading covers; 0 for an instant.';

create function thaw.variable_name(smallint) returns text language sql immutable parallel safe
    return (array['air_temp', 'air_temp_mean', 'air_temp_max', 'air_temp_min'])[$1];
comment on function thaw.variable_name is 'Name of a variable''s number.';

-- No foreign keys: the rows are written under the station's lock by code that
-- has just looked the series and the batch up, and a check a row would double
-- the cost of a load.
create table thaw.reading_values (
    start_utc timestamptz not null,
    value_c   double precision not null check (value_c between -100 and 100),
    series_id integer not null,
    batch_id  integer not null,
    row_no    integer not null,
    quality   smallint not null,
    primary key (series_id, start_utc)
);
comment on table thaw.reading_values is 'Readings, one row each, by series number; see the view readings.';
comment on column thaw.reading_values.start_utc is 'Start of the span that the reading covers.';
comment on column thaw.reading_values.value_c is 'Value in degC.';
comment on column thaw.reading_values.series_id is 'Series.';
comment on column thaw.reading_values.batch_id is 'Batch that it came in.';
comment on column thaw.reading_values.row_no is 'Data row of the batch, from 1.';
comment on column thaw.reading_values.quality is 'Quality mark by WMO BUFR table 0 33 020.';

create table thaw.reading_values_replaced (
    start_utc          timestamptz not null,
    value_c            double precision not null,
    series_id          integer not null,
    batch_id           integer not null,
    row_no             integer not null,
    replaced_by_batch  integer not null,
    replaced_by_row    integer not null,
    quality            smallint not null,
    replaced_at        timestamptz not null default clock_timestamp()
);
create index on thaw.reading_values_replaced (series_id, start_utc);
comment on table thaw.reading_values_replaced is 'Values that lost their place, or never had it, by series number; see the view readings_replaced.';
comment on column thaw.reading_values_replaced.start_utc is 'Start of the span.';
comment on column thaw.reading_values_replaced.value_c is 'Value in degC.';
comment on column thaw.reading_values_replaced.series_id is 'Series.';
comment on column thaw.reading_values_replaced.batch_id is 'Batch that it came in.';
comment on column thaw.reading_values_replaced.row_no is 'Data row of that batch.';
comment on column thaw.reading_values_replaced.replaced_by_batch is 'Batch of the value that counts instead.';
comment on column thaw.reading_values_replaced.replaced_by_row is 'Data row of that batch.';
comment on column thaw.reading_values_replaced.quality is 'Quality mark by WMO BUFR table 0 33 020.';
comment on column thaw.reading_values_replaced.replaced_at is 'When.';

create view thaw.readings as
select s.station, f.feed, s.sensor, thaw.variable_name(s.variable) as variable, s.level_m,
       v.start_utc, s.span_s, v.value_c, v.quality, v.batch_id, v.row_no
from thaw.reading_values v join thaw.series s using (series_id) join thaw.feeds f using (feed_id);
comment on view thaw.readings is 'Every normalised reading that counts, with the batch and row that it came from.';
comment on column thaw.readings.station is 'Station.';
comment on column thaw.readings.feed is 'Feed that it came by.';
comment on column thaw.readings.sensor is 'Sensor, as the layout names it.';
comment on column thaw.readings.variable is 'air_temp (at an instant), air_temp_mean, air_temp_max or air_temp_min (over the span).';
comment on column thaw.readings.level_m is 'Height of the sensor in m, + above, - below ground.';
comment on column thaw.readings.start_utc is 'Start of the span that the reading covers.';
comment on column thaw.readings.span_s is 'Length of the span in s; 0 for an instant.';
comment on column thaw.readings.value_c is 'Value in degC.';
comment on column thaw.readings.quality is 'Quality mark by WMO BUFR table 0 33 020.';
comment on column thaw.readings.batch_id is 'Batch that it came in (thaw.batches).';
comment on column thaw.readings.row_no is 'Data row of the batch, from 1.';

create view thaw.readings_replaced as
select s.station, f.feed, s.sensor, thaw.variable_name(s.variable) as variable, s.level_m,
       v.start_utc, s.span_s, v.value_c, v.quality, v.batch_id, v.row_no,
       v.replaced_by_batch, v.replaced_by_row, v.replaced_at
from thaw.reading_values_replaced v join thaw.series s using (series_id) join thaw.feeds f using (feed_id);
comment on view thaw.readings_replaced is 'Readings that were corrected, or came after what corrects them.';
comment on column thaw.readings_replaced.station is 'Station.';
comment on column thaw.readings_replaced.feed is 'Feed that it came by.';
comment on column thaw.readings_replaced.sensor is 'Sensor, as the layout names it.';
comment on column thaw.readings_replaced.variable is 'What it is a value of.';
comment on column thaw.readings_replaced.level_m is 'Height of the sensor in m, + above, - below ground.';
comment on column thaw.readings_replaced.start_utc is 'Start of the span that the reading covers.';
comment on column thaw.readings_replaced.span_s is 'Length of the span in s; 0 for an instant.';
comment on column thaw.readings_replaced.value_c is 'Value in degC.';
comment on column thaw.readings_replaced.quality is 'Quality mark by WMO BUFR table 0 33 020.';
comment on column thaw.readings_replaced.batch_id is 'Batch that it came in.';
comment on column thaw.readings_replaced.row_no is 'Data row of that batch.';
comment on column thaw.readings_replaced.replaced_by_batch is 'Batch of the value that counts instead.';
comment on column thaw.readings_replaced.replaced_by_row is 'Data row of that batch.';
comment on column thaw.readings_replaced.replaced_at is 'When it lost its place.';

do $$
begin
    if exists (select 1 from pg_extension where extname = 'timescaledb') then
        perform create_hypertable('thaw.reading_values', 'start_utc',
            chunk_time_interval => interval '1 year', create_default_indexes => false);
    end if;
end $$;
