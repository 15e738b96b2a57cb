-- Days filled from neighbours, with the error that this gives an index, and what
-- an expert asks of a season: how homogeneous its record is, and how much of it
-- rests on doubtful values.

alter table thaw.stations add column climatology_fills boolean not null default false;
comment on column thaw.stations.climatology_fills is 'Whether the mean of the date may fill days that nothing better fills.';
alter table thaw.stations add column measures text not null default 'air' check (measures in ('air', 'surface'));
comment on column thaw.stations.measures is 'air, or surface: a sensor on or in a surface, whose index is a surface index and no air index.';
alter table thaw.stations add column bases text not null default '';
comment on column thaw.stations.bases is 'Base temperatures by date, as "02-01 -1.67, 03-15 -4.44" in degC; empty where base_c holds all year.';
alter table thaw.stations add column reindex boolean not null default false;
comment on column thaw.stations.reindex is 'The indices wait to be worked out anew from the daily values.';

alter table thaw.stations add column refill boolean not null default false;
comment on column thaw.stations.refill is 'Its missing days wait to be filled anew: a neighbour''s observed days have changed.';

create table thaw.station_neighbours (
    station   text collate "C" not null references thaw.stations,
    place     smallint not null,
    neighbour text collate "C" not null references thaw.stations,
    primary key (station, place)
);
create index on thaw.station_neighbours (neighbour);
comment on table thaw.station_neighbours is 'Stations that missing days are filled from by regression, best first where they are equally good.';
comment on column thaw.station_neighbours.station is 'Station whose days are filled.';
comment on column thaw.station_neighbours.place is 'Its neighbours in the order of the settings, from 1.';
comment on column thaw.station_neighbours.neighbour is 'Neighbour.';

alter table thaw.air_index_season add column days_neighbour smallint not null default 0;
alter table thaw.air_index_season add column days_climatology smallint not null default 0;
alter table thaw.air_index_season add column standard_error_c_days double precision;
alter table thaw.air_index_season add column days_doubtful smallint not null default 0;
alter table thaw.air_index_season add column without_doubtful_low_c_days double precision;
alter table thaw.air_index_season add column without_doubtful_high_c_days double precision;
alter table thaw.air_index_season add column homogeneous boolean not null default true;
comment on column thaw.air_index_season.days_neighbour is 'Days filled by regression on a neighbour.';
comment on column thaw.air_index_season.days_climatology is 'Days filled with the mean of the date.';
comment on column thaw.air_index_season.standard_error_c_days is 'Standard error of the index that the filled days give it, degC.d; null where no day is filled. The errors of measuring are not in it.';
comment on column thaw.air_index_season.days_doubtful is 'Days whose mean rests on a value marked doubtful or inconsistent. They are in the index.';
comment on column thaw.air_index_season.without_doubtful_low_c_days is 'Lowest possible index if those days are taken for missing, degC.d; null where there are none.';
comment on column thaw.air_index_season.without_doubtful_high_c_days is 'Highest possible index if those days are taken for missing, degC.d.';
comment on column thaw.air_index_season.homogeneous is 'False where the rule of the mean is not that of the record''s other days, or a possible break of the record lies within the season: see thaw.record_breaks.';

create view thaw.record_breaks as
select station, from_day as day, what, note from thaw.station_history
where retired_at is null and what in ('sensor', 'shield', 'height', 'moved', 'calibrated')
union all
select m.station, n.until_day + 1, 'handed over', n.member || ' to ' || m.member
from thaw.station_members m join thaw.station_members n on n.station = m.station and n.place = m.place - 1
union all
select b.station, b.first_day, 'rule', b.before || ' to ' || b.mean_rule
from (select station, first_day, mean_rule, lag(mean_rule) over (partition by station order by month) as before from thaw.daily_blocks) b
where b.before <> b.mean_rule;
comment on view thaw.record_breaks is 'Days from which a station''s record may not compare with what it was before.';
comment on column thaw.record_breaks.station is 'Station.';
comment on column thaw.record_breaks.day is 'First day after the change.';
comment on column thaw.record_breaks.what is 'sensor, shield, height, moved, calibrated as the settings state them; handed over: a joined record goes on with another station; rule: the rule of the daily mean is another (the month from which).';
comment on column thaw.record_breaks.note is 'What is known of it.';
comment on column thaw.air_index_season.onset_provisional is 'The running value has not yet passed the largest relapse that a past season has met with from this date on (with fewer than ten complete past seasons 50 degC.d: common practice, no source): the start may still move.';
