//! Every way in which a body can be wrong, by a body that is.

use engine::{Entry, Outcome};

use super::{GATE, at, row_of, site};
use crate::{Draft, RecordError, Row, decode, decode_note, encode, kind};

fn row(kind: u16, body: &[u8]) -> Row {
    let (subject, cause) = (String::new(), String::new());
    row_of(Draft { kind, version: 1, subject, cause, body: body.to_vec() }, 1, 1, at(0))
}

fn refused(kind: u16, body: &[u8]) -> RecordError {
    decode(&row(kind, body), &site()).unwrap_err()
}

fn text(s: &str) -> Vec<u8> {
    let mut bytes = (s.len() as u32).to_le_bytes().to_vec();
    bytes.extend(s.as_bytes());
    bytes
}

fn joined(parts: &[&[u8]]) -> Vec<u8> {
    parts.concat()
}

#[test]
fn another_version_and_another_kind() {
    let mut up = row(kind::ADAPTER_UP, &text("bus"));
    assert!(decode(&up, &site()).is_ok());
    up.version = 2;
    let unknown = |kind, version| RecordError::Unknown { kind, version };
    assert_eq!(decode(&up, &site()), Err(unknown(kind::ADAPTER_UP, 2)));
    assert_eq!(decode_note(&up), Err(unknown(kind::ADAPTER_UP, 2)));
    up.version = 0;
    assert_eq!(decode(&up, &site()), Err(unknown(kind::ADAPTER_UP, 0)));
    assert_eq!(refused(0, &[]), unknown(0, 1));
    assert_eq!(refused(kind::JOURNAL_BACK + 1, &[]), unknown(31, 1));
    assert_eq!(refused(kind::SEALED, &[]), unknown(21, 1));
}

#[test]
fn short_and_long() {
    let short = |field| RecordError::Short { field };
    assert_eq!(refused(kind::ADAPTER_UP, &[]), short("adapter"));
    assert_eq!(refused(kind::ADAPTER_UP, &text("bus")[..6]), short("adapter"));
    assert_eq!(refused(kind::RESET, &[]), short("asset"));
    let long = joined(&[&text("bus"), &[0, 0]]);
    assert_eq!(refused(kind::ADAPTER_UP, &long), RecordError::Long { bytes: 2 });
    // A length or a count of four thousand million is refused before anything is set aside for it.
    assert_eq!(refused(kind::ADAPTER_UP, &[255; 8]), short("adapter"));
    assert_eq!(refused(kind::ARMED, &joined(&[&[1], &[255; 40]])), short("reasons"));
}

#[test]
fn text_that_is_not_utf8() {
    let error = refused(kind::STOPPING, &joined(&[&2_u32.to_le_bytes(), &[0xc3, 0x28]]));
    let RecordError::Bad { field: "why", why } = error else { panic!("{error}") };
    assert!(why.starts_with("not UTF-8"), "{why}");
}

/// Every tag with a value that stands for nothing.
#[test]
fn unknown_tags() {
    let gate = text("gate");
    let number = 9_u64.to_le_bytes();
    let act = joined(&[&text("a"), &text("b"), &text("c")]);
    let decision = joined(&[&gate, &[3, 0], &1_u32.to_le_bytes()]);
    let fact = |parts: &[&[u8]]| joined(&[&decision, &joined(parts)]);
    let cases: Vec<(u16, Vec<u8>, &str)> = vec![
        (kind::MODE_CHANGED, vec![9], "mode"),
        (kind::CLOCK, vec![3], "trust"),
        (kind::ARMED, vec![2], "armed"),
        (kind::ACT, joined(&[&act, &[11]]), "act"),
        (kind::ACT, joined(&[&act, &[10, 2]]), "refused"),
        (kind::DECISION, joined(&[&gate, &[5]]), "action"),
        (kind::OUTCOME, joined(&[&gate, &number, &[4]]), "outcome"),
        (kind::REST, joined(&[&gate, &[6]]), "rest action"),
        (kind::DECISION, fact(&[&[9]]), "by"),
        (kind::DECISION, fact(&[&[8, 20]]), "about"),
        (kind::DECISION, fact(&[&[8, 2, 5]]), "is"),
        (kind::DECISION, fact(&[&[8, 2, 4, 6]]), "must be"),
    ];
    for (kind, body, tag) in cases {
        let body = joined(&[&body, &[0; 40]]);
        let error = refused(kind, &body);
        let RecordError::Bad { field, why } = &error else { panic!("{tag}: {error}") };
        assert_eq!(*field, tag);
        assert!(why.ends_with("stands for nothing"), "{error}");
    }
}

