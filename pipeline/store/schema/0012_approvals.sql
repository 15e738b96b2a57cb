-- A record is provisional until a person approves it through a date. What would
-- change an approved day waits for a decision.

create table thaw.approvals (
    approval_id     bigint generated always as identity primary key,
    station         text collate "C" not null references thaw.stations,
    through_day     date not null,
    through_utc     timestamptz not null,
    approved_by     text not null check (approved_by <> ''),
    note            text not null,
    recorded_at     timestamptz not null default clock_timestamp(),
    withdrawn_at    timestamptz,
    withdrawn_by    text,
    withdraw_reason text,
    check ((withdrawn_at is null) = (withdrawn_by is null) and (withdrawn_at is null) = (withdraw_reason is null))
);
comment on table thaw.approvals is 'Who has approved a station''s record through which day. The latest day of those not withdrawn counts; later days are provisional.';
comment on column thaw.approvals.approval_id is 'Number of the approval.';
comment on column thaw.approvals.station is 'Station.';
comment on column thaw.approvals.through_day is 'Last day approved (the station''s day).';
comment on column thaw.approvals.through_utc is 'End of that day.';
comment on column thaw.approvals.approved_by is 'Who answers for it.';
comment on column thaw.approvals.note is 'What was looked at.';
comment on column thaw.approvals.recorded_at is 'When it was approved.';
comment on column thaw.approvals.withdrawn_at is 'When the approval was withdrawn; null while it counts.';
comment on column thaw.approvals.withdrawn_by is 'Who withdrew it.';
comment on column thaw.approvals.withdraw_reason is 'Why.';

create table thaw.corrections (
    series_id integer not null references thaw.series,
    start_utc timestamptz not null,
    value_c   double precision not null,
    quality   smallint not null,
    batch_id  integer not null references thaw.batches,
    row_no    integer not null,
    noted_at  timestamptz not null default clock_timestamp(),
    primary key (batch_id, series_id, start_utc, row_no)
);
comment on table thaw.corrections is 'Readings that would change an approved day and wait for a decision on their batch.';
comment on column thaw.corrections.series_id is 'Series (thaw.series).';
comment on column thaw.corrections.start_utc is 'Start of the span.';
comment on column thaw.corrections.value_c is 'Value in degC.';
comment on column thaw.corrections.quality is 'Quality mark by WMO BUFR table 0 33 020.';
comment on column thaw.corrections.batch_id is 'Batch that it came in.';
comment on column thaw.corrections.row_no is 'Data row of the batch.';
comment on column thaw.corrections.noted_at is 'When it came.';

alter table thaw.batches add column decision text check (decision in ('accepted', 'rejected'));
alter table thaw.batches add column decided_by text;
alter table thaw.batches add column decision_reason text;
alter table thaw.batches add column decided_at timestamptz;
comment on column thaw.batches.decision is 'What was decided on its readings that would change approved days; null where nothing was to be decided, or is yet.';
comment on column thaw.batches.decided_by is 'Who decided.';
comment on column thaw.batches.decision_reason is 'Why.';
comment on column thaw.batches.decided_at is 'When.';

create or replace view thaw.standing_now as
select distinct on (s.site, s.surface, s.kind, d.definition, d.index_of, d.direction)
       s.site, t.name as site_name, s.surface, u.name as surface_name, t.station, s.kind, d.definition, d.index_of, d.direction,
       s.season, s.season_start, s.day, s.state, s.level,
       s.index_c_days, s.index_low_c_days, s.index_high_c_days, s.sum_beside_c_days, s.design_c_days,
       s.index_low_c_days / s.design_c_days as share_of_design,
       s.n_factor, d.design_stated, d.unit_stated, d.source as design_source,
       s.near_on, s.exceeded_on, s.confirmed_on, s.days_interpolated, s.days_missing, s.season_over,
       i.onset_provisional, s.design_value_id,
       (select max(a.through_day) from thaw.approvals a where a.station = t.station and a.withdrawn_at is null) as approved_through
from thaw.standings s
join thaw.design_values d using (design_value_id)
join thaw.sites t on t.site = s.site
join thaw.surfaces u on u.site = s.site and u.surface = s.surface
left join thaw.air_index_season i on i.station = t.station and i.kind = s.kind and i.season_start = s.season_start
     and i.definition = case d.definition when 'sum' then 'sum' else 'curve' end
order by s.site, s.surface, s.kind, d.definition, d.index_of, d.direction,
         -- what must be reached is known at a season's end: until then the last one that is over is shown
         d.direction = 'not_below' and s.state = 'unknown' and not s.season_over, s.season_start desc;
comment on column thaw.standing_now.approved_through is 'Last day of the station''s record that a person has approved; later days are provisional. Null if none is.';
