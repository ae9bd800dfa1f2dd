//! What is kept stays readable and provable: packed, sealed, deleted by rule, held, anchored, copied,
//! saved from damage.

#![expect(clippy::unwrap_used, reason = "a test ends where something is not as it must be")]

mod common;

use std::fs;
use std::ops::ControlFlow;
use std::path::Path;

use common::{Desk, FIRST_DAY, event};
use journal::{
    Anchor, Checks, Filter, Journal, JournalError, Opening, Task, Verified, each_row, events,
    minutes, public_key, restore, rows, salvage, verify, verify_with,
};
use record::{Note, Row, decode_note, kind};
use rusqlite::Connection;

fn db(dir: &Path) -> Connection {
    Connection::open(dir.join(journal::FILE_NAME)).unwrap()
}

fn all(dir: &Path) -> Vec<Row> {
    rows(dir, &Filter::default()).unwrap()
}

fn verified(dir: &Path) -> Verified {
    verify(dir, &mut |_, _| {}).unwrap()
}

fn seen(dir: &Path) -> Vec<Vec<u8>> {
    let mut all = Vec::new();
    events(dir, &mut |e| all.push(e.to_vec())).unwrap();
    all
}

/// 20,000 rows over two days, sealed and packed; the rows as they were acknowledged.
fn packed(dir: &Path) -> Vec<Row> {
    let desk = Desk::open(dir);
    let mut acked = Vec::new();
    for _ in 0..20 {
        acked.extend(desk.write(FIRST_DAY, 1000, 1));
    }
    let words = desk.done(FIRST_DAY, Task::Seal { before_day: FIRST_DAY });
    assert_eq!(words, "0 days sealed, 2 packs made");
    desk.handle.close().unwrap();
    acked
}

#[test]
fn packed_rows_read_and_verify_as_if_they_were_not() {
    let dir = tempfile::tempdir().unwrap();
    let acked = packed(dir.path());
    let packs: i64 =
        db(dir.path()).query_row("SELECT count(*) FROM packs", [], |r| r.get(0)).unwrap();
    assert_eq!(packs, 2);
    assert_eq!(all(dir.path()), acked);
    assert_eq!(verified(dir.path()).rows, 20_000);
    // From the middle of a pack, across its end, with a limit.
    let filter = Filter { from_seq: 4000, limit: Some(200), ..Filter::default() };
    assert_eq!(rows(dir.path(), &filter).unwrap(), acked[3999..4199]);
    let later = Filter { from: Some(common::noon(FIRST_DAY + 1)), ..Filter::default() };
    assert_eq!(rows(dir.path(), &later).unwrap(), []);
    // A row after them goes on from the same chain.
    let desk = Desk::open(dir.path());
    assert_eq!(desk.write(FIRST_DAY, 1, 0)[0].seq, 20_001);
    desk.handle.close().unwrap();
    assert_eq!(verified(dir.path()).rows, 20_001);
}

#[test]
fn the_daemon_reads_packed_rows_in_slices() {
    let dir = tempfile::tempdir().unwrap();
    let acked = packed(dir.path());
    let desk = Desk::open(dir.path());
    let (to, slices) = std::sync::mpsc::channel();
    desk.handle.read(1, usize::MAX, to).unwrap();
    let read: Vec<Row> = slices.iter().flatten().collect();
    assert_eq!(read, acked);
    let (to, slices) = std::sync::mpsc::channel();
    desk.handle.read(4090, 10, to).unwrap();
    let read: Vec<Row> = slices.iter().flatten().collect();
    assert_eq!(read, acked[4089..4099]);
}

