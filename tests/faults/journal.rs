//! The record under tampering: every changed bit, every missing or moved row is found and named, and
//! what a newer program wrote is refused.

use std::fs;
use std::path::Path;
use std::sync::mpsc::channel;

use journal::{Batch, Journal, JournalError, Reply, verify};
use rusqlite::{Connection, params};
use units::{Mono, Span, Utc};
use world::World;

use crate::scenarios::tarrow::{at, setup, tarrow};

/// A journal of one simulated day, closed; how many rows it has.
fn day(dir: &Path) -> u64 {
    let site = tarrow();
    let run = World::new(setup(site.clone(), at("2027-05-02T00:00:00Z"), 1)).run().unwrap();
    let journal = Journal::open(dir, &mut |_| {}).unwrap();
    let term = journal.next_term();
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    let mut rows = 0;
    for chunk in run.entries.chunks(50) {
        let drafts: Vec<_> = chunk.iter().map(|(_, e)| record::encode(e, &site)).collect();
        rows += drafts.len() as u64;
        let (utc, boot) = (chunk[0].0.utc, chunk[0].0.boot);
        let (intents, seen) = (Vec::new(), journal::Seen::default());
        handle.submit(Batch { term, utc, boot, drafts, intents, seen }).unwrap();
        assert!(matches!(replies.recv().unwrap(), Reply::Acked(_)));
    }
    handle.close().unwrap();
    rows
}

fn evidence(dir: &Path) -> Connection {
    Connection::open(dir.join(journal::FILE_NAME)).unwrap()
}

fn first_bad(dir: &Path) -> Option<u64> {
    match verify(dir, &mut |_, _| {}) {
        Ok(_) => None,
        Err(JournalError::FirstBad { seq, .. }) => Some(seq),
        Err(other) => panic!("{other}"),
    }
}

#[test]
fn fault_one_flipped_bit_anywhere_in_a_row_is_found_and_named() {
    let dir = tempfile::tempdir().unwrap();
    let rows = day(dir.path());
    assert_eq!(first_bad(dir.path()), None);
    let mut flips = 0;
    let step = (rows / 28).max(1) as usize;
    for seq in (1..=rows).step_by(step) {
        for column in ["term", "utc_us", "boot_ns", "kind", "version"] {
            let change = format!("UPDATE evidence SET {column} = {column} + ?2 WHERE seq = ?1");
            let bit = 1_i64 << (flips % 5);
            evidence(dir.path()).execute(&change, params![seq as i64, bit]).unwrap();
            assert_eq!(first_bad(dir.path()), Some(seq), "{column} of row {seq}");
            evidence(dir.path()).execute(&change, params![seq as i64, -bit]).unwrap();
            flips += 1;
        }
        for column in ["subject", "cause", "body", "hash"] {
            flips += flip_bytes(dir.path(), seq, column);
        }
    }
    assert_eq!(first_bad(dir.path()), None, "everything was put back");
    println!("{flips} flipped bits over {rows} rows, all found");
    assert!(flips >= 200, "{flips}");
}

/// Flips one bit in the first, middle and last byte of a column, one at a time.
fn flip_bytes(dir: &Path, seq: u64, column: &str) -> usize {
    let read = format!("SELECT CAST({column} AS BLOB) FROM evidence WHERE seq = ?1");
    let good: Vec<u8> = evidence(dir).query_row(&read, params![seq as i64], |r| r.get(0)).unwrap();
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
        evidence(dir).execute(&write, params![seq as i64, bad]).unwrap();
        assert_eq!(first_bad(dir), Some(seq), "{column} byte {place} of row {seq}");
    }
    evidence(dir).execute(&write, params![seq as i64, good]).unwrap();
    places.len()
}

#[test]
fn fault_a_row_taken_out_or_put_elsewhere_is_found() {
    let dir = tempfile::tempdir().unwrap();
    let rows = day(dir.path());
    let file = dir.path().join(journal::FILE_NAME);
    let kept = fs::read(&file).unwrap();
    let middle = rows / 2;
    for change in [
        format!("DELETE FROM evidence WHERE seq = {middle}"),
        format!("UPDATE evidence SET seq = -1 WHERE seq = {middle}"),
        format!(
            "UPDATE evidence SET seq = -1 WHERE seq = {middle}; \
             UPDATE evidence SET seq = {middle} WHERE seq = {middle} + 1; \
             UPDATE evidence SET seq = {middle} + 1 WHERE seq = -1"
        ),
    ] {
        evidence(dir.path()).execute_batch(&change).unwrap();
        assert!(verify(dir.path(), &mut |_, _| {}).is_err(), "{change}");
        fs::write(&file, &kept).unwrap();
        assert_eq!(first_bad(dir.path()), None);
    }
}

#[test]
fn fault_what_a_newer_program_wrote_is_refused_with_the_remedy() {
    let dir = tempfile::tempdir().unwrap();
    day(dir.path());
    evidence(dir.path()).execute_batch("PRAGMA user_version = 3").unwrap();
    let Err(error) = Journal::open(dir.path(), &mut |_| {}) else { panic!("it is accepted") };
    assert!(matches!(error, JournalError::Newer { found: 3, known: 2, .. }), "{error}");
}

#[test]
fn compat_v1_every_entry_of_a_day_reads_back_as_it_was() {
    let site = tarrow();
    let run = World::new(setup(site.clone(), at("2027-05-02T00:00:00Z"), 1)).run().unwrap();
    let mut kinds = std::collections::BTreeSet::new();
    for ((stamp, entry), seq) in run.entries.iter().zip(1_u64..) {
        let record::Draft { kind, version, subject, cause, body } = record::encode(entry, &site);
        kinds.insert(kind);
        let (term, utc, boot) = (stamp.term.0, stamp.utc, stamp.boot);
        let row = record::Row {
            seq,
            term,
            utc,
            boot,
            kind,
            version,
            subject,
            cause,
            body,
            hash: [0; 32],
        };
        assert_eq!(&record::decode(&row, &site).unwrap(), entry);
        assert!(!record::describe(&row).is_empty());
    }
    assert!(kinds.len() >= 10, "{kinds:?}");
}

#[test]
fn compat_v1_bytes_of_a_release_and_an_intent_stay_as_they_are() {
    let site = tarrow();
    let utc = Utc::from_civil(2027, 5, 1, 3, 0, 0).unwrap();
    let released = engine::Entry::Released {
        tide: 89_864,
        bucket: units::Window::new(utc, utc + Span::minutes(5)).unwrap(),
        volume: units::CubicMetres::of(312.5),
        estimated: false,
    };
    let intent = engine::Entry::Intent {
        asset: site.asset_named("penstock").unwrap().id,
        action: interlock::Action::Open(units::Percent::of(34.5)),
        command: 7,
        lease_end: Mono::from_nanos(9),
        state_seq: 11,
        readings: 13,
    };
    let hex = |e: &engine::Entry| -> String {
        record::encode(e, &site).body.iter().map(|b| format!("{b:02x}")).collect()
    };
    assert_eq!(hex(&released), GOLDEN_RELEASED);
    assert_eq!(hex(&intent), GOLDEN_INTENT);
}

const GOLDEN_RELEASED: &str = "085f010000000000000ce452676d060000afc564676d0600000000000088734000";
const GOLDEN_INTENT: &str = "0800000070656e73746f636b010000000000404140070000000000000009000000000000000b000000000000000d00000000000000";
