-- How surfaces stand against their design values, and what was made of it.

create table thaw.exceedances (
    exceedance_id    bigint generated always as identity primary key,
    design_value_id  bigint not null references thaw.design_values,
    site             text collate "C" not null,
    surface          text collate "C" not null,
    kind             text not null,
    season_start     date not null,
    near_on          date,
    exceeded_on      date,
    confirmed_on     date,
    through_day      date not null,
    index_c_days      double precision,
    index_low_c_days  double precision not null,
    index_high_c_days double precision not null,
    design_c_days     double precision not null,
    n_factor          double precision,
    days_interpolated smallint not null,
    days_missing      smallint not null,
    fell_short       boolean not null default false,
    opened_at        timestamptz not null default clock_timestamp(),
    changed_at       timestamptz not null default clock_timestamp(),
    closed_on        date,
    closed_as        text check (closed_as in ('season over', 'withdrawn', 'design value replaced')),
    closed_at        timestamptz,
    check ((closed_as is null) = (closed_at is null))
);
create unique index exceedances_standing on thaw.exceedances (design_value_id, season_start)
    where closed_as is null or closed_as = 'season over';
comment on table thaw.exceedances is 'A surface''s stay above within in one season, with the figures that it rests on. Screening figures: local codes and a licensed engineer decide.';
comment on column thaw.exceedances.exceedance_id is 'Number of the exceedance.';
comment on column thaw.exceedances.design_value_id is 'Design value that it is judged by.';
comment on column thaw.exceedances.site is 'Site.';
comment on column thaw.exceedances.surface is 'Surface.';
comment on column thaw.exceedances.kind is 'thaw or freeze.';
comment on column thaw.exceedances.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.exceedances.near_on is 'First day on which the index was near the design value.';
comment on column thaw.exceedances.exceeded_on is 'First day on which the index was at or past the design value.';
comment on column thaw.exceedances.confirmed_on is 'First day on which even the lowest possible index was.';
comment on column thaw.exceedances.through_day is 'Last day used.';
comment on column thaw.exceedances.index_c_days is 'Index compared, degC.d; null where missing days leave it open.';
comment on column thaw.exceedances.index_low_c_days is 'Lowest possible index, degC.d.';
comment on column thaw.exceedances.index_high_c_days is 'Highest possible index, degC.d.';
comment on column thaw.exceedances.design_c_days is 'Design value, degC.d.';
comment on column thaw.exceedances.n_factor is 'n-factor applied; null for a design value of the air.';
comment on column thaw.exceedances.days_interpolated is 'Days of the season filled on a straight line.';
comment on column thaw.exceedances.days_missing is 'Days of the season without a mean.';
comment on column thaw.exceedances.fell_short is 'Direction not_below: the season ended below the design value.';
comment on column thaw.exceedances.opened_at is 'When it was first seen.';
comment on column thaw.exceedances.changed_at is 'When its figures last changed.';
comment on column thaw.exceedances.closed_on is 'Day on which it ended.';
comment on column thaw.exceedances.closed_as is 'season over; withdrawn: a correction took it back; design value replaced.';
comment on column thaw.exceedances.closed_at is 'When that was seen.';

