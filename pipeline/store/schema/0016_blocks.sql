-- Daily values and daily indices lie in blocks: a row holds a station's days of
-- one month, an array a column, so that a record of 30 years is some 400 rows
-- and not 11,000. Their names stay: thaw.daily_values and thaw.air_index_daily
-- are views that give a row a day, by station and by day as fast as rows would.

create table thaw.calendar (
    day   date primary key,
    month date not null
);
comment on table thaw.calendar is 'Every day that a record may have, with the first day of its month.';
comment on column thaw.calendar.day is 'Day.';
comment on column thaw.calendar.month is 'First day of its month.';
insert into thaw.calendar select d, date_trunc('month', d) from generate_series(date '1699-01-01', date '2301-12-31', interval '1 day') d;
create index on thaw.calendar (month);

create table thaw.daily_blocks (
    station        text collate "C" not null,
    month          date not null,
    first_day      date not null,
    last_day       date not null,
    mean_rule      text not null,
    mean_rules     text[],
    mean_c         double precision[] not null,
    max_c          double precision[],
    min_c          double precision[],
    low_c          double precision[],
    high_c         double precision[],
    origin         smallint[],
    hours          smallint[],
    longest_hole   smallint[],
    quality        smallint[],
    error_c        double precision[],
    filled_from    text[],
    tests_made     integer[],
    tests_failed   integer[],
    primary key (station, month),
    check (cardinality(mean_c) = last_day - first_day + 1)
) with (toast_tuple_target = 8160);

