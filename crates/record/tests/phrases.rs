//! A file full of strange phrases does not fill memory. On its own, as what a process has once kept
//! it keeps.

use record::{Row, describe, kind};
use units::{Mono, Utc};

/// A decision with one interlock's objection; its code is a fixed phrase of the program's own.
fn decision(code: &str) -> Row {
    let text = |s: &str| [&(s.len() as u32).to_le_bytes(), s.as_bytes()].concat();
    let body = [
        text("gate"),
        vec![2, 0],
        1_u32.to_le_bytes().to_vec(),
        vec![2],
        text(code),
        // About the mode, which is missing, and must be after the epoch.
        vec![3, 4, 4],
        vec![0; 8],
    ];
    let (subject, cause) = ("gate".to_owned(), String::new());
    Row {
        seq: 1,
        term: 1,
        utc: Utc::EPOCH,
        boot: Mono::ZERO,
        kind: kind::DECISION,
        version: 1,
        subject,
        cause,
        body: body.concat(),
        hash: [0; 32],
    }
}

#[test]
fn fixed_phrases_are_bounded_and_those_known_still_read() {
    let reads = |code: &str| !describe(&decision(code)).contains("cannot be read");
    assert!(reads("I4"));
    let read = (0..2_000).filter(|n| reads(&format!("X{n}"))).count();
    assert_eq!(read, 511);
    assert!(reads("I4") && reads("X0") && !reads("X1999"));
}
