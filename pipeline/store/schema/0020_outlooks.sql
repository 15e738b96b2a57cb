-- What seasons that are not over may come to, and what such outlooks of past
-- seasons were worth.

create table thaw.outlooks (
    outlook_id        bigint generated always as identity primary key,
    station           text collate "C" not null references thaw.stations,
    kind              text not null check (kind in ('thaw', 'freeze')),
    definition        text not null check (definition in ('curve', 'sum')),
    season_start      date not null,
    season            text not null,
    through_day       date not null,
    design_value_id   bigint references thaw.design_values,
    threshold_c_days  double precision not null,
    n_factor          double precision,
    index_low_c_days  double precision not null,
    index_high_c_days double precision not null,
    probability       double precision check (probability between 0 and 1),
    probability_low   double precision not null check (probability_low between 0 and 1),
    probability_high  double precision not null check (probability_high between probability_low and 1),
    passed            boolean not null,
    pass_day_10       date,
    pass_day_50       date,
    pass_day_90       date,
    end_10_c_days     double precision not null,
    end_50_c_days     double precision,
    end_90_c_days     double precision not null,
    members           smallint not null,
    which             text not null check (which in ('raw', 'moved')),
    lead_month        smallint not null,
    scored_years      smallint not null,
    crps_skill        double precision,
    crps_skill_low    double precision,
    crps_skill_high   double precision,
    brier_skill       double precision,
    brier_skill_low   double precision,
    brier_skill_high  double precision,
    announced_allowed boolean not null,
    made_at           timestamptz not null default clock_timestamp(),
    unique nulls not distinct (station, kind, definition, season_start, through_day, design_value_id, threshold_c_days)
);
create index on thaw.outlooks (design_value_id, season_start, through_day);
comment on table thaw.outlooks is 'What a season may come to against a threshold of the air index, as seen at the end of a day: past years'' remaining daily means joined to this year''s. One row a station, kind, definition, season, day and threshold; made again for the same day it takes the place of the row before, and earlier days stay. Screening figures: local codes and a licensed engineer decide.';
comment on column thaw.outlooks.outlook_id is 'Number of the row.';
comment on column thaw.outlooks.station is 'Station.';
comment on column thaw.outlooks.kind is 'thaw or freeze.';
comment on column thaw.outlooks.definition is 'Definition of the index: curve or sum. A design value that does not state its own is held against the curve index.';
comment on column thaw.outlooks.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.outlooks.season is 'Its usual name, as 2031 or 2031-32.';
comment on column thaw.outlooks.through_day is 'Last day of the season that was used. The day before season_start if nothing of it was known.';
comment on column thaw.outlooks.design_value_id is 'Design value that the threshold is; null for another.';
comment on column thaw.outlooks.threshold_c_days is 'Threshold, air index in degC.d: a design value of a surface is divided by its n-factor.';
comment on column thaw.outlooks.n_factor is 'n-factor that it was divided by; null for one of the air. A season''s n on a part of it is an approximation.';
comment on column thaw.outlooks.index_low_c_days is 'Lowest possible air index to date, degC.d.';
comment on column thaw.outlooks.index_high_c_days is 'Highest possible air index to date, degC.d; the same unless missing days leave it open.';
comment on column thaw.outlooks.probability is 'Probability that the season''s index comes to the threshold or past it, by (k + 1/2)/(n + 1) with k of n members doing so; null where missing days leave it between low and high. Where the index must come to it (not_below), 1 less this is the probability that it falls short.';
comment on column thaw.outlooks.probability_low is 'Lowest probability, missing days at their least counting means.';
comment on column thaw.outlooks.probability_high is 'Highest probability, missing days at their most counting means.';
comment on column thaw.outlooks.passed is 'Whether even the lowest index to date is there already.';
comment on column thaw.outlooks.pass_day_10 is 'Day by which it comes to the threshold in 10 % of the members that do (quantiles by Hyndman and Fan 1996, definition 6); null if none does. With open missing days: of the highest path.';
comment on column thaw.outlooks.pass_day_50 is 'Likewise 50 %.';
comment on column thaw.outlooks.pass_day_90 is 'Likewise 90 %; with open missing days of the lowest path, if any member passes on it.';
comment on column thaw.outlooks.end_10_c_days is 'Air index at the season''s end, degC.d, that 10 % of members are at most (on the lowest path).';
comment on column thaw.outlooks.end_50_c_days is 'Likewise 50 %; null where missing days leave it open.';
comment on column thaw.outlooks.end_90_c_days is 'Likewise 90 % (on the highest path).';
comment on column thaw.outlooks.members is 'Past years that it is made of.';
comment on column thaw.outlooks.which is 'raw: years as they were; moved: shifted by the trend between their year and this one.';
comment on column thaw.outlooks.lead_month is 'Calendar months from that of the day after through_day to that of the end of the thaw or freeze year.';
comment on column thaw.outlooks.scored_years is 'Past seasons whose outlooks at this lead, from years before them, were scored; 0 if none.';
comment on column thaw.outlooks.crps_skill is 'Share by which their continuous ranked probability score is better than that of the climatology (see thaw.outlook_scores); null if unknown.';
comment on column thaw.outlooks.crps_skill_low is 'Lower end of its sampling interval (5 %); null with fewer than 10 seasons.';
comment on column thaw.outlooks.crps_skill_high is 'Upper end (95 %).';
comment on column thaw.outlooks.brier_skill is 'The same of the Brier score of probabilities.';
comment on column thaw.outlooks.brier_skill_low is 'Lower end of its sampling interval (5 %).';
comment on column thaw.outlooks.brier_skill_high is 'Upper end (95 %).';
comment on column thaw.outlooks.announced_allowed is 'Whether a state of expected may be announced on it: crps_skill_low is above zero. Without skill nothing is announced, whatever the probability.';
comment on column thaw.outlooks.made_at is 'When it was made.';

