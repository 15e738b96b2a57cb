-- What is measured and what is watched. Rows of n_factors and design_values are
-- never changed or deleted: a change retires one row and writes another, so that
-- a figure can be reproduced as it was known on the day it was sent out.

create table thaw.settings_versions (
    settings_hash text primary key,
    settings_yaml text not null,
    program       text not null,
    recorded_at   timestamptz not null default clock_timestamp()
);
comment on table thaw.settings_versions is 'Every settings file that the daemon has run with, secrets left out.';
comment on column thaw.settings_versions.settings_hash is 'SHA-256 of the settings in force, defaults included.';
comment on column thaw.settings_versions.settings_yaml is 'The settings in force, as `thawledger settings show` prints them.';
comment on column thaw.settings_versions.program is 'Version of the program that read them.';
comment on column thaw.settings_versions.recorded_at is 'When they first came into force.';

create table thaw.stations (
    station            text collate "C" primary key,
    name               text not null,
    latitude_deg       double precision not null,
    longitude_deg      double precision not null,
    elevation_m        double precision not null,
    utc_offset_s       integer not null,
    day_starts_s       integer not null,
    mean_rule          text not null check (mean_rule in ('max_min', 'as_reported', 'hourly')),
    min_hours          smallint not null,
    max_hole_hours     smallint not null,
    base_c             double precision not null,
    fill_days          smallint not null,
    thaw_year_starts   text not null,
    freeze_year_starts text not null,
    recompute          boolean not null default false,
    recorded_at        timestamptz not null default clock_timestamp()
);
comment on table thaw.stations is 'Where air temperature is measured, as the settings in force have it.';
comment on column thaw.stations.station is 'Identifier of the station, as in the settings.';
comment on column thaw.stations.name is 'Name of the station.';
comment on column thaw.stations.latitude_deg is 'Latitude in degrees, + north.';
comment on column thaw.stations.longitude_deg is 'Longitude in degrees, + east.';
comment on column thaw.stations.elevation_m is 'Height above sea level in m.';
comment on column thaw.stations.utc_offset_s is 'Standard time minus UTC in s; there is no daylight saving.';
comment on column thaw.stations.day_starts_s is 'Day boundary in s after local midnight, standard time.';
comment on column thaw.stations.mean_rule is 'How the daily mean is made: max_min = (max + min) / 2, as_reported, hourly.';
comment on column thaw.stations.min_hours is 'Rule hourly: how many of the 24 hours must have a value.';
comment on column thaw.stations.max_hole_hours is 'Rule hourly: longest run of hours without a value that a day may have.';
comment on column thaw.stations.base_c is 'Base temperature of the indices in degC.';
comment on column thaw.stations.fill_days is 'Longest gap in days that is filled on a straight line.';
comment on column thaw.stations.thaw_year_starts is 'First day (month-day) of the year that a thaw season is sought in.';
comment on column thaw.stations.freeze_year_starts is 'First day (month-day) of the year that a freeze season is sought in.';
comment on column thaw.stations.recompute is 'True while the record waits to be made anew by changed rules.';
comment on column thaw.stations.recorded_at is 'When this row was last written.';

create table thaw.sites (
    site    text collate "C" primary key,
    name    text not null,
    station text collate "C" not null references thaw.stations
);
comment on table thaw.sites is 'Assets on frozen ground.';
comment on column thaw.sites.site is 'Identifier of the site, as in the settings.';
comment on column thaw.sites.name is 'Name of the site.';
comment on column thaw.sites.station is 'Station that the site draws on.';
create index on thaw.sites (station);

create table thaw.surfaces (
    site    text collate "C" not null references thaw.sites,
    surface text collate "C" not null,
    name    text not null,
    primary key (site, surface)
);
comment on table thaw.surfaces is 'Parts of a site with n-factors and design values of their own.';
comment on column thaw.surfaces.site is 'Site that the surface belongs to.';
comment on column thaw.surfaces.surface is 'Identifier of the surface within its site.';
comment on column thaw.surfaces.name is 'Name of the surface.';

