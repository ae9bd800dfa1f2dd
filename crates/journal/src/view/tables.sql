CREATE TABLE meta (
    -- One row: what this file is, and how far it has come.
    format INTEGER NOT NULL,      -- the form of these tables; a program reads only the one it knows
    head_seq INTEGER NOT NULL,    -- the last row of the record that is in here; 0 before the first
    head_hash TEXT NOT NULL       -- that row's hash in the record, hexadecimal
) STRICT;

CREATE TABLE abouts (
    -- What rows can be about: each kind with each subject that has come so far.
    number INTEGER PRIMARY KEY,
    kind TEXT NOT NULL,           -- decision, intent, outcome, rest, act, ...
    subject TEXT NOT NULL,        -- the asset or adapter that it is about, or site
    UNIQUE (kind, subject)
) STRICT;

CREATE TABLE entry_rows (
    -- Every row of the record, as it is kept here; read `entries` instead.
    seq INTEGER PRIMARY KEY,      -- its number in the record: from 1, without a gap
    utc_us INTEGER NOT NULL,      -- when it was written, in microseconds from 1970-01-01
    about INTEGER NOT NULL,       -- its kind and subject, in `abouts`
    words TEXT NOT NULL,          -- the whole row in one plain line
    term INTEGER NOT NULL,        -- which life of the program: counted from 1
    cause TEXT NOT NULL           -- why, in plain words; may be empty
) STRICT;

CREATE VIEW entries AS
    -- Every row of the record, in plain words; utc is ISO 8601, to the second.
    SELECT seq, strftime('%Y-%m-%dT%H:%M:%SZ',
            (utc_us - ((utc_us % 1000000) + 1000000) % 1000000) / 1000000, 'unixepoch') AS utc,
        utc_us, term, kind, subject, cause, words
    FROM entry_rows JOIN abouts ON abouts.number = entry_rows.about;

CREATE TABLE counts_by_day (
    -- How many rows of each kind a day (UTC) has, kept as they come.
    day TEXT NOT NULL,            -- 2027-05-01
    kind TEXT NOT NULL,
    n INTEGER NOT NULL,
    PRIMARY KEY (day, kind)
) STRICT, WITHOUT ROWID;

CREATE TABLE days (
    -- Between which rows a day (UTC) lies: the quick way into entries.
    day TEXT NOT NULL PRIMARY KEY,
    first_seq INTEGER NOT NULL,   -- the first row of the day
    last_seq INTEGER NOT NULL     -- the last; where the clock was set back, others lie between
) STRICT, WITHOUT ROWID;

CREATE TABLE decision_fields (
    seq INTEGER PRIMARY KEY,
    action TEXT NOT NULL,         -- open, shut, run or stop
    opening_percent REAL,         -- with open
    plan INTEGER                  -- the plan that wanted it, if one did
) STRICT;

CREATE TABLE objections (
    -- What stood against a movement: one row for each cause of a decision.
    seq INTEGER NOT NULL,         -- the decision
    no INTEGER NOT NULL,          -- from 1
    says TEXT NOT NULL,           -- clause, interlock, latch, mode, armed, person, plan or asset
    name TEXT NOT NULL,           -- the clause's number or the interlock's code; else empty
    PRIMARY KEY (seq, no)
) STRICT, WITHOUT ROWID;

CREATE TABLE intent_fields (
    seq INTEGER PRIMARY KEY,
    action TEXT NOT NULL,
    opening_percent REAL,
    command INTEGER NOT NULL,     -- the number that its outcome has too
    lease_end_ns INTEGER NOT NULL, -- until when it holds unrenewed, by the clock since boot
    state_seq INTEGER NOT NULL,   -- the step of the engine in which it was permitted
    readings TEXT NOT NULL        -- digest of the readings that it was judged on
) STRICT;

CREATE TABLE outcome_fields (
    seq INTEGER PRIMARY KEY,
    command INTEGER NOT NULL,
    outcome TEXT NOT NULL,        -- accepted, refused or unknown
    why TEXT                      -- unless accepted
) STRICT;

CREATE TABLE confirmation_fields (
    seq INTEGER PRIMARY KEY,
    command INTEGER NOT NULL,
    position_percent REAL NOT NULL
) STRICT;

CREATE TABLE discrepancy_fields (
    seq INTEGER PRIMARY KEY,
    command INTEGER NOT NULL,
    wanted_percent REAL NOT NULL,
    found_percent REAL            -- nothing where no position came
) STRICT;

CREATE TABLE rest_fields (
    seq INTEGER PRIMARY KEY,
    action TEXT NOT NULL,         -- close, open, stop, hold or hand to local
    cause TEXT NOT NULL
) STRICT;

CREATE TABLE release_fields (
    seq INTEGER PRIMARY KEY,
    tide INTEGER NOT NULL,        -- the tide's number, by the moon
    begins_us INTEGER NOT NULL,
    ends_us INTEGER NOT NULL,
    volume_m3 REAL NOT NULL,
    estimated INTEGER NOT NULL    -- 1 where no good meter said so
) STRICT;

