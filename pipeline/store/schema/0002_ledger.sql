-- What arrived and what became of it. The sums of a finished batch add up:
-- lines = header + blank + comment lines + rows; rows = read + without value +
-- set aside; cells = readings + missing + set aside + repeated in the batch.

create table thaw.feeds (
    feed_id smallint generated always as identity primary key,
    feed    text collate "C" not null unique,
    rank    smallint not null
);
comment on table thaw.feeds is 'Where files come from.';
comment on column thaw.feeds.feed_id is 'Number of the feed.';
comment on column thaw.feeds.feed is 'Name of the feed, as in the settings.';
comment on column thaw.feeds.rank is 'Where feeds give a value for the same span, the highest rank makes the daily value.';

create table thaw.layouts (
    layout_hash text primary key,
    layout      jsonb not null,
    recorded_at timestamptz not null default clock_timestamp()
);
comment on table thaw.layouts is 'Layouts that batches were read by, kept so that the same bytes are read the same way again.';
comment on column thaw.layouts.layout_hash is 'SHA-256 of the layout.';
comment on column thaw.layouts.layout is 'The layout, with the clocks of the stations that it reads for.';
comment on column thaw.layouts.recorded_at is 'When it was first used.';

create table thaw.batches (
    batch_id           integer generated always as identity primary key,
    feed_id            smallint not null references thaw.feeds,
    name               text not null,
    content_hash       text not null,
    bytes              bigint not null,
    batch_order        bigint not null,
    layout_hash        text not null references thaw.layouts,
    source_time        timestamptz not null,
    arrived_at         timestamptz not null,
    host               text not null,
    archive_path       text not null,
    state              text not null check (state in ('opened', 'read', 'held_back', 'waiting')),
    reason             text,
    opened_at          timestamptz not null default clock_timestamp(),
    read_at            timestamptz,
    lines              bigint,
    lines_header       bigint,
    lines_blank        bigint,
    lines_comment      bigint,
    rows               bigint,
    rows_read          bigint,
    rows_without_value bigint,
    rows_set_aside     bigint,
    cells              bigint,
    cells_read         bigint,
    cells_missing      bigint,
    cells_set_aside    bigint,
    parts              integer,
    unique (feed_id, batch_order)
);
create index on thaw.batches (feed_id, content_hash);
create index on thaw.batches (host) where state = 'opened';
comment on table thaw.batches is 'The ledger: one line a delivery of a feed.';
comment on column thaw.batches.batch_id is 'Number of the batch.';
comment on column thaw.batches.feed_id is 'Feed that delivered it.';
comment on column thaw.batches.name is 'Name of the file.';
comment on column thaw.batches.content_hash is 'SHA-256 of the bytes as received.';
comment on column thaw.batches.bytes is 'Length in bytes.';
comment on column thaw.batches.batch_order is 'Place among the batches of its feed, fixed when the line was opened: the source time in microseconds since 1970, moved on by one where two would be equal. The reading of the highest order, then row, counts.';
comment on column thaw.batches.layout_hash is 'Layout that it was read by.';
comment on column thaw.batches.source_time is 'When the source says that the file was written (UTC).';
comment on column thaw.batches.arrived_at is 'When the worker found it, by its clock. Readings dated more than two days after it are marked wrong and never used.';
comment on column thaw.batches.host is 'Host whose archive holds the bytes.';
comment on column thaw.batches.archive_path is 'Where in the archive.';
comment on column thaw.batches.state is 'opened: not yet read to its end; read: all parts known; held_back: not readable as a whole, nothing of it used; waiting: a return to bytes that were seen before, not used until asked for.';
comment on column thaw.batches.reason is 'Why it is held back or waiting.';
comment on column thaw.batches.opened_at is 'When the line was opened.';
comment on column thaw.batches.read_at is 'When the file had been read to its end.';
comment on column thaw.batches.lines is 'Lines of the file.';
comment on column thaw.batches.lines_header is 'Lines up to and including the line of column names.';
comment on column thaw.batches.lines_blank is 'Blank lines.';
comment on column thaw.batches.lines_comment is 'Comment lines.';
comment on column thaw.batches.rows is 'Data rows.';
comment on column thaw.batches.rows_read is 'Rows that gave at least one reading.';
comment on column thaw.batches.rows_without_value is 'Rows in which nothing usable was sent, as on a day not observed.';
comment on column thaw.batches.rows_set_aside is 'Rows that could not be read.';
comment on column thaw.batches.cells is 'Cells in mapped columns: rows times columns.';
comment on column thaw.batches.cells_read is 'Cells that gave a reading, those repeated in the batch included.';
comment on column thaw.batches.cells_missing is 'Cells without a value.';
comment on column thaw.batches.cells_set_aside is 'Cells that could not be read.';
comment on column thaw.batches.parts is 'How many parts it was sent in.';