create table thaw.n_factors (
    n_factor_id bigint generated always as identity primary key,
    site        text collate "C" not null,
    surface     text collate "C" not null,
    kind        text not null check (kind in ('thaw', 'freeze')),
    valid_from  date not null,
    n_factor    double precision not null check (n_factor > 0),
    source      text not null,
    recorded_at timestamptz not null default clock_timestamp(),
    retired_at  timestamptz,
    foreign key (site, surface) references thaw.surfaces
);
comment on table thaw.n_factors is 'Surface index divided by air index of the same season, by surface, kind and date.';
comment on column thaw.n_factors.n_factor_id is 'Number of the row.';
comment on column thaw.n_factors.site is 'Site.';
comment on column thaw.n_factors.surface is 'Surface within the site.';
comment on column thaw.n_factors.kind is 'thaw (n_t) or freeze (n_f).';
comment on column thaw.n_factors.valid_from is 'It holds from the first season that starts on or after this day.';
comment on column thaw.n_factors.n_factor is 'The n-factor, without unit.';
comment on column thaw.n_factors.source is 'Where it was taken from.';
comment on column thaw.n_factors.recorded_at is 'When it became known to the program.';
comment on column thaw.n_factors.retired_at is 'When another took its place; null while in force.';
create unique index n_factors_in_force on thaw.n_factors (site, surface, kind, valid_from) where retired_at is null;

create table thaw.design_values (
    design_value_id bigint generated always as identity primary key,
    site            text collate "C" not null,
    surface         text collate "C" not null,
    kind            text not null check (kind in ('thaw', 'freeze')),
    definition      text not null check (definition in ('curve', 'sum', 'not_stated')),
    index_of        text not null check (index_of in ('air', 'surface')),
    direction       text not null check (direction in ('not_above', 'not_below')),
    base_c          double precision not null,
    valid_from      date not null,
    design_stated   double precision not null,
    unit_stated     text not null check (unit_stated in ('degC.d', 'degF.d', 'K.h')),
    design_c_days   double precision not null check (design_c_days > 0),
    near_share      double precision not null check (near_share > 0 and near_share <= 1),
    source          text not null,
    recorded_at     timestamptz not null default clock_timestamp(),
    retired_at      timestamptz,
    foreign key (site, surface) references thaw.surfaces
);
comment on table thaw.design_values is 'The index that a surface was designed for, with all that an index must share with it to be compared.';
comment on column thaw.design_values.design_value_id is 'Number of the row.';
comment on column thaw.design_values.site is 'Site.';
comment on column thaw.design_values.surface is 'Surface within the site.';
comment on column thaw.design_values.kind is 'thaw or freeze.';
comment on column thaw.design_values.definition is 'curve, sum, or not_stated (then compared with the curve index, the sum shown beside it).';
comment on column thaw.design_values.index_of is 'Whether it limits the air index or the surface index (n-factor times air index).';
comment on column thaw.design_values.direction is 'not_above: a season must not pass it; not_below: a season must reach it.';
comment on column thaw.design_values.base_c is 'Base temperature in degC that it was made with.';
comment on column thaw.design_values.valid_from is 'It holds from the first season that starts on or after this day.';
comment on column thaw.design_values.design_stated is 'The number in its document, in unit_stated.';
comment on column thaw.design_values.unit_stated is 'Unit in its document.';
comment on column thaw.design_values.design_c_days is 'The design value in degC.d.';
comment on column thaw.design_values.near_share is 'Share of the design value from which a surface is near it.';
comment on column thaw.design_values.source is 'Document that states it.';
comment on column thaw.design_values.recorded_at is 'When it became known to the program.';
comment on column thaw.design_values.retired_at is 'When another took its place; null while in force.';
create unique index design_values_in_force
    on thaw.design_values (site, surface, kind, definition, index_of, direction, valid_from) where retired_at is null;
