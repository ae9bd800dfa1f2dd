//! Evidence files that older versions wrote. Each is kept as it was written, never made again.

use std::fs;
use std::path::Path;

use journal::{Filter, Journal, Opening, rows, verify};
use record::{Fold, Row, describe};

use crate::scenarios::tarrow::tarrow;

/// Written by the version that knew form 1: 244 rows of one simulated day at Tarrow Works, with a
/// person's acts, 52 commands and a clean stop.
const FORM_1: &[u8] = include_bytes!("v1/evidence-form-1.db");
/// As that version's `journal verify` printed it.
const HEAD: &str = "616b43dbf621fb38e9a99f94585b06395392109fb353afca642c5c02e949c7cd";

fn put(dir: &Path) {
    fs::write(dir.join(journal::FILE_NAME), FORM_1).unwrap();
}

fn all(dir: &Path) -> Vec<Row> {
    rows(dir, &Filter::default()).unwrap()
}

#[test]
fn compat_v1_a_file_of_form_1_is_read_as_it_is() {
    let dir = tempfile::tempdir().unwrap();
    put(dir.path());
    let verified = verify(dir.path(), &mut |_, _| {}).unwrap();
    assert_eq!((verified.rows, verified.head_hex.as_str()), (244, HEAD));
    let read = all(dir.path());
    for row in &read {
        assert!(!describe(row).contains("cannot be read"), "{row:?}");
    }
    let mut events = 0;
    journal::events(dir.path(), &mut |_| events += 1).unwrap();
    assert_eq!(events, 0, "form 1 kept none");
    assert_eq!(
        fs::read(dir.path().join(journal::FILE_NAME)).unwrap(),
        FORM_1,
        "not a byte changed"
    );
}

#[test]
fn compat_v1_a_file_of_form_1_is_lifted_and_goes_on() {
    let dir = tempfile::tempdir().unwrap();
    put(dir.path());
    let before = all(dir.path());
    let journal = Journal::open(dir.path(), &mut |_| {}).unwrap();
    assert_eq!((journal.lifted_from(), journal.rows(), journal.next_term()), (Some(1), 244, 2));
    assert_eq!(journal.head_hex(), HEAD);
    journal.close().unwrap();
    assert_eq!(all(dir.path()), before);
    let again = Journal::open(dir.path(), &mut |_| {}).unwrap();
    assert_eq!(again.lifted_from(), None);
}

#[test]
fn compat_v1_what_it_hands_to_the_next_term_is_understood() {
    let dir = tempfile::tempdir().unwrap();
    put(dir.path());
    let site = tarrow();
    let mut fold = Fold::new(&site);
    let opening = Opening::begin(dir.path()).unwrap();
    drop(opening.walk(0, &mut |row| fold.push(&row)).unwrap());
    let carried = fold.finish();
    assert_eq!(carried.mode, Some(engine::Mode::Automatic));
    assert_eq!(carried.latches, []);
    assert_eq!(carried.open_intents, [], "it was stopped cleanly");
    let pump = site.asset_named("pump-1").unwrap().id;
    let until = units::Utc::parse("2027-05-09T00:00:00Z").unwrap();
    assert_eq!(carried.holds, [(pump, until)]);
    let released_m3: f64 = carried.released.iter().map(|(_, v, _)| v.get()).sum();
    assert!(released_m3 > 1000.0, "{released_m3}");
}
