//! A snapshot and the rows after it give what all rows give.

use std::sync::LazyLock;

use model::{AssetId, Site};
use proptest::collection::vec;
use proptest::prelude::*;
use units::{Span, Utc};

use super::{any, at, row_of, site};
use crate::{Draft, Fold, RecordError, Row, encode, kind};

/// The rows were written under one site file and are folded under another, without one asset.
static SITES: LazyLock<(Site, Site)> = LazyLock::new(|| {
    let then = site();
    let mut now = then.clone();
    "pump-3".clone_into(&mut now.assets[2].name);
    now.assets.swap(0, 2);
    for (no, asset) in now.assets.iter_mut().enumerate() {
        asset.id = AssetId(no as u16);
    }
    (then, now)
});

/// Minutes to a few months, now and then backwards.
fn step() -> impl Strategy<Value = Span> {
    prop_oneof![
        8 => (0..3_600_i64).prop_map(Span::seconds),
        4 => (0..40_i64).prop_map(Span::hours),
        2 => (0..70_i64).prop_map(Span::days),
        1 => (-100..100_i64).prop_map(Span::days),
        1 => any::<i64>().prop_map(Span::micros),
    ]
}

/// Around now, so that things are over or not.
fn near() -> impl Strategy<Value = Utc> {
    (-2_000..2_000_i64).prop_map(at)
}

/// Those entries that matter to a fold, in times that matter.
fn lively() -> impl Strategy<Value = engine::Entry> {
    use engine::{Act, ActKind, Entry};
    let act = |kind| {
        let (by, reason, peer) = ("A".to_owned(), "b".to_owned(), "c".to_owned());
        Entry::Act { act: Act { by, reason, peer, kind }, refused: None }
    };
    let hold = (any::asset(), near()).prop_map(|(asset, until)| ActKind::Hold { asset, until });
    prop_oneof![
        2 => any::entry(),
        1 => hold.prop_map(act),
        1 => near().prop_map(move |until| act(ActKind::Authorise { until })),
        2 => (near(), 0..5_i64, 0.0..900.0).prop_map(|(start, tide, m3)| Entry::Released {
            tide,
            bucket: units::Window::new(start, start + Span::minutes(5)).unwrap(),
            volume: units::CubicMetres::of(m3),
            estimated: false,
        }),
    ]
}

fn draft() -> impl Strategy<Value = Draft> {
    let good = lively().prop_map(|e| encode(&e, &SITES.0));
    let cut = (lively(), any::<prop::sample::Index>()).prop_map(|(e, cut)| {
        let mut draft = encode(&e, &SITES.0);
        draft.body.truncate(cut.index(draft.body.len()));
        draft
    });
    prop_oneof![30 => good, 1 => cut]
}

fn rows() -> impl Strategy<Value = Vec<Row>> {
    vec((draft(), step()), 1..60).prop_map(|list| {
        let mut utc = at(0);
        let mut rows = Vec::new();
        for (seq, (draft, step)) in (1..).zip(list) {
            utc = utc + step;
            rows.push(row_of(draft, seq, 1 + seq / 20, utc));
        }
        rows
    })
}

fn folded(mut fold: Fold, rows: &[Row]) -> Fold {
    rows.iter().for_each(|row| fold.push(row));
    fold
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, cases: 200, ..ProptestConfig::default() })]

    #[test]
    fn prop_a_snapshot_and_the_rest_give_what_all_rows_give(rows in rows()) {
        let now = &SITES.1;
        let all = folded(Fold::new(now), &rows).finish();
        for k in 0..=rows.len() {
            let bytes = folded(Fold::new(now), &rows[..k]).snapshot();
            let restored = Fold::restore(now, &bytes).unwrap();
            prop_assert_eq!(&restored.snapshot(), &bytes, "after {} rows", k);
            prop_assert_eq!(&folded(restored, &rows[k..]).finish(), &all, "after {} rows", k);
        }
    }

    #[test]
    fn prop_a_snapshot_of_a_snapshot_will_do(rows in rows()) {
        let now = &SITES.1;
        let mut fold = Fold::new(now);
        for row in &rows {
            fold.push(row);
            fold = Fold::restore(now, &fold.snapshot()).unwrap();
        }
        prop_assert_eq!(fold.finish(), folded(Fold::new(now), &rows).finish());
    }

    #[test]
    fn prop_a_snapshot_cut_anywhere_is_refused(rows in rows(), cut in any::<prop::sample::Index>()) {
        let bytes = folded(Fold::new(&SITES.1), &rows).snapshot();
        prop_assert!(Fold::restore(&SITES.1, &bytes[..cut.index(bytes.len())]).is_err());
        let long = [&bytes[..], &[0]].concat();
        prop_assert_eq!(Fold::restore(&SITES.1, &long).unwrap_err(), RecordError::Long { bytes: 1 });
    }

    #[test]
    fn prop_a_garbled_snapshot_is_refused_or_handed_over_in_the_sites_own_ids(
        rows in rows(),
        changes in vec((any::<prop::sample::Index>(), any::<u8>()), 1..4),
    ) {
        let mut bytes = folded(Fold::new(&SITES.1), &rows).snapshot();
        for (place, byte) in changes {
            let place = place.index(bytes.len());
            bytes[place] = byte;
        }
        if let Ok(fold) = Fold::restore(&SITES.1, &bytes) {
            let carried = folded(fold, &rows).finish();
            let assets = SITES.1.assets.len();
            let ids = carried.latches.iter().filter_map(|l| l.0)
                .chain(carried.locks.iter().map(|l| l.0))
                .chain(carried.open_intents.iter().map(|o| o.asset))
                .chain(carried.holds.iter().chain(&carried.starts).map(|h| h.0));
            prop_assert!(ids.into_iter().all(|a| a.index() < assets));
        }
    }

    #[test]
    fn prop_any_bytes_are_restored_or_refused(bytes in vec(any::<u8>(), 0..300)) {
        let with_form = [&[1], &bytes[..]].concat();
        for bytes in [bytes, with_form] {
            if let Ok(fold) = Fold::restore(&SITES.1, &bytes) {
                fold.finish();
            }
        }
    }
}

#[test]
fn a_snapshot_of_another_form_is_refused() {
    let mut bytes = Fold::new(&SITES.1).snapshot();
    assert_eq!(bytes[0], 1);
    bytes[0] = 2;
    let refused = Fold::restore(&SITES.1, &bytes).unwrap_err();
    assert_eq!(refused, RecordError::Unknown { kind: kind::SNAPSHOT, version: 2 });
    assert_eq!(Fold::restore(&SITES.1, &[]).unwrap_err(), RecordError::Short { field: "form" });
}
