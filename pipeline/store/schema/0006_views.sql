-- What analysts read of surfaces and of the ledger.

create function thaw.n_factor_on(p_site text, p_surface text, p_kind text, p_season date)
    returns double precision language sql stable parallel safe as $$
    select n_factor from thaw.n_factors
    where site = p_site and surface = p_surface and kind = p_kind
      and valid_from <= p_season and retired_at is null
    order by valid_from desc limit 1
$$;
comment on function thaw.n_factor_on is 'The n-factor that holds for the season that starts on a day: the latest valid by then; null if there is none.';

create view thaw.surface_index_season as
select s.site, s.surface, i.station, i.kind, i.definition, i.season_start, i.season,
       n.n_factor,
       n.n_factor * i.index_c_days      as index_c_days,
       n.n_factor * i.index_low_c_days  as index_low_c_days,
       n.n_factor * i.index_high_c_days as index_high_c_days,
       i.start_day, i.end_day, i.through_day, i.season_over, i.complete, i.no_season,
       i.days_observed, i.days_interpolated, i.days_missing, i.longest_gap_days, i.mean_rule
from thaw.surfaces s
join thaw.sites t using (site)
join thaw.air_index_season i using (station)
cross join lateral (select thaw.n_factor_on(s.site, s.surface, i.kind, i.season_start)) as n (n_factor)
where n.n_factor is not null;
comment on view thaw.surface_index_season is 'Seasonal surface indices: n-factor times air index. While the season is open, a season''s n on a part of it is an approximation.';
comment on column thaw.surface_index_season.site is 'Site.';
comment on column thaw.surface_index_season.surface is 'Surface.';
comment on column thaw.surface_index_season.station is 'Station of the air index.';
comment on column thaw.surface_index_season.kind is 'thaw or freeze.';
comment on column thaw.surface_index_season.definition is 'curve or sum.';
comment on column thaw.surface_index_season.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.surface_index_season.season is 'Name of the season.';
comment on column thaw.surface_index_season.n_factor is 'n-factor of the season, without unit.';
comment on column thaw.surface_index_season.index_c_days is 'Surface index, degC.d; null where missing days leave it open.';
comment on column thaw.surface_index_season.index_low_c_days is 'Lowest possible surface index, degC.d.';
comment on column thaw.surface_index_season.index_high_c_days is 'Highest possible surface index, degC.d.';
comment on column thaw.surface_index_season.start_day is 'First day of the season.';
comment on column thaw.surface_index_season.end_day is 'Last day of the season.';
comment on column thaw.surface_index_season.through_day is 'Last day used.';
comment on column thaw.surface_index_season.season_over is 'Whether the season is over.';
comment on column thaw.surface_index_season.complete is 'Season over and no day missing.';
comment on column thaw.surface_index_season.no_season is 'Over and never began.';
comment on column thaw.surface_index_season.days_observed is 'Days with an observed mean.';
comment on column thaw.surface_index_season.days_interpolated is 'Days filled on a straight line.';
comment on column thaw.surface_index_season.days_missing is 'Days without a mean.';
comment on column thaw.surface_index_season.longest_gap_days is 'Longest run of days that were not observed.';
comment on column thaw.surface_index_season.mean_rule is 'Rule of the daily mean.';

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

create view thaw.ledger as
select f.feed, b.batch_id, b.name, b.source_time, b.opened_at, b.bytes,
       case when b.state <> 'read' then b.state
            when coalesce(p.stuck, 0) > 0 then 'stuck'
            when coalesce(p.committed, 0) < b.parts then 'on its way'
            else 'done' end as state,
       coalesce(b.reason, p.reason) as reason,
       b.lines, b.lines_header, b.lines_blank, b.lines_comment,
       b.rows, b.rows_read, b.rows_without_value, b.rows_set_aside,
       b.cells, b.cells_read - coalesce(p.repeated, 0) as readings, b.cells_missing, b.cells_set_aside,
       coalesce(p.repeated, 0) as cells_repeated,
       b.parts, coalesce(p.committed, 0) as parts_committed, coalesce(p.stuck, 0) as parts_stuck,
       p.readings_new, p.readings_changed, p.readings_unchanged
from thaw.batches b
join thaw.feeds f using (feed_id)
left join lateral (
    select count(committed_at) as committed, count(stuck_at) as stuck,
           min(q.reason) filter (where stuck_at is not null) as reason,
           sum(readings_repeated) as repeated, sum(readings_new) as readings_new,
           sum(readings_changed) as readings_changed, sum(readings_unchanged) as readings_unchanged
    from thaw.batch_parts q where q.batch_id = b.batch_id) p on true;
