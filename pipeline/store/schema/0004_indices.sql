-- Daily means and the indices that follow from them. Everything here can be
-- made anew from the readings; no row is ever incremented.

create table thaw.daily_values (
    day          date not null,
    mean_c       double precision,
    max_c        double precision,
    min_c        double precision,
    low_c        double precision not null,
    high_c       double precision not null,
    origin       smallint not null check (origin in (0, 1, 2)),
    hours        smallint not null,
    longest_hole smallint not null,
    quality      smallint not null,
    mean_rule    text not null,
    station      text collate "C" not null,
    primary key (station, day),
    check ((mean_c is null) = (origin = 0)),
    check (low_c <= high_c)
);
comment on table thaw.daily_values is 'One row for every day of a station''s record from the start of its first season: no day is skipped.';
comment on column thaw.daily_values.day is 'The station''s day (its standard time and day boundary).';
comment on column thaw.daily_values.mean_c is 'Daily mean air temperature in degC by mean_rule; null if missing.';
comment on column thaw.daily_values.max_c is 'Daily maximum in degC, where known.';
comment on column thaw.daily_values.min_c is 'Daily minimum in degC, where known.';
comment on column thaw.daily_values.low_c is 'Lowest plausible mean in degC: the mean itself, or for a missing day the lowest of the record within 15 days of the date.';
comment on column thaw.daily_values.high_c is 'Highest plausible mean in degC, likewise.';
comment on column thaw.daily_values.origin is '0 missing, 1 observed, 2 interpolated on a straight line.';
comment on column thaw.daily_values.hours is 'Rule hourly: hours with a value.';
comment on column thaw.daily_values.longest_hole is 'Rule hourly: longest run of hours without a value.';
comment on column thaw.daily_values.quality is 'Worst quality mark used, by WMO BUFR table 0 33 020; 7 missing.';
comment on column thaw.daily_values.mean_rule is 'Rule that made the mean: max_min, as_reported or hourly.';
comment on column thaw.daily_values.station is 'Station.';

create table thaw.air_index_daily (
    day                      date not null,
    thaw_season              date not null,
    freeze_season            date not null,
    thaw_running_c_days      double precision,
    thaw_curve_c_days        double precision,
    thaw_curve_low_c_days    double precision not null,
    thaw_curve_high_c_days   double precision not null,
    thaw_sum_c_days          double precision,
    thaw_sum_low_c_days      double precision not null,
    thaw_sum_high_c_days     double precision not null,
    freeze_running_c_days    double precision,
    freeze_curve_c_days      double precision,
    freeze_curve_low_c_days  double precision not null,
    freeze_curve_high_c_days double precision not null,
    freeze_sum_c_days        double precision,
    freeze_sum_low_c_days    double precision not null,
    freeze_sum_high_c_days   double precision not null,
    station                  text collate "C" not null,
    primary key (station, day)
);
comment on table thaw.air_index_daily is 'Thawing and freezing indices of the air up to the end of each day, by both definitions.';
comment on column thaw.air_index_daily.day is 'The station''s day.';
comment on column thaw.air_index_daily.thaw_season is 'First day of the thaw year that the day is in.';
comment on column thaw.air_index_daily.freeze_season is 'First day of the freeze year that the day is in.';
comment on column thaw.air_index_daily.thaw_running_c_days is 'Cumulative degree-days minus their lowest value so far in the thaw year, degC.d: falls again in autumn. Null where a gap leaves it open.';
comment on column thaw.air_index_daily.thaw_curve_c_days is 'Curve index to date, degC.d: the largest running value so far. Null where a gap leaves it between low and high.';
comment on column thaw.air_index_daily.thaw_curve_low_c_days is 'Lowest possible curve index to date, degC.d, missing days filled with the lowest plausible means.';
comment on column thaw.air_index_daily.thaw_curve_high_c_days is 'Highest possible curve index to date, degC.d.';
comment on column thaw.air_index_daily.thaw_sum_c_days is 'Sum index to date, degC.d: sum of the positive daily excesses over the base. Null where a gap leaves it open.';
comment on column thaw.air_index_daily.thaw_sum_low_c_days is 'Lowest possible sum index to date, degC.d.';
comment on column thaw.air_index_daily.thaw_sum_high_c_days is 'Highest possible sum index to date, degC.d.';
comment on column thaw.air_index_daily.freeze_running_c_days is 'As thaw_running_c_days, for freezing: the highest cumulative value so far in the freeze year minus the present one.';
comment on column thaw.air_index_daily.freeze_curve_c_days is 'As thaw_curve_c_days, for freezing.';
comment on column thaw.air_index_daily.freeze_curve_low_c_days is 'As thaw_curve_low_c_days, for freezing.';
comment on column thaw.air_index_daily.freeze_curve_high_c_days is 'As thaw_curve_high_c_days, for freezing.';
comment on column thaw.air_index_daily.freeze_sum_c_days is 'As thaw_sum_c_days, for freezing.';
comment on column thaw.air_index_daily.freeze_sum_low_c_days is 'As thaw_sum_low_c_days, for freezing.';
comment on column thaw.air_index_daily.freeze_sum_high_c_days is 'As thaw_sum_high_c_days, for freezing.';
comment on column thaw.air_index_daily.station is 'Station.';

