//! The record under tampering: whatever is changed in it is found, and the first wrong row named.
//!
//! The short form runs always. `TIDEREEVE_LONG=1` flips each bit of 1,000 sampled bytes and tampers
//! 1,000 times; `DEVELOPERS.md` has the command, `crates/journal/README.md` the results.

use std::fs;
use std::path::Path;
use std::sync::mpsc::channel;

use journal::{
    Anchor, Batch, Checks, Filter, Journal, JournalError, Reply, Seen, Stamp, Task, rows, verify,
    verify_with,
};
use record::{Draft, Row, kind};
use rusqlite::{Connection, params};
use units::{Mono, Span, Utc};

/// A simulated day at Tarrow Works, as form 1 kept it: 244 rows.
const DAY: &[u8] = include_bytes!("../compat/v1/evidence-form-1.db");

fn long() -> bool {
    std::env::var_os("TIDEREEVE_LONG").is_some()
}

/// That day in today's form, with so many more rows that some are packed, and an anchor that was
/// kept elsewhere.
fn record(dir: &Path, more: u64) -> Anchor {
    fs::write(dir.join(journal::FILE_NAME), DAY).unwrap();
    let journal = Journal::open(dir, &mut |_| {}).unwrap();
    let term = journal.next_term();
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    let utc = Utc::from_civil(2027, 5, 3, 0, 0, 0).unwrap();
    let events = (0..20).map(|n| vec![n; 30]).collect();
    let seen = Seen { events, minutes: Vec::new() };
    let (boot, drafts) = (Mono::ZERO, (0..more).map(draft).collect());
    handle.submit(Batch { term, utc, boot, drafts, intents: Vec::new(), seen }).unwrap();
    let done = |task| {
        handle.task(Stamp { term, utc: utc + Span::days(1), boot }, task).unwrap();
        loop {
            if let Reply::Done(done) = replies.recv().unwrap() {
                return done.outcome.unwrap();
            }
        }
    };
    done(Task::Seal { before_day: i32::MAX });
    let anchor = done(Task::Anchor { key: None });
    handle.close().unwrap();
    Anchor::parse(&anchor).unwrap()
}

fn draft(no: u64) -> Draft {
    let body = [4, 0, 0, 0].iter().chain(b"tide").copied().collect();
    let cause = format!("reason {no}");
    Draft { kind: kind::STOPPING, version: 1, subject: "site".to_owned(), cause, body }
}

fn evidence(dir: &Path) -> Connection {
    Connection::open(dir.join(journal::FILE_NAME)).unwrap()
}

fn all(dir: &Path) -> Vec<Row> {
    rows(dir, &Filter::default()).unwrap()
}

fn first_bad(dir: &Path) -> Option<u64> {
    match verify(dir, &mut |_, _| {}) {
        Ok(_) => None,
        Err(JournalError::FirstBad { seq, .. }) => Some(seq),
        Err(other) => panic!("{other}"),
    }
}

/// The same numbers each time; any seed would do.
struct Drawn(u64);

impl Drawn {
    fn below(&mut self, n: u64) -> u64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        (self.0 >> 33) % n
    }
}

#[test]
fn fault_one_flipped_bit_anywhere_in_a_row_is_found_and_named() {
    let dir = tempfile::tempdir().unwrap();
    record(dir.path(), 0);
    assert_eq!(first_bad(dir.path()), None);
    let mut flips = 0;
    for seq in (1..=246).step_by(if long() { 1 } else { 5 }) {
        for column in ["term", "utc_us", "boot_ns", "kind", "version"] {
            let change = format!("UPDATE evidence SET {column} = {column} + ?2 WHERE seq = ?1");
            let bit = 1_i64 << (flips % 5);
            evidence(dir.path()).execute(&change, params![seq, bit]).unwrap();
            assert_eq!(first_bad(dir.path()), Some(seq as u64), "{column} of row {seq}");
            evidence(dir.path()).execute(&change, params![seq, -bit]).unwrap();
            flips += 1;
        }
        for column in ["subject", "cause", "body", "hash"] {
            flips += flip_bytes(dir.path(), seq, column);
        }
    }
    assert_eq!(first_bad(dir.path()), None, "everything was put back");
    println!("{flips} flipped bits in columns, all found");
    assert!(flips > if long() { 3_000 } else { 600 }, "{flips}");
}