create table thaw.index_blocks (
    station                  text collate "C" not null,
    month                    date not null,
    first_day                date not null,
    last_day                 date not null,
    thaw_season              date not null,
    freeze_season            date not null,
    thaw_running_c_days          double precision[],
    thaw_curve_low_c_days        double precision[],
    thaw_curve_high_c_days       double precision[],
    thaw_sum_low_c_days          double precision[],
    thaw_sum_high_c_days         double precision[],
    freeze_running_c_days        double precision[],
    freeze_curve_low_c_days      double precision[],
    freeze_curve_high_c_days     double precision[],
    freeze_sum_low_c_days        double precision[],
    freeze_sum_high_c_days       double precision[],
    thaw_running_all_c_days      double precision,
    thaw_curve_low_all_c_days    double precision,
    thaw_sum_low_all_c_days      double precision,
    freeze_running_all_c_days    double precision,
    freeze_curve_low_all_c_days  double precision,
    freeze_sum_low_all_c_days    double precision,
    before_day                   date not null generated always as (first_day - 1) stored,
    primary key (station, first_day),
    check (cardinality(thaw_curve_low_c_days) = last_day - first_day + 1),
    check ((thaw_curve_low_c_days is null) <> (thaw_curve_low_all_c_days is null))
) with (toast_tuple_target = 8160);
comment on table thaw.daily_blocks is 'Daily values in blocks of a month; thaw.daily_values shows them a row a day. An array has an element a day from first_day to last_day.';
comment on column thaw.daily_blocks.station is 'Station.';
comment on column thaw.daily_blocks.month is 'First day of the month.';
comment on column thaw.daily_blocks.first_day is 'First day of the block.';
comment on column thaw.daily_blocks.last_day is 'Last day of the block.';
comment on column thaw.daily_blocks.mean_rule is 'Rule that made the means.';
comment on column thaw.daily_blocks.mean_rules is 'Rules day by day, where they are not all mean_rule; else null.';
comment on column thaw.daily_blocks.mean_c is 'Daily means, degC; null where missing.';
comment on column thaw.daily_blocks.max_c is 'Daily maxima, degC; null if none is known.';
comment on column thaw.daily_blocks.min_c is 'Daily minima, degC; null if none is known.';
comment on column thaw.daily_blocks.low_c is 'Lowest plausible means, degC; null if no mean is missing: then they are mean_c.';
comment on column thaw.daily_blocks.high_c is 'Highest plausible means, degC, likewise.';
comment on column thaw.daily_blocks.origin is 'Origins of the means as in thaw.daily_values; null if all are 1.';
comment on column thaw.daily_blocks.hours is 'Hours with a value; null if all are 0.';
comment on column thaw.daily_blocks.longest_hole is 'Longest runs of hours without; null if all are 0.';
comment on column thaw.daily_blocks.quality is 'Quality marks; null if all are 0.';
comment on column thaw.daily_blocks.error_c is 'Standard errors of filled means, degC; null if no day is filled.';
comment on column thaw.daily_blocks.filled_from is 'Stations that means were filled from; null if none was.';
comment on column thaw.daily_blocks.tests_made is 'Quality tests made, a bit a test; null if none.';
comment on column thaw.daily_blocks.tests_failed is 'Quality tests failed, a bit a test; null if none.';
comment on table thaw.index_blocks is 'Daily indices in blocks of a month, or less where a thaw or freeze year begins; thaw.air_index_daily shows them a row a day. An array has an element a day from first_day to last_day; where all are the same it is null, and the number stands in the column with all in its name.';
comment on column thaw.index_blocks.station is 'Station.';
comment on column thaw.index_blocks.month is 'First day of the month.';
comment on column thaw.index_blocks.first_day is 'First day of the block.';
comment on column thaw.index_blocks.last_day is 'Last day of the block.';
comment on column thaw.index_blocks.thaw_season is 'First day of the thaw year of all its days.';
comment on column thaw.index_blocks.freeze_season is 'First day of the freeze year of all its days.';
comment on column thaw.index_blocks.thaw_running_c_days is 'Thawing: running values, degC.d; null elements where a gap leaves them open.';
comment on column thaw.index_blocks.thaw_curve_low_c_days is 'Thawing: lowest possible curve indices to date, degC.d.';
comment on column thaw.index_blocks.thaw_curve_high_c_days is 'Thawing: highest possible ones; null if all are those of curve_low.';
comment on column thaw.index_blocks.thaw_sum_low_c_days is 'Thawing: lowest possible sum indices to date, degC.d.';
comment on column thaw.index_blocks.thaw_sum_high_c_days is 'Thawing: highest possible ones; null if all are those of sum_low.';
comment on column thaw.index_blocks.freeze_running_c_days is 'Freezing: running values, degC.d; null elements where a gap leaves them open.';
comment on column thaw.index_blocks.freeze_curve_low_c_days is 'Freezing: lowest possible curve indices to date, degC.d.';
comment on column thaw.index_blocks.freeze_curve_high_c_days is 'Freezing: highest possible ones; null if all are those of curve_low.';
comment on column thaw.index_blocks.freeze_sum_low_c_days is 'Freezing: lowest possible sum indices to date, degC.d.';
comment on column thaw.index_blocks.freeze_sum_high_c_days is 'Freezing: highest possible ones; null if all are those of sum_low.';
comment on column thaw.index_blocks.thaw_running_all_c_days is 'thaw_running_c_days of every day, if it is the same on all.';
comment on column thaw.index_blocks.thaw_curve_low_all_c_days is 'thaw_curve_low_c_days of every day, if it is the same on all.';
comment on column thaw.index_blocks.thaw_sum_low_all_c_days is 'thaw_sum_low_c_days of every day, if it is the same on all.';
comment on column thaw.index_blocks.freeze_running_all_c_days is 'freeze_running_c_days of every day, if it is the same on all.';
comment on column thaw.index_blocks.freeze_curve_low_all_c_days is 'freeze_curve_low_c_days of every day, if it is the same on all.';
comment on column thaw.index_blocks.freeze_sum_low_all_c_days is 'freeze_sum_low_c_days of every day, if it is the same on all.';
comment on column thaw.index_blocks.before_day is 'The day before first_day: a day less this is its place in an array.';
create index on thaw.daily_blocks (month);
create index on thaw.index_blocks (month);
-- A block lies in its row, not beside it.
do $$
declare c record;
begin
    for c in select relname, attname from pg_attribute a join pg_class r on r.oid = a.attrelid join pg_namespace n on n.oid = r.relnamespace
             where n.nspname = 'thaw' and relname in ('daily_blocks', 'index_blocks') and atttypid::regtype::text like '%[]' loop
        execute format('alter table thaw.%I alter %I set storage main', c.relname, c.attname);
    end loop;
