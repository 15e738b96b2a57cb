-- Batches that are read again by a corrected layout, and files that replace all
-- that their feed had said of their span.

alter table thaw.batches drop constraint batches_state_check;
alter table thaw.batches add constraint batches_state_check
    check (state in ('opened', 'read', 'held_back', 'waiting', 'reread'));
comment on column thaw.batches.state is 'opened: not yet read to its end; read: all parts known; held_back: not readable as a whole, nothing of it used; waiting: a return to bytes that were seen before, not used until asked for; reread: read again by another layout since, its own readings withdrawn.';

alter table thaw.batches add column rereads integer references thaw.batches;
comment on column thaw.batches.rereads is 'The batch that this one reads again, by another layout. It takes over its order.';
create unique index batches_rereads on thaw.batches (rereads) where state <> 'held_back';

alter table thaw.batches add column replaces_span boolean not null default false;
comment on column thaw.batches.replaces_span is 'Whether the file replaces all that its feed said of each station between the first and the last reading that it has of it.';

alter table thaw.batch_parts add column first_utc timestamptz;
alter table thaw.batch_parts add column last_utc timestamptz;
alter table thaw.batch_parts add column again boolean not null default false;
comment on column thaw.batch_parts.first_utc is 'Start of its earliest reading.';
comment on column thaw.batch_parts.last_utc is 'Start of its latest reading.';
comment on column thaw.batch_parts.again is 'Whether it is sent once more because readings that had taken its readings'' place were withdrawn.';
create index batch_parts_station on thaw.batch_parts (station, batch_id);
create index batch_parts_again on thaw.batch_parts (station) where again and committed_at is null;

create index batches_replacing on thaw.batches (batch_id) where replaces_span;

create table thaw.withdrawals (
    batch_id integer not null references thaw.batches,
    station  text collate "C" not null,
    asked_at timestamptz not null default clock_timestamp(),
    primary key (batch_id, station)
);
comment on table thaw.withdrawals is 'Work to be done once a batch is committed: readings of a station that it makes void are to be withdrawn. Until then surfaces on the station are not judged, so that nothing is told of a state in between.';
comment on column thaw.withdrawals.batch_id is 'Batch that reads another again, or replaces a span.';
comment on column thaw.withdrawals.station is 'Station.';
comment on column thaw.withdrawals.asked_at is 'Since when.';
comment on column thaw.reading_values_replaced.replaced_by_row is 'Data row of that batch; 0 if the batch has no reading of this key and the value was withdrawn.';
comment on column thaw.readings_replaced.replaced_by_row is 'Data row of that batch; 0 if the batch has no reading of this key and the value was withdrawn.';