/// Flips one bit in the first, middle and last byte of a column, one at a time.
fn flip_bytes(dir: &Path, seq: i64, column: &str) -> usize {
    let read = format!("SELECT CAST({column} AS BLOB) FROM evidence WHERE seq = ?1");
    let good: Vec<u8> = evidence(dir).query_row(&read, [seq], |r| r.get(0)).unwrap();
    let text = ["subject", "cause"].contains(&column);
    let cast = if text { "CAST(?2 AS TEXT)" } else { "?2" };
    let write = format!("UPDATE evidence SET {column} = {cast} WHERE seq = ?1");
    let mut places: Vec<usize> = [0, good.len() / 2, good.len().saturating_sub(1)].into();
    places.retain(|p| *p < good.len());
    places.dedup();
    for (n, place) in places.iter().enumerate() {
        let mut bad = good.clone();
        // The lowest bits, so that text stays text.
        bad[*place] ^= 1 << (n % 3);
        evidence(dir).execute(&write, params![seq, bad]).unwrap();
        assert_eq!(first_bad(dir), Some(seq as u64), "{column} byte {place} of row {seq}");
    }
    evidence(dir).execute(&write, params![seq, good]).unwrap();
    places.len()
}

#[test]
fn fault_each_bit_of_sampled_bytes_of_the_file_is_found_or_changes_nothing() {
    let dir = tempfile::tempdir().unwrap();
    record(dir.path(), 60);
    let (path, rows) = (dir.path().join(journal::FILE_NAME), all(dir.path()));
    let good = fs::read(&path).unwrap();
    let mut drawn = Drawn(2027);
    let sampled = if long() { 1_000 } else { 60 };
    // The file's header too: all of it in the long form.
    let header = (0..100_u64).step_by(if long() { 1 } else { 9 });
    let places = header.chain((0..sampled).map(|_| drawn.below(good.len() as u64)));
    let places: Vec<u64> = places.collect();
    let (mut found, mut nothing) = (0, 0);
    for (place, bit) in places.iter().flat_map(|place| (0..8).map(move |bit| (*place, bit))) {
        let mut bad = good.clone();
        bad[place as usize] ^= 1 << bit;
        fs::write(&path, &bad).unwrap();
        // Room that SQLite does not use may hold anything: then every row is as it was.
        if verify(dir.path(), &mut |_, _| {}).is_err() {
            found += 1;
        } else {
            assert_eq!(all(dir.path()), rows, "byte {place}, bit {bit}: silently another record");
            nothing += 1;
        }
    }
    println!(
        "{} bits of {} bytes: {found} found, {nothing} in room that is not used",
        found + nothing,
        places.len()
    );
    assert!(found > nothing / 4, "{found} of {}", found + nothing);
}

#[test]
fn fault_each_bit_of_a_packed_row_is_found_or_changes_nothing() {
    let dir = tempfile::tempdir().unwrap();
    record(dir.path(), 13_000);
    let body: Vec<u8> = pack(dir.path());
    let rows = all(dir.path());
    let mut drawn = Drawn(1953);
    let (mut found, mut nothing) = (0, 0);
    for _ in 0..if long() { 1_000 } else { 40 } {
        let (place, bit) = (drawn.below(body.len() as u64) as usize, drawn.below(8));
        let mut bad = body.clone();
        bad[place] ^= 1 << bit;
        set_pack(dir.path(), &bad);
        match first_bad(dir.path()) {
            Some(seq) => {
                assert!((1..=4096).contains(&seq), "row {seq}");
                found += 1;
            }
            None => {
                assert_eq!(all(dir.path()), rows);
                nothing += 1;
            }
        }
    }
    println!("packs: {found} found, {nothing} bits that zstd does not mind");
    set_pack(dir.path(), &body);
    assert_eq!(first_bad(dir.path()), None);
    assert!(found > nothing * 9, "{found} found, {nothing} not");
}

fn pack(dir: &Path) -> Vec<u8> {
    let text = "SELECT body FROM packs WHERE first_seq = 1";
    evidence(dir).query_row(text, [], |r| r.get(0)).unwrap()
}

fn set_pack(dir: &Path, body: &[u8]) {
    evidence(dir).execute("UPDATE packs SET body = ?1 WHERE first_seq = 1", [body]).unwrap();
}

