-- What the column may say, as it is by now.

comment on column thaw.standing_changes.why is 'What brought it about: progress, correction, gap, gap closed, first judgement, design value replaced.';