#[test]
fn values_that_cannot_be() {
    let bad = |kind, body: &[u8]| match refused(kind, body) {
        RecordError::Bad { field, .. } => field,
        other => panic!("{other}"),
    };
    let nan = f64::NAN.to_bits().to_le_bytes();
    let (five, six) = (5_i64.to_le_bytes(), 6_i64.to_le_bytes());
    let gate = text("gate");
    assert_eq!(bad(kind::DECISION, &joined(&[&gate, &[1], &nan])), "opening");
    assert_eq!(bad(kind::RELEASED, &joined(&[&six, &six, &five])), "bucket");
    assert_eq!(bad(kind::RELEASED, &joined(&[&five, &six, &six])), "bucket");
    assert_eq!(bad(kind::RELEASED, &joined(&[&six, &five, &six, &nan])), "volume");
}

#[test]
fn names_that_the_site_file_does_not_have() {
    let missing = |kind, body: &[u8]| match refused(kind, body) {
        RecordError::NoSuchName { what, name } => (what, name),
        other => panic!("{other}"),
    };
    let gone = text("gone");
    let decision = joined(&[&text("gate"), &[3, 0], &1_u32.to_le_bytes()]);
    let fact = |parts: &[&[u8]]| joined(&[&decision, &joined(parts), &gone]);
    let name = |what| (what, "gone".to_owned());
    assert_eq!(missing(kind::RESET, &joined(&[&[1], &gone])), name("asset"));
    assert_eq!(missing(kind::DECISION, &fact(&[&[4]])), name("clause"));
    assert_eq!(missing(kind::DECISION, &fact(&[&[8, 1]])), name("signal"));
    assert_eq!(missing(kind::DECISION, &fact(&[&[8, 8]])), name("adapter"));
    // Without the site file the same row still says what it says.
    let line = crate::describe(&row(kind::RESET, &joined(&[&[1], &gone])));
    assert_eq!(line, "trip of gone reset");
}

#[test]
fn a_phrase_too_long_to_be_ours() {
    let long = text(&"x".repeat(257));
    let decision = joined(&[&text("gate"), &[3, 0], &1_u32.to_le_bytes(), &[2], &long]);
    let RecordError::Bad { field: "interlock", .. } = refused(kind::DECISION, &decision) else {
        panic!("it is taken")
    };
}

#[test]
fn errors_name_their_subject() {
    let words = |e: RecordError| e.to_string();
    assert_eq!(words(refused(kind::RESET, &[])), "the body ends within `asset`");
    assert_eq!(words(refused(kind::RESET, &[0, 1])), "1 bytes are left after the last field");
    assert_eq!(words(refused(kind::RESET, &[7])), "`asset` cannot be: 7 stands for nothing");
    let gone = joined(&[&[1], &text("gone")]);
    assert_eq!(words(refused(kind::RESET, &gone)), "the site file has no asset `gone`");
}

#[test]
fn a_cause_and_a_subject_are_written_out() {
    let why = "no answer".to_owned();
    let entry = Entry::Outcome { asset: GATE, command: 1, outcome: Outcome::Refused(why) };
    let draft = encode(&entry, &site());
    assert_eq!((draft.subject.as_str(), draft.cause.as_str()), ("gate", "no answer"));
    assert_eq!((draft.kind, draft.version), (kind::OUTCOME, crate::VERSION));
}