#[test]
fn a_start_may_walk_from_a_later_row_and_the_rest_is_verified_behind_it() {
    let dir = tempfile::tempdir().unwrap();
    let acked = packed(dir.path());
    for after in [0, 1, 4096, 5000, 19_999, 20_000] {
        let mut walked = Vec::new();
        let opening = Opening::begin(dir.path()).unwrap();
        let journal = opening.walk(after, &mut |row| walked.push(row)).unwrap();
        assert_eq!(walked, acked[after as usize..]);
        let desk = Desk::of(journal);
        assert_eq!(desk.done(FIRST_DAY, Task::Verify), "rows 1 to 20000 verified");
        desk.handle.close().unwrap();
    }
    db(dir.path())
        .execute("UPDATE packs SET body = zeroblob(9) WHERE first_seq = 4097", [])
        .unwrap();
    let journal = Opening::begin(dir.path()).unwrap().walk(10_000, &mut |_| {}).unwrap();
    let why = Desk::of(journal).task(FIRST_DAY, Task::Verify).outcome.unwrap_err();
    assert!(why.starts_with("row 4097 is the first that is wrong"), "{why}");
}

#[test]
fn fault_whatever_is_changed_in_the_packs_is_found() {
    let dir = tempfile::tempdir().unwrap();
    packed(dir.path());
    let file = dir.path().join(journal::FILE_NAME);
    let good = fs::read(&file).unwrap();
    for change in [
        "DELETE FROM packs WHERE first_seq = 1",
        "DELETE FROM packs WHERE first_seq = 4097",
        "UPDATE packs SET first_seq = 2 WHERE first_seq = 1",
        "UPDATE packs SET last_seq = last_seq + 1 WHERE first_seq = 4097",
        "UPDATE packs SET before = zeroblob(32) WHERE first_seq = 4097",
        "UPDATE packs SET after = zeroblob(32) WHERE first_seq = 1",
        "UPDATE packs SET body = (SELECT body FROM packs WHERE first_seq = 1)",
        "INSERT INTO evidence SELECT 7, term, utc_us, boot_ns, kind, version, subject, cause, \
         body, hash FROM evidence WHERE seq = 20000",
        "DELETE FROM evidence WHERE seq = 8193",
    ] {
        db(dir.path()).execute(change, []).unwrap();
        let error = verify(dir.path(), &mut |_, _| {}).unwrap_err();
        assert!(matches!(error, JournalError::FirstBad { .. }), "{change}: {error}");
        assert!(Journal::open(dir.path(), &mut |_| {}).is_err(), "{change}");
        fs::write(&file, &good).unwrap();
    }
    assert_eq!(verified(dir.path()).rows, 20_000);
}

#[test]
fn a_day_that_is_over_is_sealed_and_its_events_read_on() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    for day in [FIRST_DAY, FIRST_DAY + 1, FIRST_DAY + 2] {
        desk.write(day, 2, 500);
        desk.write(day, 0, 500);
    }
    let today = FIRST_DAY + 2;
    let done = desk.task(today, Task::Seal { before_day: today });
    assert_eq!(done.outcome.unwrap(), "2 days sealed, 0 packs made");
    let Note::Sealed { day, events, minutes, .. } = decode_note(&done.rows[0]).unwrap() else {
        panic!("{:?}", done.rows)
    };
    assert_eq!((day, events, minutes), (FIRST_DAY, 1000, 2));
    desk.handle.close().unwrap();
    let expected: Vec<Vec<u8>> = [FIRST_DAY, FIRST_DAY + 1, today]
        .into_iter()
        .flat_map(|day| (0..500).chain(0..500).map(move |no| event(day, no)))
        .collect();
    assert_eq!(seen(dir.path()), expected);
    let mut read = Vec::new();
    minutes_of(dir.path(), &mut read);
    assert_eq!(read.len(), 6);
    assert_eq!(read[0].readings[1].steps, Some(1235));
    assert_eq!(read[5].readings[2].quality, 4);
    let found = verified(dir.path());
    assert_eq!((found.rows, found.segments), (8, 2));
}

fn minutes_of(dir: &Path, read: &mut Vec<journal::Minute>) {
    minutes(dir, &mut |m| read.push(m)).unwrap();
}

