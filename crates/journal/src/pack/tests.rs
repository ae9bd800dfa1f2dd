//! A pack gives back its rows, bit for bit, and nothing else passes for it.

use proptest::prelude::*;
use record::Row;
use units::{Mono, Utc};

use super::{decode, encode};
use crate::chain::{GENESIS, Head};

/// A chain of rows after `from`, from a few drawn fields each.
fn chained(fields: Vec<(i64, u64, u16, String, Vec<u8>)>, from: u64) -> ([u8; 32], Vec<Row>) {
    let before = if from == 0 { GENESIS } else { [7; 32] };
    let mut head = Head { seq: from, term: 1, hash: before };
    let rows = fields.into_iter().enumerate().map(|(no, (utc, boot, kind, text, body))| {
        let mut row = Row {
            seq: 0,
            term: 1 + no as u64 / 3,
            utc: Utc::from_micros(utc),
            boot: Mono::from_nanos(boot),
            kind,
            version: 1,
            subject: format!("asset-{}", no % 2),
            cause: text,
            body,
            hash: GENESIS,
        };
        head.chain(&mut row);
        row
    });
    (before, rows.collect())
}

fn some_rows() -> impl Strategy<Value = ([u8; 32], Vec<Row>)> {
    let fields = (any::<i64>(), any::<u64>(), any::<u16>(), "\\PC{0,12}", any::<Vec<u8>>());
    let rows = proptest::collection::vec(fields, 1..40);
    (rows, 0..1_000_000_u64).prop_map(|(fields, from)| chained(fields, from))
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn prop_a_pack_gives_back_its_rows((before, rows) in some_rows()) {
        let bytes = encode(&before, &rows);
        let after = rows.last().unwrap().hash;
        prop_assert_eq!(decode(rows[0].seq, &before, &after, &bytes), Ok(rows));
    }

    #[test]
    fn prop_one_flipped_bit_of_a_pack_is_found(
        (before, rows) in some_rows(), at: prop::sample::Index, bit in 0..8_u32,
    ) {
        let mut bytes = encode(&before, &rows);
        let after = rows.last().unwrap().hash;
        let at = at.index(bytes.len());
        bytes[at] ^= 1 << bit;
        // A bit that zstd itself does not mind gives the same rows; never other ones.
        match decode(rows[0].seq, &before, &after, &bytes) {
            Ok(read) => prop_assert_eq!(read, rows),
            Err(bad) => {
                let inside = rows[0].seq..=rows.last().unwrap().seq;
                prop_assert!(inside.contains(&bad.seq), "{:?}", bad);
            }
        }
    }

    #[test]
    fn prop_any_bytes_are_refused_without_a_panic(bytes: Vec<u8>) {
        prop_assert!(decode(1, &GENESIS, &[1; 32], &bytes).is_err());
        let wrapped = zstd::bulk::compress(&bytes, 1).unwrap();
        prop_assert!(decode(1, &GENESIS, &[1; 32], &wrapped).is_err());
    }
}

#[test]
fn the_first_wrong_row_of_a_pack_has_a_name() {
    let fields = (0..50).map(|n| (n, n as u64, 7, format!("why {n}"), vec![n as u8; 20])).collect();
    let (before, mut rows) = chained(fields, 0);
    let after = rows.last().unwrap().hash;
    rows[20].cause.push('!');
    let bad = decode(1, &before, &after, &encode(&before, &rows)).unwrap_err();
    assert_eq!(bad.seq, 21);
    rows[20].cause.pop();
    assert!(decode(1, &before, &after, &encode(&before, &rows)).is_ok());
    let elsewhere = decode(2, &before, &after, &encode(&before, &rows)).unwrap_err();
    assert!(elsewhere.why.contains("elsewhere"), "{elsewhere:?}");
}
