-- Whether two databases hold the same, and the role that may only read.

create function thaw.fingerprint_tables() returns table (part text, rows bigint, hash text)
language sql stable as $$
    -- The sum of 64-bit hashes of whole rows does not depend on their order.
    -- Left out: numbers of rows and batches, clock times, hosts, attempts.
    with h (part, row_hash) as (
        select 'stations', hashtextextended((s.station, s.name, s.latitude_deg, s.longitude_deg, s.elevation_m,
                   s.utc_offset_s, s.day_starts_s, s.mean_rule, s.min_hours, s.max_hole_hours, s.base_c, s.fill_days,
                   s.thaw_year_starts, s.freeze_year_starts)::text, 0) from thaw.stations s
        union all
        select 'surfaces', hashtextextended((s.site, s.surface, s.name, t.name, t.station)::text, 0)
          from thaw.surfaces s join thaw.sites t using (site)
        union all
        select 'n_factors', hashtextextended((site, surface, kind, valid_from, n_factor, source)::text, 0)
          from thaw.n_factors where retired_at is null
        union all
        select 'design_values', hashtextextended((site, surface, kind, definition, index_of, direction, base_c, valid_from,
                   design_stated, unit_stated, design_c_days, near_share, source)::text, 0)
          from thaw.design_values where retired_at is null
        union all
        select 'batches', hashtextextended((feed, b.name, content_hash, bytes, layout_hash, state, lines, lines_header,
                   lines_blank, lines_comment, rows, rows_read, rows_without_value, rows_set_aside, cells, cells_read,
                   cells_missing, cells_set_aside, parts)::text, 0)
          from thaw.batches b join thaw.feeds using (feed_id)
        union all
        select 'batch_parts', hashtextextended((feed, b.content_hash, part, station, readings,
                   committed_at is not null, stuck_at is not null)::text, 0)
          from thaw.batch_parts join thaw.batches b using (batch_id) join thaw.feeds using (feed_id)
        union all
        select 'set_aside', hashtextextended((feed, content_hash, line, column_no, row_no, column_name, code,
                   a.reason, raw)::text, 0)
          from thaw.set_aside a join thaw.batches b using (batch_id) join thaw.feeds using (feed_id)
        union all
        select 'readings', hashtextextended((s.station, f.feed, s.sensor, s.variable, s.level_m, s.span_s, v.start_utc,
                   v.value_c, v.quality, b.content_hash, v.row_no)::text, 0)
          from thaw.reading_values v join thaw.series s using (series_id) join thaw.feeds f using (feed_id)
          join thaw.batches b using (batch_id)
        union all
        -- values that count no longer, each once: which of several equal ones
        -- was written down depends on the order of arrival
        select 'readings_replaced', hashtextextended(r::text, 0) from (
            select distinct s.station, f.feed, s.sensor, s.variable, s.level_m, s.span_s, p.start_utc, p.value_c, p.quality
            from thaw.reading_values_replaced p join thaw.series s using (series_id) join thaw.feeds f using (feed_id)
            left join thaw.reading_values v using (series_id, start_utc)
            where (v.value_c, v.quality) is distinct from (p.value_c, p.quality)) r
        union all
        select 'daily_values', hashtextextended(d::text, 0) from thaw.daily_values d
        union all
        select 'air_index_daily', hashtextextended(d::text, 0) from thaw.air_index_daily d
        union all
        select 'air_index_season', hashtextextended(d::text, 0) from thaw.air_index_season d
        union all
        select 'standings', hashtextextended((s.site, s.surface, s.kind, d.definition, d.index_of, d.direction, d.valid_from,
                   s.season_start, s.season, s.day, s.state, s.level, s.straddles, s.index_c_days, s.index_low_c_days,
                   s.index_high_c_days, s.sum_beside_c_days, s.design_c_days, s.n_factor, s.near_on, s.exceeded_on,
                   s.confirmed_on, s.days_interpolated, s.days_missing, s.season_over)::text, 0)
          from thaw.standings s join thaw.design_values d using (design_value_id)
        union all
        select 'exceedances', hashtextextended((e.site, e.surface, e.kind, d.definition, d.index_of, d.direction, d.valid_from,
                   e.season_start, e.near_on, e.exceeded_on, e.confirmed_on, e.through_day, e.index_c_days,
                   e.index_low_c_days, e.index_high_c_days, e.design_c_days, e.n_factor, e.days_interpolated,
                   e.days_missing, e.fell_short, e.closed_on, e.closed_as)::text, 0)
          from thaw.exceedances e join thaw.design_values d using (design_value_id)
          where e.closed_as is null or e.closed_as = 'season over'
    )
    select part, count(*), md5(coalesce(sum(row_hash::numeric), 0)::text) from h group by part order by part collate "C"
$$;
comment on function thaw.fingerprint_tables is 'Rows and a hash for each table, bookkeeping left out; for finding where two databases differ.';

create function thaw.fingerprint() returns text language sql stable as $$
    select md5(coalesce(string_agg(part || ' ' || rows || ' ' || hash, e'\n' order by part collate "C"), '')) from thaw.fingerprint_tables()
$$;
comment on function thaw.fingerprint is 'One hash over all that the program holds, bookkeeping (numbers of rows and batches, clock times, hosts, attempts) left out. Equal in two databases that hold the same.';

-- Roles belong to the whole server: another database may have made it already,
-- or be making it now, and the program's own role may not be allowed to.
do $$
begin
    create role thaw_reader nologin;
exception
    when duplicate_object or unique_violation then null;
    when insufficient_privilege then
        raise warning 'role thaw_reader is missing and may not be created here; have an administrator run: create role thaw_reader nologin';
end $$;
do $$
begin
    if exists (select 1 from pg_roles where rolname = 'thaw_reader') then
        grant usage on schema thaw to thaw_reader;
        grant select on all tables in schema thaw to thaw_reader;
        grant execute on all functions in schema thaw to thaw_reader;
        alter default privileges in schema thaw grant select on tables to thaw_reader;
    end if;
end $$;
