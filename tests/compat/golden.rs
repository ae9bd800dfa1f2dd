//! Golden bytes of every kind of row, note, event and snapshot, one line each in `v1/`: its name and
//! its bytes in hex. A line is never changed or taken out: a new form gets a new folder, and what is
//! in the old one must still be read.
//!
//! When a kind is added, its test fails and says the line to be added.

use std::collections::BTreeSet;

use engine::{Entry, Stamp};
use record::{Draft, Fold, Recorded, Row, canonical_bytes, kind};
use units::{Mono, Utc};

use super::samples;

const ROWS: &str = include_str!("v1/rows.hex");
const NOTES: &str = include_str!("v1/notes.hex");
const EVENTS: &str = include_str!("v1/events.hex");
const SNAPSHOTS: &str = include_str!("v1/snapshots.hex");
/// The form that the folder `v1` is for.
const VERSION: u8 = 1;

type Lines = Vec<(&'static str, Vec<u8>)>;

fn lines(file: &'static str) -> Lines {
    let lines = file.lines().filter(|l| !l.starts_with('#'));
    let split = lines.map(|l| l.split_once(' ').unwrap_or_else(|| panic!("{l:?}")));
    let lines: Lines = split.map(|(name, hex)| (name, bytes(hex))).collect();
    let names: BTreeSet<&str> = lines.iter().map(|(name, _)| *name).collect();
    assert_eq!(names.len(), lines.len(), "a name stands twice");
    lines
}

fn bytes(hex: &str) -> Vec<u8> {
    assert!(hex.len().is_multiple_of(2), "{hex}");
    let byte = |n| u8::from_str_radix(&hex[n..n + 2], 16).unwrap();
    (0..hex.len()).step_by(2).map(byte).collect()
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}

fn golden<'a>(lines: &'a Lines, name: &str, today: &[u8]) -> &'a [u8] {
    let found = lines.iter().find(|(n, _)| *n == name);
    found.map(|(_, b)| &b[..]).unwrap_or_else(|| panic!("no golden line\n{name} {}", hex(today)))
}

/// Every line has its sample, so that none is left unread.
fn all_read(lines: &Lines, samples: impl Iterator<Item = &'static str>) {
    let samples: BTreeSet<&str> = samples.collect();
    let lines: BTreeSet<&str> = lines.iter().map(|(name, _)| *name).collect();
    assert_eq!(lines, samples);
}

/// The kinds that the lines are of, by the name before a stroke.
fn kinds(lines: &Lines) -> BTreeSet<&str> {
    lines.iter().map(|(name, _)| name.split('/').next().unwrap()).collect()
}

fn row_of(draft: Draft) -> Row {
    let Draft { kind, version, subject, cause, body } = draft;
    let Stamp { term, utc, boot, .. } = samples::stamp();
    let term = term.0;
    Row { seq: 7, term, utc, boot, kind, version, subject, cause, body, hash: [0; 32] }
}

/// From the bytes that the hash is taken over, read here by their description alone.
fn row_from(mut bytes: &[u8]) -> Row {
    let mut take = |n: usize| {
        let (head, rest) = bytes.split_at(n);
        bytes = rest;
        head
    };
    let mut number = |n: usize| {
        let mut le = [0; 8];
        le[..n].copy_from_slice(take(n));
        u64::from_le_bytes(le)
    };
    let (seq, term, utc, boot) = (number(8), number(8), number(8), number(8));
    let (kind, version) = (number(2) as u16, number(1) as u8);
    let mut part = || {
        let n = u32::from_le_bytes(take(4).try_into().unwrap());
        take(n as usize).to_vec()
    };
    let mut text = || String::from_utf8(part()).unwrap();
    let (subject, cause) = (text(), text());
    let body = part();
    assert!(bytes.is_empty());
    let (utc, boot) = (Utc::from_micros(utc as i64), Mono::from_nanos(boot));
    Row { seq, term, utc, boot, kind, version, subject, cause, body, hash: [0; 32] }
}