end $$;

insert into thaw.daily_blocks (station, month, first_day, last_day, mean_rule, mean_rules, mean_c, max_c, min_c, low_c, high_c,
    origin, hours, longest_hole, quality)
select station, date_trunc('month', day), min(day), max(day), min(mean_rule), array_agg(mean_rule order by day),
       array_agg(mean_c order by day), array_agg(max_c order by day), array_agg(min_c order by day),
       array_agg(low_c order by day), array_agg(high_c order by day), array_agg(origin order by day),
       array_agg(hours order by day), array_agg(longest_hole order by day), array_agg(quality order by day)
from thaw.daily_values group by 1, 2;

insert into thaw.index_blocks (station, month, first_day, last_day, thaw_season, freeze_season,
    thaw_running_c_days, thaw_curve_low_c_days, thaw_curve_high_c_days, thaw_sum_low_c_days, thaw_sum_high_c_days, freeze_running_c_days, freeze_curve_low_c_days, freeze_curve_high_c_days, freeze_sum_low_c_days, freeze_sum_high_c_days)
select station, date_trunc('month', day), min(day), max(day), thaw_season, freeze_season,
       array_agg(thaw_running_c_days order by day),
       array_agg(thaw_curve_low_c_days order by day),
       array_agg(thaw_curve_high_c_days order by day),
       array_agg(thaw_sum_low_c_days order by day),
       array_agg(thaw_sum_high_c_days order by day),
       array_agg(freeze_running_c_days order by day),
       array_agg(freeze_curve_low_c_days order by day),
       array_agg(freeze_curve_high_c_days order by day),
       array_agg(freeze_sum_low_c_days order by day),
       array_agg(freeze_sum_high_c_days order by day)
from thaw.air_index_daily group by 1, 2, 5, 6;
-- Written anew, so that what is usual is left out of them.
update thaw.stations set recompute = true where station in (select station from thaw.daily_blocks);

-- Stations are never deleted, and a look at each for every row written costs more
-- than the row.
alter table thaw.air_index_season drop constraint air_index_season_station_fkey;

drop view thaw.surface_index_daily;
drop table thaw.air_index_daily;
drop table thaw.daily_values;

create view thaw.daily_values as
select c.day, b.station,
       b.mean_c[i.i] as mean_c, b.max_c[i.i] as max_c, b.min_c[i.i] as min_c,
       (coalesce(b.low_c, b.mean_c))[i.i] as low_c, (coalesce(b.high_c, b.mean_c))[i.i] as high_c,
       coalesce(b.origin[i.i], 1::smallint) as origin, coalesce(b.hours[i.i], 0::smallint) as hours,
       coalesce(b.longest_hole[i.i], 0::smallint) as longest_hole, coalesce(b.quality[i.i], 0::smallint) as quality,
       coalesce(b.mean_rules[i.i], b.mean_rule) as mean_rule,
       b.error_c[i.i] as error_c, b.filled_from[i.i] as filled_from,
       coalesce(b.tests_made[i.i], 0) as tests_made, coalesce(b.tests_failed[i.i], 0) as tests_failed
