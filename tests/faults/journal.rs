//! To be taken to `tests/compat`.

use units::{Mono, Span, Utc};
use world::World;

use crate::scenarios::tarrow::{at, setup, tarrow};

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