comment on view thaw.ledger is 'What arrived and what became of it. For a batch that is done: rows = rows_read + rows_without_value + rows_set_aside; cells = readings + cells_missing + cells_set_aside + cells_repeated; readings = readings_new + readings_changed + readings_unchanged.';
comment on column thaw.ledger.feed is 'Feed.';
comment on column thaw.ledger.batch_id is 'Batch.';
comment on column thaw.ledger.name is 'Name of the file.';
comment on column thaw.ledger.source_time is 'When the source says it was written (UTC).';
comment on column thaw.ledger.opened_at is 'When the line was opened.';
comment on column thaw.ledger.bytes is 'Length in bytes.';
comment on column thaw.ledger.state is 'opened, held_back, waiting, on its way, stuck or done.';
comment on column thaw.ledger.reason is 'Why it is held back, waiting or stuck.';
comment on column thaw.ledger.lines is 'Lines of the file.';
comment on column thaw.ledger.lines_header is 'Lines up to and including the line of column names.';
comment on column thaw.ledger.lines_blank is 'Blank lines.';
comment on column thaw.ledger.lines_comment is 'Comment lines.';
comment on column thaw.ledger.rows is 'Data rows.';
comment on column thaw.ledger.rows_read is 'Rows that gave at least one reading.';
comment on column thaw.ledger.rows_without_value is 'Rows in which nothing usable was sent.';
comment on column thaw.ledger.rows_set_aside is 'Rows that could not be read.';
comment on column thaw.ledger.cells is 'Cells in mapped columns.';
comment on column thaw.ledger.readings is 'Readings, each key of the batch once.';
comment on column thaw.ledger.cells_missing is 'Cells without a value.';
comment on column thaw.ledger.cells_set_aside is 'Cells that could not be read.';
comment on column thaw.ledger.cells_repeated is 'Cells whose key another row of the batch gives again.';
comment on column thaw.ledger.parts is 'Parts that it was sent in.';
comment on column thaw.ledger.parts_committed is 'Parts committed.';
comment on column thaw.ledger.parts_stuck is 'Parts given up.';
comment on column thaw.ledger.readings_new is 'Readings with a new key.';
comment on column thaw.ledger.readings_changed is 'Readings that took the place of another.';
comment on column thaw.ledger.readings_unchanged is 'Readings that were there already, or lost against a later batch.';

create view thaw.standing_now as
select distinct on (s.site, s.surface, s.kind, d.definition, d.index_of, d.direction)
       s.site, t.name as site_name, s.surface, u.name as surface_name, t.station, s.kind, d.definition, d.index_of, d.direction,
       s.season, s.season_start, s.day, s.state, s.level,
       s.index_c_days, s.index_low_c_days, s.index_high_c_days, s.sum_beside_c_days, s.design_c_days,
       s.index_low_c_days / s.design_c_days as share_of_design,
       s.n_factor, d.design_stated, d.unit_stated, d.source as design_source,
       s.near_on, s.exceeded_on, s.confirmed_on, s.days_interpolated, s.days_missing, s.season_over,
       i.onset_provisional, s.design_value_id
from thaw.standings s
join thaw.design_values d using (design_value_id)
join thaw.sites t on t.site = s.site
join thaw.surfaces u on u.site = s.site and u.surface = s.surface
left join thaw.air_index_season i on i.station = t.station and i.kind = s.kind and i.season_start = s.season_start
     and i.definition = case d.definition when 'sum' then 'sum' else 'curve' end
order by s.site, s.surface, s.kind, d.definition, d.index_of, d.direction,
         -- what must be reached is known at a season's end: until then the last one that is over is shown
         d.direction = 'not_below' and s.state = 'unknown' and not s.season_over, s.season_start desc;
comment on view thaw.standing_now is 'The current standing of every surface. Screening figures: local codes and a licensed engineer decide.';
comment on column thaw.standing_now.site is 'Site.';
comment on column thaw.standing_now.site_name is 'Its name.';
comment on column thaw.standing_now.surface is 'Surface.';
comment on column thaw.standing_now.surface_name is 'Its name.';
comment on column thaw.standing_now.station is 'Station that the site draws on.';
comment on column thaw.standing_now.kind is 'thaw or freeze.';
comment on column thaw.standing_now.definition is 'Definition of the design value: curve, sum or not_stated (compared with the curve index).';
comment on column thaw.standing_now.index_of is 'air or surface.';
comment on column thaw.standing_now.direction is 'not_above or not_below.';
comment on column thaw.standing_now.season is 'Name of the season.';
comment on column thaw.standing_now.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.standing_now.day is 'Standing date: the last day used.';
comment on column thaw.standing_now.state is 'exceeded, unknown, expected, near, within or fell_short.';
comment on column thaw.standing_now.level is 'within, near or exceeded by the index alone.';
comment on column thaw.standing_now.index_c_days is 'Index compared, degC.d; null where missing days leave it open.';
comment on column thaw.standing_now.index_low_c_days is 'Lowest possible index, degC.d.';
comment on column thaw.standing_now.index_high_c_days is 'Highest possible index, degC.d.';
comment on column thaw.standing_now.sum_beside_c_days is 'Sum index beside a design value of no stated definition, degC.d.';
comment on column thaw.standing_now.design_c_days is 'Design value, degC.d.';
comment on column thaw.standing_now.share_of_design is 'Lowest possible index divided by the design value.';
comment on column thaw.standing_now.n_factor is 'n-factor applied; null for a design value of the air.';
comment on column thaw.standing_now.design_stated is 'Design value as its document states it.';
comment on column thaw.standing_now.unit_stated is 'Unit in its document.';
comment on column thaw.standing_now.design_source is 'Document that states it.';
comment on column thaw.standing_now.near_on is 'First day near the design value.';
comment on column thaw.standing_now.exceeded_on is 'First day at or past it.';
comment on column thaw.standing_now.confirmed_on is 'First day on which even the lowest possible index was.';
comment on column thaw.standing_now.days_interpolated is 'Days of the season filled on a straight line.';
comment on column thaw.standing_now.days_missing is 'Days of the season without a mean.';
comment on column thaw.standing_now.season_over is 'Whether the season is over.';
comment on column thaw.standing_now.onset_provisional is 'The start of the season may still move.';
comment on column thaw.standing_now.design_value_id is 'Number of the design value.';
