//! What a day came to, and what a row says field by field.

use std::collections::BTreeSet;
use std::sync::LazyLock;

use engine::{Act, ActKind, Entry, Outcome};
use interlock::Action;
use model::{RestAction, Site};
use proptest::prelude::*;
use units::{CubicMetres, Mono, Span, Window};

use super::{GATE, Rows, any, at, row_of, strange};
use crate::{Note, Summary, canonical_bytes, encode, encode_note, fields, kind};

static SITE: LazyLock<Site> = LazyLock::new(super::site);

fn entries() -> Vec<Entry> {
    let kind = ActKind::TrustClock;
    let act = Act { by: String::new(), reason: String::new(), peer: String::new(), kind };
    let refused = Some("no".to_owned());
    let intent = |action| Entry::Intent {
        asset: GATE,
        action,
        command: 1,
        lease_end: Mono::ZERO,
        state_seq: 1,
        readings: 1,
    };
    let outcome = |outcome| Entry::Outcome { asset: GATE, command: 1, outcome };
    let window = Window::new(at(0), at(1)).unwrap();
    let volume = CubicMetres::of(1.25);
    let cause = String::new;
    vec![
        Entry::Act { act: act.clone(), refused: None },
        Entry::Act { act, refused },
        intent(Action::Run),
        intent(Action::Stop),
        outcome(Outcome::Accepted),
        outcome(Outcome::Refused(cause())),
        Entry::Rest { asset: GATE, action: RestAction::Close, cause: cause() },
        Entry::Discrepancy { asset: GATE, command: 1, wanted: 1.0, found: None },
        Entry::Latched { asset: None, cause: cause() },
        Entry::Released { tide: 1, bucket: window, volume, estimated: true },
        Entry::Released { tide: 1, bucket: window, volume, estimated: false },
        Entry::WindowMissed { tide: 1, window, cause: cause() },
    ]
}

#[test]
fn a_summary_counts_each_kind_of_thing() {
    let mut rows = Rows::new();
    for entry in entries() {
        rows.push(entry);
    }
    rows.push_draft(encode_note(&Note::Migrated { from: 1, to: 2 }));
    // It does not read: it counts as a row and as nothing else.
    rows.push_draft(crate::Draft { kind: kind::REST, ..strange() });
    let mut sum = Summary::of(20_939);
    rows.rows.iter().for_each(|row| sum.push(row));
    let expected = Summary {
        day: 20_939,
        rows: 14,
        openings: 1,
        released_m3: 2.5,
        windows_missed: 1,
        trips: 1,
        acts: 2,
        refusals: 2,
        rests: 1,
        discrepancies: 1,
    };
    assert_eq!(sum, expected);
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn prop_fields_have_a_name_each_and_none_twice(entry in any::entry()) {
        let row = row_of(encode(&entry, &SITE), 1, 1, at(0));
        let told = fields(&row).unwrap();
        let names: BTreeSet<&str> = told.named.iter().map(|(name, _)| *name).collect();
        prop_assert_eq!(names.len(), told.named.len());
        let causes = if let Entry::Decision { causes, .. } = &entry { causes.len() } else { 0 };
        prop_assert_eq!(told.objections.len(), causes);
    }

    /// The hash is over these bytes: two rows that differ anywhere differ in them.
    #[test]
    fn prop_different_rows_have_different_canonical_bytes(
        entry in any::entry(), seq in any::<u64>(), moved in any::<bool>(),
    ) {
        let row = row_of(encode(&entry, &SITE), seq, 1, at(0));
        let bytes = canonical_bytes(&row);
        prop_assert_eq!(bytes.len(), 47 + row.subject.len() + row.cause.len() + row.body.len());
        let mut others = vec![row.clone(); 6];
        others[0].seq ^= 1;
        others[1].term ^= 1;
        others[2].utc = row.utc + Span::micros(1);
        others[3].boot = Mono::from_nanos(!seq);
        others[4].kind ^= 0x100;
        others[5].version ^= 1;
        // A letter that moves from one field to the next.
        let mut moving = row.clone();
        if moved {
            moving.cause.insert(0, 'x');
        } else {
            moving.subject.push('x');
        }
        let mut moved_on = row.clone();
        if moved {
            moved_on.subject.push('x');
        } else {
            moved_on.body.insert(0, b'x');
        }
        others.extend([moving, moved_on]);
        let all: BTreeSet<Vec<u8>> = others.iter().map(canonical_bytes).chain([bytes]).collect();
        prop_assert_eq!(all.len(), 9);
    }
}
