-- Files that only grow: a batch may hold what a file has grown by.

alter table thaw.batches add column from_byte bigint not null default 0;
alter table thaw.batches add column lines_before bigint not null default 0;
alter table thaw.batches add column head_batch integer references thaw.batches;
comment on column thaw.batches.from_byte is 'Byte of the file that it begins at; above 0 where a feed''s files grow and the bytes before came earlier.';
comment on column thaw.batches.lines_before is 'Lines of the file before it.';
comment on column thaw.batches.head_batch is 'Batch that holds the file''s beginning, with its column names; null for a whole file.';
comment on column thaw.batches.content_hash is 'SHA-256 of the file''s bytes as received, up to the end of this batch.';
comment on column thaw.batches.bytes is 'Length of the batch in bytes.';

alter table thaw.feed_files add column position bigint not null default 0;
alter table thaw.feed_files add column position_hash text not null default '';
alter table thaw.feed_files add column position_lines bigint not null default 0;
alter table thaw.feed_files add column head_batch integer references thaw.batches;
comment on column thaw.feed_files.position is 'Where files grow: how many of its bytes have been read.';
comment on column thaw.feed_files.position_hash is 'SHA-256 of those.';
comment on column thaw.feed_files.position_lines is 'Their lines.';
comment on column thaw.feed_files.head_batch is 'Batch that holds its beginning.';