create table thaw.air_index_season (
    station             text collate "C" not null references thaw.stations,
    kind                text not null check (kind in ('thaw', 'freeze')),
    definition          text not null check (definition in ('curve', 'sum')),
    season_start        date not null,
    season              text not null,
    index_c_days        double precision,
    index_low_c_days    double precision not null,
    index_high_c_days   double precision not null,
    start_day           date,
    end_day             date,
    through_day         date not null,
    season_over         boolean not null,
    complete            boolean not null,
    no_season           boolean not null,
    edge_provisional    boolean not null,
    onset_provisional   boolean not null,
    days_observed       smallint not null,
    days_interpolated   smallint not null,
    days_missing        smallint not null,
    longest_gap_days    smallint not null,
    mean_rule           text not null,
    base_c              double precision not null,
    primary key (station, kind, definition, season_start)
);
comment on table thaw.air_index_season is 'One row a station, kind, definition and season.';
comment on column thaw.air_index_season.station is 'Station.';
comment on column thaw.air_index_season.kind is 'thaw or freeze.';
comment on column thaw.air_index_season.definition is 'curve: rise of the cumulative degree-day curve from low to high; sum: daily excesses of one sign only.';
comment on column thaw.air_index_season.season_start is 'First day of the thaw or freeze year: the key of the season.';
comment on column thaw.air_index_season.season is 'Its usual name, as 2031 or 2031-32.';
comment on column thaw.air_index_season.index_c_days is 'Index in degC.d, to date while the season is not over; null where missing days leave it between low and high.';
comment on column thaw.air_index_season.index_low_c_days is 'Lowest possible index in degC.d.';
comment on column thaw.air_index_season.index_high_c_days is 'Highest possible index in degC.d.';
comment on column thaw.air_index_season.start_day is 'First day of the season: the day after the low of the curve (of the low filling where days are missing).';
comment on column thaw.air_index_season.end_day is 'Last day of the season: the day of the high of the curve; to date while it is not over.';
comment on column thaw.air_index_season.through_day is 'Last day used.';
comment on column thaw.air_index_season.season_over is 'Whether the record reaches the end of the thaw or freeze year.';
comment on column thaw.air_index_season.complete is 'Season over and no day missing.';
comment on column thaw.air_index_season.no_season is 'The season is over and never began: there was no thaw (no freeze) at all.';
comment on column thaw.air_index_season.edge_provisional is 'An end of the season lies on the edge of the year or beside a missing day.';
comment on column thaw.air_index_season.onset_provisional is 'The running value has not yet passed 50 degC.d (common practice, no source): the start may still move.';
comment on column thaw.air_index_season.days_observed is 'Days with an observed mean.';
comment on column thaw.air_index_season.days_interpolated is 'Days filled on a straight line.';
comment on column thaw.air_index_season.days_missing is 'Days without a mean.';
comment on column thaw.air_index_season.longest_gap_days is 'Longest run of days that were not observed.';
comment on column thaw.air_index_season.mean_rule is 'Rule of the daily mean.';
comment on column thaw.air_index_season.base_c is 'Base temperature in degC.';

create table thaw.changes (
    change_id   bigint generated always as identity primary key,
    station     text collate "C" not null,
    from_day    date not null,
    recorded_at timestamptz not null default clock_timestamp()
);
create index on thaw.changes (station);
comment on table thaw.changes is 'Stations whose indices changed and whose surfaces wait to be judged; a line goes when it is done.';
comment on column thaw.changes.change_id is 'Number of the line.';
comment on column thaw.changes.station is 'Station.';
comment on column thaw.changes.from_day is 'First day whose index changed.';
comment on column thaw.changes.recorded_at is 'When.';

do $$
begin
    if exists (select 1 from pg_extension where extname = 'timescaledb') then
        perform create_hypertable('thaw.daily_values', 'day',
            chunk_time_interval => interval '5 years', create_default_indexes => false);
        perform create_hypertable('thaw.air_index_daily', 'day',
            chunk_time_interval => interval '5 years', create_default_indexes => false);
    end if;
end $$;