#[test]
fn fault_a_segment_that_is_gone_or_another_is_found() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    desk.write(FIRST_DAY, 1, 50);
    desk.done(FIRST_DAY + 1, Task::Seal { before_day: FIRST_DAY + 1 });
    desk.handle.close().unwrap();
    let folder = dir.path().join("segments");
    let file = fs::read_dir(&folder).unwrap().next().unwrap().unwrap().path();
    assert!(file.ends_with("2027-05-01-1.segment"), "{}", file.display());
    let good = fs::read(&file).unwrap();
    for at in 0..good.len() {
        let mut bad = good.clone();
        bad[at] ^= 1 << (at % 8);
        fs::write(&file, &bad).unwrap();
        let error = verify(dir.path(), &mut |_, _| {}).unwrap_err();
        assert!(matches!(error, JournalError::Segment { .. }), "byte {at}: {error}");
    }
    fs::remove_file(&file).unwrap();
    assert!(matches!(verify(dir.path(), &mut |_, _| {}), Err(JournalError::Segment { .. })));
    fs::write(&file, &good).unwrap();
    assert_eq!(verified(dir.path()).segments, 1);
}

#[test]
fn retention_deletes_what_no_hold_keeps_and_says_so() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    for day in FIRST_DAY..FIRST_DAY + 5 {
        desk.write(day, 1, 10);
    }
    let today = FIRST_DAY + 5;
    desk.done(today, Task::Seal { before_day: today });
    let (by, reason) = ("A. Reader".to_owned(), "inquiry into 2 May".to_owned());
    let (from_day, to_day) = (FIRST_DAY + 1, FIRST_DAY + 1);
    let hold = Task::Hold { from_day, to_day, by: by.clone(), reason: reason.clone() };
    desk.done(today, hold);
    let words = desk.done(today, Task::Retain { before_day: FIRST_DAY + 3 });
    assert_eq!(words, "2 segments recorded as deleted, 2 files removed");
    let again = desk.done(today, Task::Retain { before_day: FIRST_DAY + 3 });
    assert_eq!(again, "0 segments recorded as deleted, 0 files removed");
    let other = Task::Lift { from_day, to_day: to_day + 1, by: by.clone(), reason: reason.clone() };
    assert!(desk.done(today, other).contains("nothing was changed"));
    desk.done(today, Task::Lift { from_day, to_day, by, reason });
    let words = desk.done(today, Task::Retain { before_day: FIRST_DAY + 3 });
    assert_eq!(words, "1 segments recorded as deleted, 1 files removed");
    desk.handle.close().unwrap();
    let found = verified(dir.path());
    assert_eq!((found.segments, found.segments_deleted), (2, 3));
    assert_eq!(seen(dir.path()).len(), 20);
    let deleted = Filter { kind: Some(kind::SEGMENT_DELETED), ..Filter::default() };
    assert_eq!(rows(dir.path(), &deleted).unwrap().len(), 3);
}

#[test]
fn fault_a_hold_or_a_segment_taken_off_the_lists_is_found() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    desk.write(FIRST_DAY, 1, 10);
    desk.done(FIRST_DAY + 1, Task::Seal { before_day: FIRST_DAY + 1 });
    let (by, reason) = ("A. Reader".to_owned(), "inquiry".to_owned());
    desk.done(FIRST_DAY, Task::Hold { from_day: FIRST_DAY, to_day: FIRST_DAY, by, reason });
    desk.handle.close().unwrap();
    let file = dir.path().join(journal::FILE_NAME);
    let good = fs::read(&file).unwrap();
    for change in ["DELETE FROM holds", "UPDATE holds SET from_day = 0", "DELETE FROM segments"] {
        db(dir.path()).execute(change, []).unwrap();
        assert!(verify(dir.path(), &mut |_, _| {}).is_err(), "{change}");
        fs::write(&file, &good).unwrap();
    }
    // With the hold off the list retention deletes; the rows then say that it was not allowed to.
    db(dir.path()).execute("DELETE FROM holds", []).unwrap();
    let desk = Desk::open(dir.path());
    desk.done(FIRST_DAY, Task::Retain { before_day: FIRST_DAY + 1 });
    desk.handle.close().unwrap();
    let error = verify(dir.path(), &mut |_, _| {}).unwrap_err();
    assert!(error.to_string().contains("a legal hold kept"), "{error}");
}

