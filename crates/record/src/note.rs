//! Notes: what the record says of itself. Sealed and deleted segments, anchors, backups, legal
//! holds, snapshots, summaries of a day.

use units::Utc;

use crate::encode::SITE;
use crate::names::Gathered;
use crate::reader::Reader;
use crate::writer::Writer;
use crate::{Draft, RecordError, Row, VERSION, kind};

/// An Ed25519 signature (RFC 8032) of an anchor, and the public key that it is by.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct AnchorSignature {
    pub key: [u8; 32],
    pub bytes: [u8; 64],
}

/// Days count from 1970-01-01, UTC.
#[derive(Clone, PartialEq, Debug)]
pub enum Note {
    /// What a day saw is in a file that never changes again.
    Sealed {
        day: i32,
        file: String,
        digest: [u8; 32],
        events: u64,
        minutes: u64,
        bytes: u64,
    },
    /// Retention has deleted such a file.
    SegmentDeleted {
        day: i32,
        file: String,
        digest: [u8; 32],
        why: String,
    },
    /// What the rows up to `of_seq` add up to for the next term: see [`crate::Fold`].
    Snapshot {
        of_seq: u64,
        bytes: Vec<u8>,
    },
    /// Where the chain ended.
    Anchored {
        of_seq: u64,
        hash: [u8; 32],
        signature: Option<AnchorSignature>,
    },
    /// A copy was made, and verified.
    BackedUp {
        file: String,
        of_seq: u64,
        hash: [u8; 32],
        bytes: u64,
    },
    /// The segments of these days, the last one too, are kept whatever retention says.
    LegalHold {
        from_day: i32,
        to_day: i32,
        by: String,
        reason: String,
    },
    HoldLifted {
        from_day: i32,
        to_day: i32,
        by: String,
        reason: String,
    },
    /// The evidence file was lifted from an older form.
    Migrated {
        from: u32,
        to: u32,
    },
    Summary(Summary),
    /// The journal had been lost.
    JournalBack {
        lost_at: Utc,
        why: String,
        rows_kept: u64,
    },
}

/// What a day's rows say, counted.
#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub struct Summary {
    pub day: i32,
    pub rows: u64,
    /// Orders to open or run: an opening that is moved on counts again.
    pub openings: u32,
    pub released_m3: f64,
    pub windows_missed: u32,
    pub trips: u32,
    pub acts: u32,
    /// Acts and commands that were refused.
    pub refusals: u32,
    pub rests: u32,
    pub discrepancies: u32,
}

pub(crate) const NOTES: core::ops::RangeInclusive<u16> = kind::SEALED..=kind::JOURNAL_BACK;

/// The row's content for a note; its subject is the site.
pub fn encode_note(note: &Note) -> Draft {
    // Notes name nothing of the site file.
    let names = Gathered::default();
    let mut w = Writer::new(&names);
    let kind = put(&mut w, note);
    let cause = match note {
        Note::SegmentDeleted { why, .. } | Note::JournalBack { why, .. } => why.clone(),
        Note::LegalHold { reason, .. } | Note::HoldLifted { reason, .. } => reason.clone(),
        _ => String::new(),
    };
    Draft { kind, version: VERSION, subject: SITE.to_owned(), cause, body: w.bytes }
}

/// The note that a row was made of. Refuses, without panicking, whatever is no note of this version.
pub fn decode_note(row: &Row) -> Result<Note, RecordError> {
    if row.version != VERSION {
        return Err(RecordError::Unknown { kind: row.kind, version: row.version });
    }
    let mut names = Gathered::default();
    let mut r = Reader::new(&row.body, &mut names);
    let note = take(row.kind, &mut r)?;
    r.end()?;
    Ok(note)
}

fn put(w: &mut Writer<'_>, note: &Note) -> u16 {
    match note {
        Note::Sealed { day, file, digest, events, minutes, bytes } => {
            w.i32(*day);
            w.text(file);
            w.bytes.extend(digest);
            [*events, *minutes, *bytes].into_iter().for_each(|n| w.u64(n));
            kind::SEALED
        }
        Note::SegmentDeleted { day, file, digest, why } => {
            w.i32(*day);
            w.text(file);
            w.bytes.extend(digest);
            w.text(why);
            kind::SEGMENT_DELETED
        }
        Note::Snapshot { of_seq, bytes } => {
            w.u64(*of_seq);
            w.blob(bytes);
            kind::SNAPSHOT
        }
        Note::Anchored { of_seq, hash, signature } => {
            w.u64(*of_seq);
            w.bytes.extend(hash);
            w.flag(signature.is_some());
            if let Some(AnchorSignature { key, bytes }) = signature {
                w.bytes.extend(key);
                w.bytes.extend(bytes);
            }
            kind::ANCHORED
        }
        Note::BackedUp { file, of_seq, hash, bytes } => {
            w.text(file);
            w.u64(*of_seq);
            w.bytes.extend(hash);
            w.u64(*bytes);
            kind::BACKED_UP
        }
        Note::LegalHold { from_day, to_day, by, reason } => {
            put_hold(w, (*from_day, *to_day), by, reason);
            kind::LEGAL_HOLD
        }
        Note::HoldLifted { from_day, to_day, by, reason } => {
            put_hold(w, (*from_day, *to_day), by, reason);
            kind::HOLD_LIFTED
        }
        Note::Migrated { from, to } => {
            w.u32(*from);
            w.u32(*to);
            kind::MIGRATED
        }
        Note::Summary(s) => {
            put_summary(w, s);
            kind::SUMMARY
        }
        Note::JournalBack { lost_at, why, rows_kept } => {
            w.utc(*lost_at);
            w.text(why);
            w.u64(*rows_kept);
            kind::JOURNAL_BACK
        }
    }
}

