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