create table thaw.outlook_scores (
    station            text collate "C" not null references thaw.stations,
    kind               text not null check (kind in ('thaw', 'freeze')),
    definition         text not null check (definition in ('curve', 'sum')),
    years_from         text not null check (years_from in ('earlier', 'others')),
    which              text not null check (which in ('raw', 'moved')),
    lead_month         smallint not null,
    used               boolean not null,
    years_used         smallint not null,
    n                  smallint not null,
    crps               double precision not null,
    crps_fair          double precision not null,
    crps_climatology   double precision not null,
    crps_climatology_raw   double precision not null,
    crps_climatology_moved double precision not null,
    skill              double precision,
    skill_low          double precision,
    skill_high         double precision,
    skill_fair         double precision,
    brier              double precision not null,
    brier_climatology  double precision not null,
    brier_skill        double precision,
    brier_skill_low    double precision,
    brier_skill_high   double precision,
    pinball_10         double precision not null,
    pinball_50         double precision not null,
    pinball_90         double precision not null,
    pinball_climatology_10 double precision not null,
    pinball_climatology_50 double precision not null,
    pinball_climatology_90 double precision not null,
    thresholds_c_days  double precision[] not null,
    made_at            timestamptz not null default clock_timestamp(),
    primary key (station, kind, definition, years_from, which, lead_month)
);
comment on table thaw.outlook_scores is 'What outlooks of past seasons, made as they could have been made then (issued on the 1st and 16th of each month), were worth by lead; all scores are lower the better. Made anew as the record grows.';
comment on column thaw.outlook_scores.station is 'Station.';
comment on column thaw.outlook_scores.kind is 'thaw or freeze.';
comment on column thaw.outlook_scores.definition is 'curve or sum.';
comment on column thaw.outlook_scores.years_from is 'earlier: from years before the season only, as on the day; others: from all years but the season''s own, which flatters in a warming record.';
comment on column thaw.outlook_scores.which is 'raw: years as they were; moved: shifted by the trend between their year and the season''s.';
comment on column thaw.outlook_scores.lead_month is 'Calendar months from that of the issue to that of the end of the thaw or freeze year; 12 is before the season.';
comment on column thaw.outlook_scores.used is 'Whether outlooks are made this way: earlier years, and the set with the lower CRPS over all leads.';
comment on column thaw.outlook_scores.years_used is 'Seasons scored.';
comment on column thaw.outlook_scores.n is 'Outlooks scored.';
comment on column thaw.outlook_scores.crps is 'Mean continuous ranked probability score, degC.d.';
comment on column thaw.outlook_scores.crps_fair is 'The same corrected for the number of members (Ferro 2014), degC.d.';
comment on column thaw.outlook_scores.crps_climatology is 'That of the end indices of the seasons known by the same rule, degC.d: of raw and moved the better.';
comment on column thaw.outlook_scores.crps_climatology_raw is 'Of the end indices as they were.';
comment on column thaw.outlook_scores.crps_climatology_moved is 'Of the end indices moved along their own trend to the season''s year.';
comment on column thaw.outlook_scores.skill is '1 - crps / crps_climatology; null if the latter is zero.';
comment on column thaw.outlook_scores.skill_low is 'Lower end (5 %) of the interval from samples of the seasons drawn with replacement; null with fewer than 10 seasons.';
comment on column thaw.outlook_scores.skill_high is 'Upper end (95 %).';
comment on column thaw.outlook_scores.skill_fair is '1 - crps_fair / that of the climatology.';
comment on column thaw.outlook_scores.brier is 'Mean Brier score over thresholds_c_days.';
comment on column thaw.outlook_scores.brier_climatology is 'That of the climatology, of raw and moved the better.';
comment on column thaw.outlook_scores.brier_skill is '1 - brier / brier_climatology; null if the latter is zero.';
comment on column thaw.outlook_scores.brier_skill_low is 'Lower end (5 %), likewise.';
comment on column thaw.outlook_scores.brier_skill_high is 'Upper end (95 %), likewise.';
comment on column thaw.outlook_scores.pinball_10 is 'Mean quantile score of the 10 % value, degC.d.';
comment on column thaw.outlook_scores.pinball_50 is 'Of the 50 % value.';
comment on column thaw.outlook_scores.pinball_90 is 'Of the 90 % value.';
comment on column thaw.outlook_scores.pinball_climatology_10 is 'Of the climatology''s 10 % value.';
comment on column thaw.outlook_scores.pinball_climatology_50 is 'Of its 50 % value.';
comment on column thaw.outlook_scores.pinball_climatology_90 is 'Of its 90 % value.';
comment on column thaw.outlook_scores.thresholds_c_days is 'Thresholds of the Brier score, air index in degC.d: design values, or quantiles of the record where crossings of those are rare.';
comment on column thaw.outlook_scores.made_at is 'When they were made.';