fn put_hold(w: &mut Writer<'_>, days: (i32, i32), by: &str, reason: &str) {
    w.i32(days.0);
    w.i32(days.1);
    w.text(by);
    w.text(reason);
}

fn put_summary(w: &mut Writer<'_>, s: &Summary) {
    w.i32(s.day);
    w.u64(s.rows);
    w.u32(s.openings);
    w.f64(s.released_m3);
    let counts = [s.windows_missed, s.trips, s.acts, s.refusals, s.rests, s.discrepancies];
    counts.into_iter().for_each(|n| w.u32(n));
}

fn take(kind: u16, r: &mut Reader<'_>) -> Result<Note, RecordError> {
    Ok(match kind {
        kind::SEALED => Note::Sealed {
            day: r.i32("day")?,
            file: r.text("file")?,
            digest: r.bytes("digest")?,
            events: r.u64("events")?,
            minutes: r.u64("minutes")?,
            bytes: r.u64("bytes")?,
        },
        kind::SEGMENT_DELETED => Note::SegmentDeleted {
            day: r.i32("day")?,
            file: r.text("file")?,
            digest: r.bytes("digest")?,
            why: r.text("why")?,
        },
        kind::SNAPSHOT => {
            Note::Snapshot { of_seq: r.u64("row")?, bytes: r.blob("snapshot")?.to_vec() }
        }
        kind::ANCHORED => Note::Anchored {
            of_seq: r.u64("row")?,
            hash: r.bytes("hash")?,
            signature: r.option("signature", |r| {
                Ok(AnchorSignature { key: r.bytes("key")?, bytes: r.bytes("signature")? })
            })?,
        },
        kind::BACKED_UP => Note::BackedUp {
            file: r.text("file")?,
            of_seq: r.u64("row")?,
            hash: r.bytes("hash")?,
            bytes: r.u64("bytes")?,
        },
        kind::LEGAL_HOLD => Note::LegalHold {
            from_day: r.i32("from")?,
            to_day: r.i32("to")?,
            by: r.text("by")?,
            reason: r.text("reason")?,
        },
        kind::HOLD_LIFTED => Note::HoldLifted {
            from_day: r.i32("from")?,
            to_day: r.i32("to")?,
            by: r.text("by")?,
            reason: r.text("reason")?,
        },
        kind::MIGRATED => Note::Migrated { from: r.u32("from")?, to: r.u32("to")? },
        kind::SUMMARY => Note::Summary(take_summary(r)?),
        kind::JOURNAL_BACK => Note::JournalBack {
            lost_at: r.utc("lost at")?,
            why: r.text("why")?,
            rows_kept: r.u64("rows kept")?,
        },
        _ => return Err(RecordError::Unknown { kind, version: VERSION }),
    })
}

fn take_summary(r: &mut Reader<'_>) -> Result<Summary, RecordError> {
    Ok(Summary {
        day: r.i32("day")?,
        rows: r.u64("rows")?,
        openings: r.u32("openings")?,
        released_m3: r.f64("released")?,
        windows_missed: r.u32("windows missed")?,
        trips: r.u32("trips")?,
        acts: r.u32("acts")?,
        refusals: r.u32("refusals")?,
        rests: r.u32("rests")?,
        discrepancies: r.u32("discrepancies")?,
    })
}

/// One plain line.
pub(crate) fn line(note: &Note) -> String {
    match note {
        Note::Sealed { file, events, minutes, bytes, .. } => {
            format!("sealed {file}: {events} events, {minutes} minutes, {bytes} bytes")
        }
        Note::SegmentDeleted { file, why, .. } => format!("deleted {file}: {why}"),
        Note::Snapshot { of_seq, bytes } => {
            format!("snapshot of rows 1 to {of_seq}, {} bytes", bytes.len())
        }
        Note::Anchored { of_seq, hash, signature } => {
            let signed = if signature.is_some() { ", signed" } else { "" };
            let hex: String = hash.iter().map(|b| format!("{b:02x}")).collect();
            format!("anchor {of_seq}:{hex}{signed}")
        }
        Note::BackedUp { file, of_seq, .. } => format!("backed up rows 1 to {of_seq} as {file}"),
        Note::LegalHold { from_day, to_day, by, reason } => {
            format!("{by} holds the segments of {}: {reason}", days(*from_day, *to_day))
        }
        Note::HoldLifted { from_day, to_day, by, reason } => {
            format!("{by} lifts the hold on {}: {reason}", days(*from_day, *to_day))
        }
        Note::Migrated { from, to } => format!("evidence file lifted from form {from} to {to}"),
        Note::Summary(s) => format!(
            "summary of {}: {:.0} m3, {} orders to open or run, {} windows missed, {} trips, {} rests, \
             {} discrepancies, {} acts, {} refusals, {} rows",
            date(s.day),
            s.released_m3,
            s.openings,
            s.windows_missed,
            s.trips,
            s.rests,
            s.discrepancies,
            s.acts,
            s.refusals,
            s.rows
        ),
        Note::JournalBack { lost_at, why, rows_kept } => {
            format!("journal back, lost since {lost_at}, {rows_kept} batches kept: {why}")
        }
    }
}

fn days(from: i32, to: i32) -> String {
    format!("{} to {}", date(from), date(to))
}

fn date(day: i32) -> String {
    let text = Utc::from_micros(i64::from(day) * 86_400_000_000).to_string();
    text.get(..10).unwrap_or(&text).to_owned()
}
