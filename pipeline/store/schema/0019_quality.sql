-- The quality tests and every outcome of them.

create table thaw.quality_tests (
    bit     smallint primary key check (bit between 0 and 30),
    test    text not null unique,
    meaning text not null
);
comment on table thaw.quality_tests is 'Tests that daily values undergo. None of them takes a value out: at most it marks one doubtful or inconsistent.';
comment on column thaw.quality_tests.bit is 'Place in tests_made and tests_failed of thaw.daily_values.';
comment on column thaw.quality_tests.test is 'Name.';
comment on column thaw.quality_tests.meaning is 'What fails it, with its limit and source.';
insert into thaw.quality_tests values
    (0, 'range', 'Beyond what can be: air -80 to 60, surface -80 to 80 degC (Zahumensky, 2004, as quoted elsewhere).'),
    (1, 'consistency', 'Minimum above maximum, or mean beyond them, by more than 1 degC (Durre et al., 2010, as quoted elsewhere).'),
    (2, 'step', 'Changed since the day before by 8 biweight standard deviations of the month''s changes, and at least 15 degC (judgement); 25 degC where fewer than 100 changes are known.'),
    (3, 'spike', 'Off both neighbouring days to the same side by 0.75 of the limit of step (judgement).'),
    (4, 'persistence', 'Maximum less minimum below 0.1 degC (Zahumensky, 2004, as quoted elsewhere); a surface within 0.2 degC of zero is exempt.'),
    (5, 'streak', 'The same value on 20 days or more (Durre et al., 2010, as quoted elsewhere).'),
    (6, 'naught', 'Maximum and minimum both 0 degC, or both 0 degF: perhaps the mark of a missing value (Durre et al., 2010, as quoted elsewhere).'),
    (7, 'gap', 'Beyond a gap of 10 degC or more in the sorted values of the calendar month (Durre et al., 2010, as quoted elsewhere).'),
    (8, 'climatology', '6 biweight standard deviations or more off the values within 7 days of the date (Durre et al., 2010, as quoted elsewhere).'),
    (9, 'lagged_range', 'Maximum 40 degC or more above the warmest minimum of three days, or minimum as far below the coldest maximum (Durre et al., 2010, details from memory).'),
    (10, 'neighbour', 'Mean 8 degC and 4 standard deviations or more off what three neighbours let expect (Durre et al., 2010, as quoted elsewhere).'),
    (16, 'range of readings', 'A reading of less than a day beyond what can be: as range.'),
    (18, 'step of readings', 'Changed from one reading to the next by more than 3 degC (surface 10) times the square root of the minutes between, at most 25 (40) degC: the limits of the guidelines for a minute (Zahumensky, 2004, as quoted elsewhere), widened.'),
    (19, 'spike of readings', 'Off both neighbouring readings to the same side by 0.75 of that limit (judgement).'),
    (20, 'persistence of readings', '12 readings in a row, through an hour or more, within 0.1 degC (Zahumensky, 2004, as quoted elsewhere; the number is judgement); a surface within 0.2 degC of zero is exempt.'),
    (22, 'naught of readings', 'Four readings or more, all 0 degC or all 0 degF.');

create function thaw.mark_after_tests(mark smallint, tests_made integer, tests_failed integer) returns smallint
language sql immutable parallel safe as $$
    select case when mark in (1, 3, 6, 7) or tests_made = 0 then mark
                when tests_failed = 0 then case mark when 4 then 0::smallint else mark end
                when tests_failed & 2 <> 0 then 1::smallint
                else 2::smallint end
$$;
comment on function thaw.mark_after_tests is 'Quality mark (WMO BUFR table 0 33 020) of a daily mean: that of its values, not checked turned into good by tests that all passed, or inconsistent or doubtful by one that failed.';

create or replace view thaw.daily_values as
select c.day, b.station,
       b.mean_c[i.i] as mean_c, b.max_c[i.i] as max_c, b.min_c[i.i] as min_c,
       (coalesce(b.low_c, b.mean_c))[i.i] as low_c, (coalesce(b.high_c, b.mean_c))[i.i] as high_c,
       coalesce(b.origin[i.i], 1::smallint) as origin, coalesce(b.hours[i.i], 0::smallint) as hours,
       coalesce(b.longest_hole[i.i], 0::smallint) as longest_hole,
       thaw.mark_after_tests(coalesce(b.quality[i.i], 0::smallint), coalesce(b.tests_made[i.i], 0), coalesce(b.tests_failed[i.i], 0)) as quality,
       coalesce(b.mean_rules[i.i], b.mean_rule) as mean_rule,
       b.error_c[i.i] as error_c, b.filled_from[i.i] as filled_from,
       coalesce(b.tests_made[i.i], 0) as tests_made, coalesce(b.tests_failed[i.i], 0) as tests_failed
from thaw.daily_blocks b
join thaw.calendar c on c.month = b.month and c.day between b.first_day and b.last_day
cross join lateral (select c.day - b.first_day + 1) as i (i);

create view thaw.quality_outcomes as
select d.station, d.day, t.test, (d.tests_failed >> t.bit) & 1 = 1 as failed, d.quality
from thaw.daily_values d
join thaw.quality_tests t on (d.tests_made >> t.bit) & 1 = 1;
comment on view thaw.quality_outcomes is 'Every quality test that was made of a day''s values, and its outcome.';
comment on column thaw.quality_outcomes.station is 'Station.';
comment on column thaw.quality_outcomes.day is 'The station''s day.';
comment on column thaw.quality_outcomes.test is 'Test: see thaw.quality_tests.';
comment on column thaw.quality_outcomes.failed is 'Whether a value failed it.';
comment on column thaw.quality_outcomes.quality is 'The day''s mark that followed from all of them, by WMO BUFR table 0 33 020.';