alter table thaw.stations add column outlook_wanted bigint not null default 0;
alter table thaw.stations add column outlook_made bigint not null default 0;
comment on column thaw.stations.outlook_wanted is 'How often outlooks have been asked for: whenever the indices, or what they are held against, change.';
comment on column thaw.stations.outlook_made is 'What outlook_wanted was when outlooks were last made; less than it if they wait to be made.';

-- What a standing says of the rest of the season.
alter table thaw.standings add column expected boolean not null default false;
alter table thaw.standings add column expected_on date;
alter table thaw.standings add column probability_low double precision;
alter table thaw.standings add column probability_high double precision;
alter table thaw.standings add column pass_day_10 date;
alter table thaw.standings add column pass_day_50 date;
alter table thaw.standings add column pass_day_90 date;
alter table thaw.standings add column outlook_through date;
comment on column thaw.standings.expected is 'Whether the season is expected to end on the wrong side of the design value, by an outlook that has shown skill at this lead.';
comment on column thaw.standings.expected_on is 'Day of the outlook by which it first was, without a break since.';
comment on column thaw.standings.probability_low is 'Chance of ending on the wrong side, by the latest outlook: lowest where missing days leave it open. Null without an outlook.';
comment on column thaw.standings.probability_high is 'The same, highest.';
comment on column thaw.standings.pass_day_10 is 'Day of passing in 10 % of the past years that pass, by the latest outlook.';
comment on column thaw.standings.pass_day_50 is 'The same, 50 %.';
comment on column thaw.standings.pass_day_90 is 'The same, 90 %.';
comment on column thaw.standings.outlook_through is 'Last day used by the latest outlook.';
alter table thaw.exceedances add column expected_on date;
comment on column thaw.exceedances.expected_on is 'Day of the outlook by which the passing was first expected, without a break since.';