CREATE TABLE missed_fields (
    seq INTEGER PRIMARY KEY,
    tide INTEGER NOT NULL,
    begins_us INTEGER NOT NULL,
    ends_us INTEGER NOT NULL,
    cause TEXT NOT NULL
) STRICT;

CREATE TABLE spill_fields (
    seq INTEGER PRIMARY KEY,
    begins_us INTEGER NOT NULL,
    ends_us INTEGER NOT NULL,
    volume_m3 REAL NOT NULL,
    clauses TEXT NOT NULL         -- the clauses that shut the lawful ways out
) STRICT;

CREATE TABLE plan_fields (
    seq INTEGER PRIMARY KEY,
    plan INTEGER NOT NULL,
    parent INTEGER,               -- the plan that it followed, if any
    release_m3 REAL NOT NULL,
    spill_m3 REAL NOT NULL,
    request_digest TEXT NOT NULL,
    forecast_digest TEXT NOT NULL
) STRICT;

CREATE TABLE act_fields (
    seq INTEGER PRIMARY KEY,
    ordered TEXT NOT NULL,        -- what the person ordered
    who TEXT NOT NULL,            -- by the name that was given
    reason TEXT NOT NULL,
    peer TEXT NOT NULL,           -- by the operating system
    refused TEXT                  -- why it was refused; nothing if it was not
) STRICT;

CREATE VIEW decisions AS
    -- What an asset was to do, when that changed, and why.
    SELECT seq, utc, subject AS asset, action, opening_percent, plan, cause, words, utc_us
    FROM decision_fields JOIN entries USING (seq);

CREATE VIEW intents AS
    -- Commands, each written down before it left.
    SELECT seq, utc, subject AS asset, action, opening_percent, command, term, lease_end_ns,
        state_seq, readings, utc_us
    FROM intent_fields JOIN entries USING (seq);

CREATE VIEW outcomes AS
    -- What the plant answered to a command.
    SELECT seq, utc, subject AS asset, command, outcome, why, term, utc_us
    FROM outcome_fields JOIN entries USING (seq);

CREATE VIEW confirmations AS
    -- Commands that the plant's own feedback showed done.
    SELECT seq, utc, subject AS asset, command, position_percent, term, utc_us
    FROM confirmation_fields JOIN entries USING (seq);

CREATE VIEW discrepancies AS
    -- Feedback that did not fit the command; the asset was tripped.
    SELECT seq, utc, subject AS asset, command, wanted_percent, found_percent, term, utc_us
    FROM discrepancy_fields JOIN entries USING (seq);

CREATE VIEW rests AS
    -- Assets sent to rest, and why.
    SELECT seq, utc, subject AS asset, action, rest_fields.cause AS cause, utc_us
    FROM rest_fields JOIN entries USING (seq);

CREATE VIEW releases AS
    -- Water that left, by spans of five minutes.
    SELECT seq, utc, tide, strftime('%Y-%m-%dT%H:%M:%SZ', begins_us / 1000000, 'unixepoch') AS begins,
        strftime('%Y-%m-%dT%H:%M:%SZ', ends_us / 1000000, 'unixepoch') AS ends,
        volume_m3, estimated, begins_us, ends_us
    FROM release_fields JOIN entries USING (seq);

CREATE VIEW missed_windows AS
    -- Lawful windows that passed unused, and the first cause.
    SELECT seq, utc, tide, strftime('%Y-%m-%dT%H:%M:%SZ', begins_us / 1000000, 'unixepoch') AS begins,
        strftime('%Y-%m-%dT%H:%M:%SZ', ends_us / 1000000, 'unixepoch') AS ends,
        missed_fields.cause AS cause, begins_us, ends_us
    FROM missed_fields JOIN entries USING (seq);

CREATE VIEW forecast_spills AS
    -- Spills that could not be avoided lawfully, as they were foreseen.
    SELECT seq, utc, strftime('%Y-%m-%dT%H:%M:%SZ', begins_us / 1000000, 'unixepoch') AS begins,
        strftime('%Y-%m-%dT%H:%M:%SZ', ends_us / 1000000, 'unixepoch') AS ends,
        volume_m3, clauses, begins_us, ends_us
    FROM spill_fields JOIN entries USING (seq);

CREATE VIEW plans AS
    -- Plans that came into force.
    SELECT seq, utc, plan, parent, release_m3, spill_m3, request_digest, forecast_digest, utc_us
    FROM plan_fields JOIN entries USING (seq);

CREATE VIEW acts AS
    -- What people ordered: who, why, and whether it was refused.
    SELECT seq, utc, who, reason, ordered, subject AS asset, refused, peer, utc_us
    FROM act_fields JOIN entries USING (seq);
