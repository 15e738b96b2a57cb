-- n-factors with their range, and measured surfaces.

alter table thaw.n_factors add column n_low double precision check (n_low > 0 and n_low <= n_factor);
alter table thaw.n_factors add column n_high double precision check (n_high >= n_factor);
comment on column thaw.n_factors.n_low is 'Lower end of its range; null where none is stated.';
comment on column thaw.n_factors.n_high is 'Upper end of its range; null where none is stated.';
alter table thaw.surfaces add column measured_by text collate "C" references thaw.stations;
comment on column thaw.surfaces.measured_by is 'Station that measures the surface''s own temperature; null where none does.';

create or replace function thaw.variable_name(smallint) returns text language sql immutable strict parallel safe as $$
    select (array['air_temp', 'air_temp_mean', 'air_temp_max', 'air_temp_min',
                  'surface_temp', 'surface_temp_mean', 'surface_temp_max', 'surface_temp_min'])[$1]
$$;
comment on column thaw.series.variable is '1 air_temp (at an instant), 2 air_temp_mean, 3 air_temp_max, 4 air_temp_min; 5 to 8 the same of surface_temp.';

create or replace view thaw.surface_index_season as
select s.site, s.surface, i.station, i.kind, i.definition, i.season_start, i.season,
       n.n_factor,
       n.n_factor * i.index_c_days      as index_c_days,
       n.n_factor * i.index_low_c_days  as index_low_c_days,
       n.n_factor * i.index_high_c_days as index_high_c_days,
       i.start_day, i.end_day, i.through_day, i.season_over, i.complete, i.no_season,
       i.days_observed, i.days_interpolated, i.days_missing, i.longest_gap_days, i.mean_rule,
       n.n_low, n.n_high,
       n.n_low * i.index_low_c_days   as at_n_low_c_days,
       n.n_high * i.index_high_c_days as at_n_high_c_days,
       i.days_neighbour, i.days_climatology,
       n.n_factor * i.standard_error_c_days as standard_error_c_days,
       i.homogeneous
from thaw.surfaces s
join thaw.sites t using (site)
join thaw.air_index_season i using (station)
cross join lateral (
    select f.n_factor, coalesce(f.n_low, f.n_factor) as n_low, coalesce(f.n_high, f.n_factor) as n_high
    from thaw.n_factors f
    where f.site = s.site and f.surface = s.surface and f.kind = i.kind and f.valid_from <= i.season_start and f.retired_at is null
    order by f.valid_from desc limit 1) as n;
comment on column thaw.surface_index_season.n_low is 'Lower end of the n-factor''s range; the n-factor where none is stated.';
comment on column thaw.surface_index_season.n_high is 'Upper end of the n-factor''s range; the n-factor where none is stated.';
comment on column thaw.surface_index_season.at_n_low_c_days is 'Surface index at the lower end of the range, and the lowest filling of missing days, degC.d.';
comment on column thaw.surface_index_season.at_n_high_c_days is 'Surface index at the upper end of the range, and the highest filling of missing days, degC.d.';
comment on column thaw.surface_index_season.days_neighbour is 'Days filled by regression on a neighbour.';
comment on column thaw.surface_index_season.days_climatology is 'Days filled with the mean of the date.';
comment on column thaw.surface_index_season.standard_error_c_days is 'n-factor times the standard error that filled days give the air index, degC.d; the n-factor''s own uncertainty is not in it.';
comment on column thaw.surface_index_season.homogeneous is 'Whether the air record of the season is homogeneous: see thaw.air_index_season.';

create view thaw.measured_n as
select s.site, s.surface, a.kind, a.definition, a.season_start, a.season, s.measured_by,
       m.index_c_days as surface_c_days, a.index_c_days as air_c_days, m.index_c_days / a.index_c_days as n_measured
from thaw.surfaces s
join thaw.sites t using (site)
join thaw.air_index_season a on a.station = t.station
join thaw.air_index_season m on m.station = s.measured_by and (m.kind, m.definition, m.season_start) = (a.kind, a.definition, a.season_start)
where a.season_over and m.season_over and a.index_c_days >= 50 and m.index_c_days is not null and a.base_c = m.base_c;
comment on view thaw.measured_n is 'n-factors as measured: surface index by the surface''s own sensor, divided by the air index of the same season. Seasons that are over and that no missing day leaves open, with an air index of 50 degC.d or more (common practice, no source).';
comment on column thaw.measured_n.site is 'Site.';
comment on column thaw.measured_n.surface is 'Surface.';
comment on column thaw.measured_n.kind is 'thaw or freeze.';
comment on column thaw.measured_n.definition is 'curve or sum.';
comment on column thaw.measured_n.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.measured_n.season is 'Name of the season.';
comment on column thaw.measured_n.measured_by is 'Station that measures the surface.';
comment on column thaw.measured_n.surface_c_days is 'Surface index as measured, degC.d.';
comment on column thaw.measured_n.air_c_days is 'Air index at the site''s station, degC.d.';
comment on column thaw.measured_n.n_measured is 'The one divided by the other.';
alter table thaw.series drop constraint series_variable_check;
alter table thaw.series add check (variable between 1 and 8);