/// What somebody might do who has the file and knows SQL, but no anchor.
fn tamper(dir: &Path, rows: u64, drawn: &mut Drawn) -> String {
    let (a, b) = (1 + drawn.below(rows), 1 + drawn.below(rows));
    let change = match drawn.below(8) {
        0 => format!("DELETE FROM evidence WHERE seq = {a}"),
        1 => format!("UPDATE evidence SET cause = cause || 'x' WHERE seq = {a}"),
        2 => format!("UPDATE evidence SET utc_us = utc_us + {b} WHERE seq = {a}"),
        3 => format!("UPDATE evidence SET subject = 'other' WHERE seq = {a}"),
        4 => format!("UPDATE evidence SET hash = randomblob(32) WHERE seq = {a}"),
        5 => format!("UPDATE evidence SET body = randomblob({b}) WHERE seq = {a}"),
        6 => format!(
            "UPDATE evidence SET seq = -1 WHERE seq = {a}; \
             UPDATE evidence SET seq = {a} WHERE seq = {b}; \
             UPDATE evidence SET seq = {b} WHERE seq = -1"
        ),
        // The end cut off.
        _ => format!("DELETE FROM evidence WHERE seq >= {a}"),
    };
    evidence(dir).execute_batch(&change).unwrap();
    change
}

#[test]
fn fault_whatever_somebody_does_to_the_rows_is_found() {
    let dir = tempfile::tempdir().unwrap();
    let anchor = record(dir.path(), 30);
    let checks = Checks { anchors: vec![anchor], key: None };
    let found = || verify_with(dir.path(), &checks, &mut |_, _| {});
    assert!(found().is_ok());
    let (path, kept) = (dir.path().join(journal::FILE_NAME), all(dir.path()));
    let good = fs::read(&path).unwrap();
    let mut drawn = Drawn(11);
    let mut changed = 0;
    for no in 0..if long() { 1_000 } else { 120 } {
        let what = tamper(dir.path(), anchor.seq, &mut drawn);
        if no % 5 == 4 {
            // And goes on as if nothing had been: the chain from there on is whole.
            write_on(dir.path());
        }
        // Two rows put in each other's place may be one and the same row.
        let rows = rows(dir.path(), &Filter::default());
        if rows.as_ref().ok() != Some(&kept) {
            assert!(found().is_err(), "{what}");
            changed += 1;
        }
        fs::write(&path, &good).unwrap();
        let _none = fs::remove_file(dir.path().join("evidence.sqlite-wal"));
    }
    println!("{changed} tamperings, all found");
    assert!(changed > if long() { 980 } else { 110 }, "{changed}");
}

/// Opens the record to write, if it lets itself be opened, and appends as many rows as make up for
/// what may have been cut off.
fn write_on(dir: &Path) {
    let Ok(journal) = Journal::open(dir, &mut |_| {}) else { return };
    let term = journal.next_term();
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    let (utc, boot, seen) = (Utc::EPOCH, Mono::ZERO, Seen::default());
    let drafts = (0..300).map(draft).collect();
    handle.submit(Batch { term, utc, boot, drafts, intents: Vec::new(), seen }).unwrap();
    assert!(matches!(replies.recv().unwrap(), Reply::Acked(_)));
    handle.close().unwrap();
}

#[test]
fn fault_what_a_newer_program_wrote_is_refused_with_the_remedy() {
    let dir = tempfile::tempdir().unwrap();
    record(dir.path(), 0);
    evidence(dir.path()).execute_batch("PRAGMA user_version = 3").unwrap();
    for error in
        [Journal::open(dir.path(), &mut |_| {}).err(), verify(dir.path(), &mut |_, _| {}).err()]
    {
        let error = error.expect("it is refused");
        assert!(matches!(error, JournalError::Newer { found: 3, known: 2, .. }), "{error}");
        assert!(error.to_string().contains("use the version that wrote it"), "{error}");
    }
}

#[test]
fn fault_a_file_cut_short_at_any_page_is_found() {
    let dir = tempfile::tempdir().unwrap();
    record(dir.path(), 60);
    let (path, kept) = (dir.path().join(journal::FILE_NAME), all(dir.path()));
    let good = fs::read(&path).unwrap();
    for length in (0..good.len()).step_by(4096) {
        fs::write(&path, &good[..length]).unwrap();
        assert!(verify(dir.path(), &mut |_, _| {}).is_err(), "cut at {length}");
        // A page of zeros, where it was.
        let mut zeroed = good.clone();
        zeroed[length..length + 4096].fill(0);
        fs::write(&path, &zeroed).unwrap();
        let silent = verify(dir.path(), &mut |_, _| {}).is_ok();
        assert!(!silent || all(dir.path()) == kept, "zeros at {length}");
    }
}
