-- A batch that was held back as implausible may be used all the same.

alter table thaw.batches add column taken_by_hand boolean not null default false;
comment on column thaw.batches.taken_by_hand is 'Whether a person has asked for it, so that doubts about its units do not hold it back.';
