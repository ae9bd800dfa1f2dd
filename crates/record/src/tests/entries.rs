//! There and back: every entry and every note.

use std::collections::BTreeSet;
use std::sync::LazyLock;

use model::Site;
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;
use units::Utc;

use super::{any, at, row_of};
use crate::{
    AnchorSignature, Note, Summary, decode, decode_note, describe, encode, encode_note, kind,
};

static SITE: LazyLock<Site> = LazyLock::new(super::site);

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn prop_an_entry_reads_back_as_it_was(entry in any::entry()) {
        let row = row_of(encode(&entry, &SITE), 1, 1, at(0));
        prop_assert_eq!(&decode(&row, &SITE).unwrap(), &entry);
        let line = describe(&row);
        prop_assert!(!line.is_empty() && !line.contains(['\n', '\r']));
        prop_assert!(!line.contains("cannot be read"), "{}", line);
        // It is no note, and says so.
        prop_assert!(decode_note(&row).is_err());
    }

    #[test]
    fn prop_a_body_cut_anywhere_is_refused(entry in any::entry(), cut in any::<prop::sample::Index>()) {
        let mut row = row_of(encode(&entry, &SITE), 1, 1, at(0));
        let whole = row.body.len();
        row.body.truncate(cut.index(whole));
        prop_assert!(decode(&row, &SITE).is_err());
        prop_assert!(describe(&row).contains("cannot be read"));
    }

    #[test]
    fn prop_any_bytes_are_read_or_refused(kind in 0..40_u16, body in prop::collection::vec(any::<u8>(), 0..200)) {
        let draft = crate::Draft { kind, version: 1, subject: String::new(), cause: String::new(), body };
        let row = row_of(draft, 1, 1, at(0));
        // What reads must be written as the same bytes: a row has one form only.
        if let Ok(entry) = decode(&row, &SITE) {
            prop_assert_eq!(encode(&entry, &SITE).body, row.body.clone());
        }
        if let Ok(note) = decode_note(&row) {
            prop_assert_eq!(encode_note(&note).body, row.body.clone());
        }
        prop_assert!(!describe(&row).is_empty());
    }
}

#[test]
fn the_generator_makes_every_kind() {
    let mut runner = TestRunner::deterministic();
    let strategy = any::entry();
    let made = |_| encode(&strategy.new_tree(&mut runner).unwrap().current(), &SITE).kind;
    let kinds: BTreeSet<u16> = (0..2_000).map(made).collect();
    let entries: BTreeSet<u16> = kind::all().filter(|k| *k < kind::SEALED).collect();
    assert_eq!(kinds, entries);
}

/// One of each kind at least, with every optional part there and not there.
pub fn notes() -> Vec<Note> {
    let digest = [7; 32];
    let file = || "2027-05-01.seg".to_owned();
    let who = || ("A. Reeve".to_owned(), "inquiry".to_owned());
    let signature = Some(AnchorSignature { key: [1; 32], bytes: [2; 64] });
    let summary = Summary {
        day: 20_939,
        rows: 1,
        openings: 2,
        released_m3: 3.5,
        windows_missed: 4,
        trips: 5,
        acts: 6,
        refusals: 7,
        rests: 8,
        discrepancies: 9,
    };
    vec![
        Note::Sealed { day: -1, file: file(), digest, events: 1, minutes: 2, bytes: 3 },
        Note::SegmentDeleted { day: 20_939, file: file(), digest, why: "past its time".to_owned() },
        Note::Snapshot { of_seq: 9, bytes: vec![1, 2, 3] },
        Note::Anchored { of_seq: 9, hash: digest, signature: None },
        Note::Anchored { of_seq: 9, hash: digest, signature },
        Note::BackedUp { file: file(), of_seq: 9, hash: digest, bytes: 4096 },
        Note::LegalHold { from_day: 1, to_day: 2, by: who().0, reason: who().1 },
        Note::HoldLifted { from_day: 1, to_day: 2, by: who().0, reason: who().1 },
        Note::Migrated { from: 1, to: 2 },
        Note::Summary(summary),
        Note::JournalBack { lost_at: at(0), why: "disk full".to_owned(), rows_kept: 12 },
    ]
}

#[test]
fn every_note_reads_back_and_is_refused_when_cut() {
    let mut kinds = BTreeSet::new();
    for note in notes() {
        let mut row = row_of(encode_note(&note), 1, 1, at(0));
        kinds.insert(row.kind);
        assert_eq!(row.subject, crate::SITE);
        assert_eq!(decode_note(&row).unwrap(), note);
        assert!(decode(&row, &SITE).is_err(), "a note is no entry");
        let line = describe(&row);
        assert!(!line.is_empty() && !line.contains("cannot be read"), "{line}");
        let body = row.body.clone();
        for cut in 0..body.len() {
            row.body.truncate(body.len() - cut - 1);
            assert!(decode_note(&row).is_err(), "{line} without {} bytes", cut + 1);
        }
        row.body = body;
        row.body.push(0);
        assert!(decode_note(&row).is_err(), "{line} with a byte more");
    }
    assert_eq!(kinds, kind::all().filter(|k| *k >= kind::SEALED).collect());
}

#[test]
fn a_note_has_its_reason_as_cause() {
    let causes: Vec<String> =
        notes().iter().map(|n| encode_note(n).cause).filter(|c| !c.is_empty()).collect();
    assert_eq!(causes, ["past its time", "inquiry", "inquiry", "disk full"]);
}

#[test]
fn notes_are_described_with_their_dates() {
    let lines: Vec<String> =
        notes().iter().map(|n| describe(&row_of(encode_note(n), 1, 1, Utc::EPOCH))).collect();
    assert!(lines[6].contains("1970-01-02 to 1970-01-03"), "{}", lines[6]);
    assert!(lines[9].contains("2027-05-01"), "{}", lines[9]);
}