create table thaw.batch_parts (
    batch_id           integer not null references thaw.batches,
    part               integer not null,
    station            text collate "C" not null,
    readings           integer not null,
    attempt            smallint not null default 1,
    published_at       timestamptz,
    committed_at       timestamptz,
    readings_new       integer,
    readings_changed   integer,
    readings_unchanged integer,
    readings_repeated  integer,
    failures           smallint not null default 0,
    stuck_at           timestamptz,
    reason             text,
    primary key (batch_id, part)
);
create index batch_parts_open on thaw.batch_parts (batch_id, part) where committed_at is null;
comment on table thaw.batch_parts is 'The parts that a batch was sent in, and whether each is committed.';
comment on column thaw.batch_parts.batch_id is 'Batch.';
comment on column thaw.batch_parts.part is 'Number of the part, from 1.';
comment on column thaw.batch_parts.station is 'Station of its readings.';
comment on column thaw.batch_parts.readings is 'How many readings it holds.';
comment on column thaw.batch_parts.attempt is 'How often it has been given to the bus.';
comment on column thaw.batch_parts.published_at is 'When the bus last confirmed that it has it.';
comment on column thaw.batch_parts.committed_at is 'When its readings and all that follows from them were committed.';
comment on column thaw.batch_parts.readings_new is 'Readings with a new key.';
comment on column thaw.batch_parts.readings_changed is 'Readings that took the place of another.';
comment on column thaw.batch_parts.readings_unchanged is 'Readings that were there already, or lost against a later batch.';
comment on column thaw.batch_parts.readings_repeated is 'Readings that another row of the same batch repeats.';
comment on column thaw.batch_parts.failures is 'How often committing it failed for a reason of its own.';
comment on column thaw.batch_parts.stuck_at is 'When it was given up: it is not sent again until someone has looked.';
comment on column thaw.batch_parts.reason is 'Why the last attempt failed.';

create table thaw.set_aside (
    batch_id    integer not null references thaw.batches,
    line        bigint not null,
    column_no   integer not null,
    row_no      integer not null,
    column_name text not null,
    code        text not null,
    reason      text not null,
    raw         text not null,
    primary key (batch_id, line, column_no)
);
comment on table thaw.set_aside is 'Rows and cells that could not be read, kept whole.';
comment on column thaw.set_aside.batch_id is 'Batch.';
comment on column thaw.set_aside.line is 'Line of the file, from 1.';
comment on column thaw.set_aside.column_no is 'Column, from 1; 0 for the row as a whole.';
comment on column thaw.set_aside.row_no is 'Data row, from 1.';
comment on column thaw.set_aside.column_name is 'Name of the column, where it has one.';
comment on column thaw.set_aside.code is 'Reason in one word, for counting.';
comment on column thaw.set_aside.reason is 'What is wrong and what would be right.';
comment on column thaw.set_aside.raw is 'The line as received; bytes that are no text are written \xNN. Its first 8192 bytes; the archive holds the rest.';

create table thaw.feed_files (
    feed_id      smallint not null references thaw.feeds,
    host         text not null,
    name         text not null,
    bytes        bigint not null,
    source_time  timestamptz not null,
    content_hash text not null,
    seen_at      timestamptz not null default clock_timestamp(),
    primary key (feed_id, host, name)
);
comment on table thaw.feed_files is 'What was last seen under each name in a feed''s folder, so that a file is read once.';
comment on column thaw.feed_files.feed_id is 'Feed.';
comment on column thaw.feed_files.host is 'Host that looks at the folder.';
comment on column thaw.feed_files.name is 'Name of the file.';
comment on column thaw.feed_files.bytes is 'Its length in bytes.';
comment on column thaw.feed_files.source_time is 'When it was last written (UTC).';
comment on column thaw.feed_files.content_hash is 'SHA-256 of its bytes.';
comment on column thaw.feed_files.seen_at is 'When it was read.';
