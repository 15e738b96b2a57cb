-- Who was told what, when and how; what was put off, and what was seen.
-- Screening figures: local codes and a licensed engineer decide.

create table thaw.notices (
    notice_id       bigint generated always as identity primary key,
    key             text not null unique check (key ~ '^[A-Za-z0-9._-]{1,80}$'),
    message_id      bigint not null,
    recipient       text collate "C" not null,
    channel         text collate "C" not null,
    kind            text not null check (kind in ('news', 'update', 'withdrawal', 'reminder', 'drill')),
    content         jsonb not null,
    first_notice    text references thaw.notices (key),
    written_at      timestamptz not null,
    due_at          timestamptz not null,
    attempts        integer not null default 0,
    next_attempt_at timestamptz not null,
    leased_until    timestamptz,
    delivered_at    timestamptz,
    given_up_at     timestamptz,
    reason          text,
    check (delivered_at is null or given_up_at is null)
);
create sequence thaw.messages owned by thaw.notices.message_id;
create index notices_open on thaw.notices (recipient, channel, notice_id) where delivered_at is null and given_up_at is null;
create index on thaw.notices (message_id);
comment on table thaw.notices is 'Every message to a recipient by a channel: what it says and what became of it. Its content is never changed. Screening figures: local codes and a licensed engineer decide.';
comment on column thaw.notices.notice_id is 'Number of the notice.';
comment on column thaw.notices.key is 'Its name, the same at every attempt; receivers drop repeats by it.';
comment on column thaw.notices.message_id is 'Notices written together for one recipient, one a channel, have the same.';
comment on column thaw.notices.recipient is 'Recipient, as in the settings.';
comment on column thaw.notices.channel is 'Channel, as in the settings.';
comment on column thaw.notices.kind is 'news; update: a later change of something told before; withdrawal: what was told rested on figures since corrected; reminder; drill: an exercise.';
comment on column thaw.notices.content is 'What it says, with the figures that it rests on (indices in degC.d), as they were when it was written.';
comment on column thaw.notices.first_notice is 'The first notice about the same, if it follows others.';
comment on column thaw.notices.written_at is 'When it was written.';
comment on column thaw.notices.due_at is 'When it was to be sent.';
comment on column thaw.notices.attempts is 'Attempts begun.';
comment on column thaw.notices.next_attempt_at is 'When it is tried next, unless delivered or given up.';
comment on column thaw.notices.leased_until is 'Until when a sender has it in hand.';
comment on column thaw.notices.delivered_at is 'When a receiver confirmed it; null until then.';
comment on column thaw.notices.given_up_at is 'When it was given up; null if it was not.';
comment on column thaw.notices.reason is 'What the last attempt came to, or why it was given up.';

create table thaw.notice_items (
    notice_id         bigint not null references thaw.notices,
    about             text collate "C" not null,
    place             smallint not null,
    kind              text not null check (kind in ('news', 'update', 'withdrawal', 'reminder', 'drill')),
    site              text collate "C" not null,
    surface           text collate "C" not null,
    design_value_id   bigint not null references thaw.design_values,
    season_start      date not null,
    exceedance_id     bigint references thaw.exceedances,
    from_state        text,
    to_state          text not null,
    day               date not null,
    index_low_c_days  double precision not null,
    index_high_c_days double precision not null,
    design_c_days     double precision not null,
    first_notice      text references thaw.notices (key),
    primary key (notice_id, about)
);
create index on thaw.notice_items (about);
comment on table thaw.notice_items is 'What a notice says of each standing. Screening figures: local codes and a licensed engineer decide.';
comment on column thaw.notice_items.notice_id is 'Notice.';
comment on column thaw.notice_items.about is 'Name of the standing: one surface, season, kind and definition of the design value. The same in all notices about it.';
comment on column thaw.notice_items.place is 'Its place in the notice, from 1.';
comment on column thaw.notice_items.kind is 'Kind, as of a notice.';
comment on column thaw.notice_items.site is 'Site.';
comment on column thaw.notice_items.surface is 'Surface.';
comment on column thaw.notice_items.design_value_id is 'Design value.';
comment on column thaw.notice_items.season_start is 'First day of the thaw or freeze year.';
comment on column thaw.notice_items.exceedance_id is 'Exceedance that stood when it was written, if any.';
comment on column thaw.notice_items.from_state is 'State that was last told, or that stood before; null for a first judgement.';
comment on column thaw.notice_items.to_state is 'State when it was written.';
comment on column thaw.notice_items.day is 'Standing date.';
comment on column thaw.notice_items.index_low_c_days is 'Lowest possible index, degC.d.';
comment on column thaw.notice_items.index_high_c_days is 'Highest possible index, degC.d.';
comment on column thaw.notice_items.design_c_days is 'Design value, degC.d.';
comment on column thaw.notice_items.first_notice is 'The first notice about the same since it was last within.';