create table thaw.standings (
    design_value_id   bigint not null references thaw.design_values,
    season_start      date not null,
    site              text collate "C" not null,
    surface           text collate "C" not null,
    kind              text not null,
    season            text not null,
    day               date not null,
    state             text not null check (state in ('exceeded', 'unknown', 'expected', 'near', 'within', 'fell_short')),
    level             text not null check (level in ('within', 'near', 'exceeded')),
    straddles         boolean not null,
    index_c_days      double precision,
    index_low_c_days  double precision not null,
    index_high_c_days double precision not null,
    sum_beside_c_days double precision,
    design_c_days     double precision not null,
    n_factor          double precision,
    near_on           date,
    exceeded_on       date,
    confirmed_on      date,
    days_interpolated smallint not null,
    days_missing      smallint not null,
    season_over       boolean not null,
    judged_at         timestamptz not null default clock_timestamp(),
    primary key (design_value_id, season_start)
);
comment on table thaw.standings is 'How a surface stands against a design value: one row a season, the newest being the current one. Screening figures: local codes and a licensed engineer decide.';
comment on column thaw.standings.design_value_id is 'Design value.';
comment on column thaw.standings.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.standings.site is 'Site.';
comment on column thaw.standings.surface is 'Surface.';
comment on column thaw.standings.kind is 'thaw or freeze.';
comment on column thaw.standings.season is 'Name of the season, as 2031 or 2031-32.';
comment on column thaw.standings.day is 'Standing date: the last day used.';
comment on column thaw.standings.state is 'What is shown, the first that is true of: exceeded, unknown (low and high lie on either side of the design value), expected, near, within; fell_short for not_below at the season''s end.';
comment on column thaw.standings.level is 'within, near or exceeded by the index (by its low bound where it is open).';
comment on column thaw.standings.straddles is 'Whether the design value lies between the lowest and highest possible index.';
comment on column thaw.standings.index_c_days is 'Index compared, degC.d, to date while the season is not over; null where missing days leave it open.';
comment on column thaw.standings.index_low_c_days is 'Lowest possible index, degC.d.';
comment on column thaw.standings.index_high_c_days is 'Highest possible index, degC.d.';
comment on column thaw.standings.sum_beside_c_days is 'Sum index (low bound), degC.d, where the design value does not state its definition.';
comment on column thaw.standings.design_c_days is 'Design value, degC.d.';
comment on column thaw.standings.n_factor is 'n-factor applied; null for a design value of the air. A season''s n on a part of it is an approximation.';
comment on column thaw.standings.near_on is 'First day near the design value.';
comment on column thaw.standings.exceeded_on is 'First day at or past it.';
comment on column thaw.standings.confirmed_on is 'First day on which even the lowest possible index was.';
comment on column thaw.standings.days_interpolated is 'Days of the season filled on a straight line.';
comment on column thaw.standings.days_missing is 'Days of the season without a mean.';
comment on column thaw.standings.season_over is 'Whether the season is over.';
comment on column thaw.standings.judged_at is 'When it was judged.';

create table thaw.standing_changes (
    change_id         bigint generated always as identity primary key,
    design_value_id   bigint not null references thaw.design_values,
    exceedance_id     bigint references thaw.exceedances,
    site              text collate "C" not null,
    surface           text collate "C" not null,
    kind              text not null,
    season_start      date not null,
    day               date not null,
    from_state        text,
    to_state          text not null,
    why               text not null,
    index_c_days      double precision,
    index_low_c_days  double precision not null,
    index_high_c_days double precision not null,
    design_c_days     double precision not null,
    exceeded_on       date,
    announce          boolean not null,
    recorded_at       timestamptz not null default clock_timestamp(),
    announced_at      timestamptz
);
create index standing_changes_unannounced on thaw.standing_changes (change_id) where announce and announced_at is null;
comment on table thaw.standing_changes is 'Every change of a standing''s state, with its figures; rows are only added.';
comment on column thaw.standing_changes.change_id is 'Number of the change.';
comment on column thaw.standing_changes.design_value_id is 'Design value.';
comment on column thaw.standing_changes.exceedance_id is 'Exceedance that it belongs to, if any.';
comment on column thaw.standing_changes.site is 'Site.';
comment on column thaw.standing_changes.surface is 'Surface.';
comment on column thaw.standing_changes.kind is 'thaw or freeze.';
comment on column thaw.standing_changes.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.standing_changes.day is 'Standing date.';
comment on column thaw.standing_changes.from_state is 'State before; null for the first.';
comment on column thaw.standing_changes.to_state is 'State after.';
comment on column thaw.standing_changes.why is 'What brought it about: progress, correction, gap, gap closed, season over, first judgement.';
comment on column thaw.standing_changes.index_c_days is 'Index compared, degC.d.';
comment on column thaw.standing_changes.index_low_c_days is 'Lowest possible index, degC.d.';
comment on column thaw.standing_changes.index_high_c_days is 'Highest possible index, degC.d.';
comment on column thaw.standing_changes.design_c_days is 'Design value, degC.d.';
comment on column thaw.standing_changes.exceeded_on is 'First day at or past the design value.';
comment on column thaw.standing_changes.announce is 'Whether it is told; changes of closed seasons are recorded as history and never told.';
comment on column thaw.standing_changes.recorded_at is 'When it was recorded.';
comment on column thaw.standing_changes.announced_at is 'When it was put on the bus.';
