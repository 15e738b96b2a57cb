-- How often a part was lost, apart from how often it was tried to be sent.

alter table thaw.batch_parts add column confirmed smallint not null default 0;
comment on column thaw.batch_parts.confirmed is 'How often the bus has confirmed that it has it.';
comment on column thaw.batch_parts.attempt is 'Number of the last attempt to send it; each has a message id of its own.';
