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