#[test]
fn an_anchor_kept_elsewhere_finds_a_record_that_was_cut_or_written_anew() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    desk.write(FIRST_DAY, 40, 0);
    let secret = [3; 32];
    let kept = desk.done(FIRST_DAY, Task::Anchor { key: Some(secret) });
    desk.write(FIRST_DAY, 10, 0);
    desk.handle.close().unwrap();
    let anchors = vec![Anchor::parse(&kept).unwrap()];
    let key = Some(public_key(&secret));
    let check = |checks: &Checks| verify_with(dir.path(), checks, &mut |_, _| {});
    let found = check(&Checks { anchors: anchors.clone(), key }).unwrap();
    assert_eq!((found.rows, found.anchors, found.anchors_signed), (51, 1, 1));
    let other = Checks { anchors: anchors.clone(), key: Some(public_key(&[4; 32])) };
    assert!(matches!(check(&other), Err(JournalError::FirstBad { seq: 41, .. })));
    // Cut off before the anchor: alone it verifies, with the anchor it does not.
    db(dir.path()).execute("DELETE FROM evidence WHERE seq > 30", []).unwrap();
    assert_eq!(verified(dir.path()).rows, 30);
    let checks = Checks { anchors, key: None };
    assert!(matches!(check(&checks), Err(JournalError::Anchor { seq: 40, .. })));
    // Written anew from there on.
    let desk = Desk::open(dir.path());
    desk.write(FIRST_DAY, 30, 0);
    desk.handle.close().unwrap();
    assert_eq!(verified(dir.path()).rows, 60);
    assert!(matches!(check(&checks), Err(JournalError::Anchor { seq: 40, .. })));
}

#[test]
fn a_backup_is_made_while_rows_come_and_restores_to_the_same_hash() {
    let dir = tempfile::tempdir().unwrap();
    packed(dir.path());
    let backups = dir.path().join("backups");
    let desk = Desk::open(dir.path());
    let seal = Task::Seal { before_day: FIRST_DAY + 1 };
    desk.done(FIRST_DAY + 1, seal);
    desk.handle.task(desk.stamp(FIRST_DAY), Task::Backup { to: backups.clone(), keep: 2 }).unwrap();
    let mut meanwhile = 0;
    let done = loop {
        desk.handle.submit(common_batch(&desk)).unwrap();
        match desk.reply() {
            journal::Reply::Done(done) => break done,
            journal::Reply::Acked(_) => meanwhile += 1,
            other => panic!("{other:?}"),
        }
    };
    assert!(meanwhile > 0);
    let Note::BackedUp { file, of_seq, .. } = decode_note(&done.rows[0]).unwrap() else {
        panic!("{done:?}")
    };
    desk.handle.close().unwrap();
    let elsewhere = tempfile::tempdir().unwrap();
    assert_eq!(restore(&backups.join(&file), elsewhere.path()).unwrap(), of_seq);
    assert_eq!(all(elsewhere.path()), all(dir.path())[..of_seq as usize]);
    let found = verified(elsewhere.path());
    assert_eq!((found.rows, found.segments), (of_seq, 1));
    let again = restore(&backups.join(file), elsewhere.path());
    assert!(matches!(again, Err(JournalError::NotEmpty { .. })));
    assert_eq!(verified(dir.path()).rows, all(dir.path()).len() as u64);
}