from thaw.daily_blocks b
join thaw.calendar c on c.month = b.month and c.day between b.first_day and b.last_day
cross join lateral (select c.day - b.first_day + 1) as i (i);
comment on view thaw.daily_values is 'One row for every day of a station''s record from the start of its first season: no day is skipped.';
comment on column thaw.daily_values.day is 'The stations day (its standard time and day boundary).';
comment on column thaw.daily_values.station is 'Station.';
comment on column thaw.daily_values.mean_c is 'Daily mean air temperature in degC by mean_rule; null if missing.';
comment on column thaw.daily_values.max_c is 'Daily maximum in degC, where known.';
comment on column thaw.daily_values.min_c is 'Daily minimum in degC, where known.';
comment on column thaw.daily_values.low_c is 'Lowest plausible mean in degC: the mean itself, or for a missing day the lowest of the record within 15 days of the date.';
comment on column thaw.daily_values.high_c is 'Highest plausible mean in degC, likewise.';
comment on column thaw.daily_values.origin is '0 missing, 1 observed, 2 interpolated on a straight line, 3 from a neighbour by regression, 4 climatology.';
comment on column thaw.daily_values.hours is 'Rule hourly: hours with a value.';
comment on column thaw.daily_values.longest_hole is 'Rule hourly: longest run of hours without a value.';
comment on column thaw.daily_values.quality is 'Worst quality mark used, by WMO BUFR table 0 33 020; 7 missing.';
comment on column thaw.daily_values.mean_rule is 'Rule that made the mean: max_min, as_reported or hourly.';
comment on column thaw.daily_values.error_c is 'Standard error of a filled mean, degC; null for an observed or missing day.';
comment on column thaw.daily_values.filled_from is 'Station that the mean was filled from (origin 3).';
comment on column thaw.daily_values.tests_made is 'Quality tests made of the days values, a bit a test: see thaw.quality_outcomes.';
comment on column thaw.daily_values.tests_failed is 'Quality tests that the days values failed, likewise.';

create view thaw.air_index_daily as
select c.day, b.station, b.thaw_season, b.freeze_season,
       coalesce(b.thaw_running_c_days[c.day - b.before_day], b.thaw_running_all_c_days) as thaw_running_c_days,
       case when b.thaw_curve_high_c_days is null or b.thaw_curve_high_c_days[c.day - b.before_day] = coalesce(b.thaw_curve_low_c_days[c.day - b.before_day], b.thaw_curve_low_all_c_days) then coalesce(b.thaw_curve_low_c_days[c.day - b.before_day], b.thaw_curve_low_all_c_days) end as thaw_curve_c_days,
       coalesce(b.thaw_curve_low_c_days[c.day - b.before_day], b.thaw_curve_low_all_c_days) as thaw_curve_low_c_days,
       case when b.thaw_curve_high_c_days is null then coalesce(b.thaw_curve_low_c_days[c.day - b.before_day], b.thaw_curve_low_all_c_days) else b.thaw_curve_high_c_days[c.day - b.before_day] end as thaw_curve_high_c_days,
       case when b.thaw_sum_high_c_days is null or b.thaw_sum_high_c_days[c.day - b.before_day] = coalesce(b.thaw_sum_low_c_days[c.day - b.before_day], b.thaw_sum_low_all_c_days) then coalesce(b.thaw_sum_low_c_days[c.day - b.before_day], b.thaw_sum_low_all_c_days) end as thaw_sum_c_days,
       coalesce(b.thaw_sum_low_c_days[c.day - b.before_day], b.thaw_sum_low_all_c_days) as thaw_sum_low_c_days,
       case when b.thaw_sum_high_c_days is null then coalesce(b.thaw_sum_low_c_days[c.day - b.before_day], b.thaw_sum_low_all_c_days) else b.thaw_sum_high_c_days[c.day - b.before_day] end as thaw_sum_high_c_days,
       coalesce(b.freeze_running_c_days[c.day - b.before_day], b.freeze_running_all_c_days) as freeze_running_c_days,
       case when b.freeze_curve_high_c_days is null or b.freeze_curve_high_c_days[c.day - b.before_day] = coalesce(b.freeze_curve_low_c_days[c.day - b.before_day], b.freeze_curve_low_all_c_days) then coalesce(b.freeze_curve_low_c_days[c.day - b.before_day], b.freeze_curve_low_all_c_days) end as freeze_curve_c_days,
       coalesce(b.freeze_curve_low_c_days[c.day - b.before_day], b.freeze_curve_low_all_c_days) as freeze_curve_low_c_days,
       case when b.freeze_curve_high_c_days is null then coalesce(b.freeze_curve_low_c_days[c.day - b.before_day], b.freeze_curve_low_all_c_days) else b.freeze_curve_high_c_days[c.day - b.before_day] end as freeze_curve_high_c_days,
       case when b.freeze_sum_high_c_days is null or b.freeze_sum_high_c_days[c.day - b.before_day] = coalesce(b.freeze_sum_low_c_days[c.day - b.before_day], b.freeze_sum_low_all_c_days) then coalesce(b.freeze_sum_low_c_days[c.day - b.before_day], b.freeze_sum_low_all_c_days) end as freeze_sum_c_days,
       coalesce(b.freeze_sum_low_c_days[c.day - b.before_day], b.freeze_sum_low_all_c_days) as freeze_sum_low_c_days,
       case when b.freeze_sum_high_c_days is null then coalesce(b.freeze_sum_low_c_days[c.day - b.before_day], b.freeze_sum_low_all_c_days) else b.freeze_sum_high_c_days[c.day - b.before_day] end as freeze_sum_high_c_days