create table thaw.notice_changes (
    recipient   text collate "C" not null,
    channel     text collate "C" not null,
    change_id   bigint not null references thaw.standing_changes,
    handed_from text collate "C" not null default '',
    about       text collate "C" not null,
    note        text not null default '',
    noted_at    timestamptz not null,
    notice_id   bigint references thaw.notices,
    set_aside   text,
    settled_at  timestamptz,
    primary key (recipient, channel, change_id, handed_from),
    check (notice_id is null or set_aside is null),
    check ((settled_at is null) = (notice_id is null and set_aside is null))
);
create index notice_changes_waiting on thaw.notice_changes (recipient) where settled_at is null;
create index on thaw.notice_changes (notice_id);
create index on thaw.notice_changes (change_id);
comment on table thaw.notice_changes is 'Which change is told to whom: written in the transaction that changes the standing, and ending in exactly one notice or set aside.';
comment on column thaw.notice_changes.recipient is 'Recipient, as in the settings.';
comment on column thaw.notice_changes.channel is 'Channel, as in the settings.';
comment on column thaw.notice_changes.change_id is 'Change (thaw.standing_changes).';
comment on column thaw.notice_changes.handed_from is 'Recipient who did not mark it as seen in time, or could not be reached; empty if it is told by the recipient''s own wish.';
comment on column thaw.notice_changes.about is 'Name of the standing (thaw.notice_items).';
comment on column thaw.notice_changes.note is 'Why it is told though it may have been told before; empty for no such reason.';
comment on column thaw.notice_changes.noted_at is 'When it was noted.';
comment on column thaw.notice_changes.notice_id is 'Notice that tells it; null while it waits, and if it was set aside.';
comment on column thaw.notice_changes.set_aside is 'Why it is in no notice.';
comment on column thaw.notice_changes.settled_at is 'When it was told or set aside; null while it waits.';

create table thaw.notice_attempts (
    notice_id bigint not null references thaw.notices,
    attempt   integer not null,
    began_at  timestamptz not null,
    ended_at  timestamptz,
    outcome   text check (outcome in ('delivered', 'not now', 'refused')),
    answer    text,
    primary key (notice_id, attempt),
    check ((ended_at is null) = (outcome is null))
);
comment on table thaw.notice_attempts is 'Every attempt to deliver a notice; kept for ever.';
comment on column thaw.notice_attempts.notice_id is 'Notice.';
comment on column thaw.notice_attempts.attempt is 'Number of the attempt, from 1.';
comment on column thaw.notice_attempts.began_at is 'When it began.';
comment on column thaw.notice_attempts.ended_at is 'When it ended; null while it goes on, and for ever if the program ended in its midst: the notice may have arrived.';
comment on column thaw.notice_attempts.outcome is 'delivered; not now: tried again; refused: trying again would not help.';
comment on column thaw.notice_attempts.answer is 'What the receiver said, or what went wrong.';

create table thaw.holds (
    hold_id   bigint generated always as identity primary key,
    station   text collate "C" references thaw.stations,
    site      text collate "C" references thaw.sites,
    surface   text collate "C",
    by_whom   text not null check (by_whom <> ''),
    why       text not null check (why <> ''),
    from_at   timestamptz not null,
    until_at  timestamptz not null,
    lifted_at timestamptz,
    lifted_by text,
    check ((station is null) <> (site is null)),
    check (surface is null or site is not null),
    check (until_at > from_at),
    check ((lifted_at is null) = (lifted_by is null)),
    foreign key (site, surface) references thaw.surfaces
);
comment on table thaw.holds is 'Notices put off: what changes meanwhile is told when the hold ends, as it stands then.';
comment on column thaw.holds.hold_id is 'Number of the hold.';
comment on column thaw.holds.station is 'Station whose sites are held; null for a site.';
comment on column thaw.holds.site is 'Site that is held; null for a station.';
comment on column thaw.holds.surface is 'Surface that is held; null for all of the site.';
comment on column thaw.holds.by_whom is 'Who put them off.';
comment on column thaw.holds.why is 'Why.';
comment on column thaw.holds.from_at is 'From when.';
comment on column thaw.holds.until_at is 'Until when.';
comment on column thaw.holds.lifted_at is 'When it was ended before that; null if it was not.';
comment on column thaw.holds.lifted_by is 'Who ended it.';

create table thaw.seen (
    seen_id   bigint generated always as identity primary key,
    notice_id bigint not null references thaw.notices,
    by_whom   text not null check (by_whom <> ''),
    how       text not null check (how in ('command', 'link')),
    seen_at   timestamptz not null
);
create index on thaw.seen (notice_id);
comment on table thaw.seen is 'Who has marked which notice as seen.';
comment on column thaw.seen.seen_id is 'Number of the row.';
comment on column thaw.seen.notice_id is 'Notice.';
comment on column thaw.seen.by_whom is 'Who has seen it.';
comment on column thaw.seen.how is 'command: by the command line; link: by the link in the message.';
comment on column thaw.seen.seen_at is 'When.';

create table thaw.cap_messages (
    channel    text collate "C" not null,
    identifier text collate "C" not null,
    sent_at    timestamptz not null,
    headline   text not null,
    document   text not null,
    kept_at    timestamptz not null,
    primary key (channel, identifier)
);
create index on thaw.cap_messages (channel, sent_at desc, identifier);
comment on table thaw.cap_messages is 'CAP 1.2 messages on the feeds of channels; kept for ever.';
comment on column thaw.cap_messages.channel is 'Channel, as in the settings.';
comment on column thaw.cap_messages.identifier is 'Identifier of the message.';
comment on column thaw.cap_messages.sent_at is 'When it was sent, as it says itself.';
comment on column thaw.cap_messages.headline is 'Its headline.';
comment on column thaw.cap_messages.document is 'The message, XML.';
comment on column thaw.cap_messages.kept_at is 'When it was put on the feed.';