/// The row of a golden line. The words of the cause are for people and may be put better later; all
/// else that today's version writes must be the same.
fn as_golden(lines: &Lines, name: &str, draft: Draft) -> Row {
    let today = row_of(draft);
    let golden = golden(lines, name, &canonical_bytes(&today));
    let row = row_from(golden);
    assert_eq!(hex(&canonical_bytes(&row)), hex(golden), "{name}");
    assert_eq!(Row { cause: today.cause.clone(), ..row.clone() }, today, "{name}");
    assert_eq!((row.version, kind::name(row.kind)), (VERSION, name.split('/').next()));
    row
}

#[test]
fn compat_v1_every_kind_of_entry_reads_back() {
    let site = samples::site();
    let lines = lines(ROWS);
    for (name, entry) in samples::entries() {
        let row = as_golden(&lines, name, record::encode(&entry, &site));
        assert_eq!(record::decode(&row, &site).unwrap(), entry, "{name}");
        assert!(!record::describe(&row).contains("cannot be read"), "{name}");
    }
    all_read(&lines, samples::entries().iter().map(|s| s.0));
    let written = kind::all().filter(|k| *k < kind::SEALED).map(|k| kind::name(k).unwrap());
    assert_eq!(kinds(&lines), written.collect());
}

#[test]
fn compat_v1_every_kind_of_note_reads_back() {
    let lines = lines(NOTES);
    for (name, note) in samples::notes() {
        let row = as_golden(&lines, name, record::encode_note(&note));
        assert_eq!(record::decode_note(&row).unwrap(), note, "{name}");
        assert!(!record::describe(&row).contains("cannot be read"), "{name}");
    }
    all_read(&lines, samples::notes().iter().map(|s| s.0));
    let written = kind::all().filter(|k| *k >= kind::SEALED).map(|k| kind::name(k).unwrap());
    assert_eq!(kinds(&lines), written.collect());
}

#[test]
fn compat_v1_every_kind_of_event_reads_back() {
    let site = samples::site();
    let lines = lines(EVENTS);
    for (name, stamp, event) in samples::events() {
        let today = record::encode_event(&stamp, &event, &site);
        let golden = golden(&lines, name, &today);
        assert_eq!(hex(&today), hex(golden), "{name}");
        assert_eq!(golden[0], VERSION);
        let (stamp_back, back) = record::decode_event(golden, &site).unwrap();
        assert_eq!((stamp_back, back), (stamp, Recorded::of(&event)), "{name}");
        // The byte after the form is the kind, but for its top bit.
        let number = golden[1] & 0x7f;
        assert!(record::event_kinds().any(|k| k == (number, name.split('/').next().unwrap())));
    }
    all_read(&lines, samples::events().iter().map(|s| s.0));
    assert_eq!(kinds(&lines), record::event_kinds().map(|(_, name)| name).collect());
}

/// Those of the entries, but for the resets and the stop that would clear what was before them.
fn folded() -> Fold {
    let mut fold = Fold::new(&samples::site());
    let clears = |e: &Entry| matches!(e, Entry::Stopping { .. } | Entry::Reset { .. });
    for (_, entry) in samples::entries().into_iter().filter(|(_, e)| !clears(e)) {
        fold.push(&row_of(record::encode(&entry, &samples::site())));
    }
    fold
}

#[test]
fn compat_v1_a_snapshot_is_restored() {
    let lines = lines(SNAPSHOTS);
    let today = folded().snapshot();
    let golden = golden(&lines, "of-every-entry", &today);
    assert_eq!(hex(&today), hex(golden));
    assert_eq!(golden[0], VERSION);
    let carried = Fold::restore(&samples::site(), golden).unwrap().finish();
    assert_eq!(carried, folded().finish());
    assert!(!carried.released.is_empty() && !carried.latches.is_empty());
    all_read(&lines, ["of-every-entry"].into_iter());
}

#[test]
#[should_panic = "no golden line\nnewcomer 0102"]
fn compat_a_kind_without_a_golden_line_fails_and_says_the_line() {
    golden(&lines(ROWS), "newcomer", &[1, 2]);
}