from thaw.index_blocks b
join thaw.calendar c on c.month = b.month and c.day between b.first_day and b.last_day;
comment on view thaw.air_index_daily is 'Thawing and freezing indices of the air up to the end of each day, by both definitions.';
comment on column thaw.air_index_daily.day is 'The station''s day.';
comment on column thaw.air_index_daily.station is 'Station.';
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

create view thaw.surface_index_daily as
select s.site, s.surface, d.station, d.day,
       d.thaw_season, t.n as n_thaw,
       t.n * d.thaw_curve_c_days      as thaw_curve_c_days,
       t.n * d.thaw_curve_low_c_days  as thaw_curve_low_c_days,
       t.n * d.thaw_curve_high_c_days as thaw_curve_high_c_days,
       t.n * d.thaw_sum_c_days        as thaw_sum_c_days,
       d.freeze_season, f.n as n_freeze,
       f.n * d.freeze_curve_c_days      as freeze_curve_c_days,
       f.n * d.freeze_curve_low_c_days  as freeze_curve_low_c_days,
       f.n * d.freeze_curve_high_c_days as freeze_curve_high_c_days,
       f.n * d.freeze_sum_c_days        as freeze_sum_c_days
from thaw.surfaces s
join thaw.sites using (site)
join thaw.air_index_daily d using (station)
cross join lateral (select thaw.n_factor_on(s.site, s.surface, 'thaw', d.thaw_season)) as t (n)
cross join lateral (select thaw.n_factor_on(s.site, s.surface, 'freeze', d.freeze_season)) as f (n);
comment on view thaw.surface_index_daily is 'Surface indices up to the end of each day: n-factor of the season times air index. A season''s n on a part of it is an approximation.';
comment on column thaw.surface_index_daily.site is 'Site.';
comment on column thaw.surface_index_daily.surface is 'Surface.';
comment on column thaw.surface_index_daily.station is 'Station of the air index.';
comment on column thaw.surface_index_daily.day is 'The station''s day.';
comment on column thaw.surface_index_daily.thaw_season is 'First day of the thaw year that the day is in.';
comment on column thaw.surface_index_daily.n_thaw is 'n-factor of the thaw season; null if the surface has none.';
comment on column thaw.surface_index_daily.thaw_curve_c_days is 'Surface thawing index to date, curve definition, degC.d; null where a gap leaves it open.';
comment on column thaw.surface_index_daily.thaw_curve_low_c_days is 'Its lowest possible value, degC.d.';
comment on column thaw.surface_index_daily.thaw_curve_high_c_days is 'Its highest possible value, degC.d.';
comment on column thaw.surface_index_daily.thaw_sum_c_days is 'Surface thawing index to date, sum definition, degC.d.';
comment on column thaw.surface_index_daily.freeze_season is 'First day of the freeze year that the day is in.';
comment on column thaw.surface_index_daily.n_freeze is 'n-factor of the freeze season; null if the surface has none.';
comment on column thaw.surface_index_daily.freeze_curve_c_days is 'Surface freezing index to date, curve definition, degC.d.';
comment on column thaw.surface_index_daily.freeze_curve_low_c_days is 'Its lowest possible value, degC.d.';
comment on column thaw.surface_index_daily.freeze_curve_high_c_days is 'Its highest possible value, degC.d.';
comment on column thaw.surface_index_daily.freeze_sum_c_days is 'Surface freezing index to date, sum definition, degC.d.';