fn common_batch(desk: &Desk) -> journal::Batch {
    let journal::Stamp { term, utc, boot } = desk.stamp(FIRST_DAY);
    let (intents, seen) = (Vec::new(), journal::Seen::default());
    journal::Batch { term, utc, boot, drafts: vec![common::draft(1)], intents, seen }
}

#[test]
fn old_backups_go_when_a_newer_one_is_there() {
    let dir = tempfile::tempdir().unwrap();
    let to = dir.path().join("backups");
    let desk = Desk::open(dir.path());
    for _ in 0..4 {
        desk.write(FIRST_DAY, 3, 0);
        desk.done(FIRST_DAY, Task::Backup { to: to.clone(), keep: 2 });
    }
    let mut names: Vec<String> =
        fs::read_dir(&to).unwrap().map(|e| e.unwrap().file_name().into_string().unwrap()).collect();
    names.sort();
    // Each backup writes a row of its own, after the copy.
    assert_eq!(names, ["evidence-11.sqlite", "evidence-15.sqlite"]);
}

#[test]
fn a_day_is_summed_up_from_packed_and_live_rows() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    for _ in 0..13 {
        desk.write(FIRST_DAY, 1000, 0);
    }
    desk.write(FIRST_DAY + 1, 10, 0);
    assert_eq!(
        desk.done(FIRST_DAY + 1, Task::Seal { before_day: 0 }),
        "0 days sealed, 1 packs made"
    );
    let done = desk.task(FIRST_DAY + 1, Task::Summary { day: FIRST_DAY });
    let Note::Summary(summary) = decode_note(&done.rows[0]).unwrap() else { panic!("{done:?}") };
    assert_eq!((summary.day, summary.rows, summary.acts), (FIRST_DAY, 13_000, 0));
}

#[test]
fn fault_a_damaged_backup_is_not_restored() {
    let dir = tempfile::tempdir().unwrap();
    packed(dir.path());
    let copy = dir.path().join("copy.sqlite");
    fs::copy(dir.path().join(journal::FILE_NAME), &copy).unwrap();
    Connection::open(&copy).unwrap().execute("UPDATE packs SET body = zeroblob(5)", []).unwrap();
    let elsewhere = tempfile::tempdir().unwrap();
    assert!(matches!(restore(&copy, elsewhere.path()), Err(JournalError::FirstBad { .. })));
    assert!(fs::read_dir(elsewhere.path()).unwrap().next().is_none(), "nothing was left behind");
}

#[test]
fn salvage_saves_every_row_before_the_damage() {
    let dir = tempfile::tempdir().unwrap();
    let acked = packed(dir.path());
    for (damage, saved) in [
        ("UPDATE evidence SET cause = 'other' WHERE seq = 15000", 14_999),
        ("DELETE FROM evidence WHERE seq = 9000", 8_999),
    ] {
        db(dir.path()).execute(damage, []).unwrap();
        let to = tempfile::tempdir().unwrap();
        let salvaged = salvage(dir.path(), to.path(), &mut |_| {}).unwrap();
        assert_eq!(salvaged.rows, saved);
        assert!(
            matches!(salvaged.end, Some(JournalError::FirstBad { seq, .. }) if seq == saved + 1)
        );
        assert_eq!(all(to.path()), acked[..saved as usize]);
        assert_eq!(verified(to.path()).rows, saved);
    }
}

#[test]
fn one_row_may_be_enough() {
    let dir = tempfile::tempdir().unwrap();
    let acked = packed(dir.path());
    let mut got = Vec::new();
    each_row(dir.path(), &Filter { from_seq: 4096, ..Filter::default() }, &mut |row| {
        got.push(row);
        if got.len() == 3 { ControlFlow::Break(()) } else { ControlFlow::Continue(()) }
    })
    .unwrap();
    assert_eq!(got, acked[4095..4098]);
}