create or replace view thaw.standing_now as
select distinct on (s.site, s.surface, s.kind, d.definition, d.index_of, d.direction)
       s.site, t.name as site_name, s.surface, u.name as surface_name, t.station, s.kind, d.definition, d.index_of, d.direction,
       s.season, s.season_start, s.day, s.state, s.level,
       s.index_c_days, s.index_low_c_days, s.index_high_c_days, s.sum_beside_c_days, s.design_c_days,
       s.index_low_c_days / s.design_c_days as share_of_design,
       s.n_factor, d.design_stated, d.unit_stated, d.source as design_source,
       s.near_on, s.exceeded_on, s.confirmed_on, s.days_interpolated, s.days_missing, s.season_over,
       i.onset_provisional, s.design_value_id,
       (select max(a.through_day) from thaw.approvals a where a.station = t.station and a.withdrawn_at is null) as approved_through,
       s.expected, s.expected_on, s.probability_low, s.probability_high, s.pass_day_10, s.pass_day_50, s.pass_day_90, s.outlook_through,
       i.days_neighbour, i.days_climatology, i.standard_error_c_days * coalesce(s.n_factor, 1) as standard_error_c_days,
       i.days_doubtful, i.without_doubtful_low_c_days * coalesce(s.n_factor, 1) as without_doubtful_low_c_days,
       i.without_doubtful_high_c_days * coalesce(s.n_factor, 1) as without_doubtful_high_c_days, i.homogeneous
from thaw.standings s
join thaw.design_values d using (design_value_id)
join thaw.sites t on t.site = s.site
join thaw.surfaces u on u.site = s.site and u.surface = s.surface
left join thaw.air_index_season i on i.station = t.station and i.kind = s.kind and i.season_start = s.season_start
     and i.definition = case d.definition when 'sum' then 'sum' else 'curve' end
order by s.site, s.surface, s.kind, d.definition, d.index_of, d.direction,
         -- what must be reached is known at a season's end: until then the last one that is over is shown
         d.direction = 'not_below' and s.state = 'unknown' and not s.season_over, s.season_start desc;
comment on column thaw.standing_now.expected is 'Whether the season is expected to end on the wrong side of the design value.';
comment on column thaw.standing_now.expected_on is 'Day of the outlook by which it first was.';
comment on column thaw.standing_now.probability_low is 'Chance of that, lowest; null without an outlook.';
comment on column thaw.standing_now.probability_high is 'Chance of that, highest.';
comment on column thaw.standing_now.pass_day_10 is 'Day of passing in 10 % of the past years that pass.';
comment on column thaw.standing_now.pass_day_50 is 'The same, 50 %.';
comment on column thaw.standing_now.pass_day_90 is 'The same, 90 %.';
comment on column thaw.standing_now.outlook_through is 'Last day used by the outlook.';
comment on column thaw.standing_now.days_neighbour is 'Days filled from a neighbour.';
comment on column thaw.standing_now.days_climatology is 'Days filled with the mean of the date.';
comment on column thaw.standing_now.standard_error_c_days is 'Standard error that filled days give the index compared, degC.d.';
comment on column thaw.standing_now.days_doubtful is 'Days that rest on doubtful values; they are in the index.';
comment on column thaw.standing_now.without_doubtful_low_c_days is 'Lowest possible index without them, degC.d.';
comment on column thaw.standing_now.without_doubtful_high_c_days is 'Highest possible index without them, degC.d.';
comment on column thaw.standing_now.homogeneous is 'Whether the air record of the season is homogeneous.';
