//! Events: there and back, and every way in which their bytes can be wrong.

use std::collections::BTreeSet;
use std::sync::LazyLock;

use engine::{Carried, ClockTrust, Event, OpenIntent, Product, Stamp, StandingAuthorisation};
use model::{AdapterId, JobId, PlanId, Reading, SignalId, Site, Term};
use proptest::collection::vec;
use proptest::option::of;
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;
use units::{CubicMetres, Mono, Span};

use super::products::{forecast, plan};
use super::{any, at};
use crate::{Fold, ProductSeen, RecordError, Recorded, decode_event, encode_event, event_kinds};

static SITE: LazyLock<Site> = LazyLock::new(super::site);

fn stamp() -> impl Strategy<Value = Stamp> {
    let small = prop_oneof![0..1_000_000_u64, any::<u64>()];
    (small.clone(), small, any::utc(), any::<u64>(), any::trust()).prop_map(
        |(seq, term, utc, boot, trust)| {
            let boot = Mono::from_nanos(boot);
            Stamp { seq, term: Term(term), utc, boot, trust }
        },
    )
}

/// Any bits at all, and what instruments say: a few decimals.
fn value() -> impl Strategy<Value = f64> {
    prop_oneof![
        any::<u64>().prop_map(f64::from_bits),
        (any::<i32>(), 0..8_u8).prop_map(|(n, d)| format!("{n}e-{d}").parse().unwrap()),
        prop::sample::select(vec![
            0.0,
            -0.0,
            1.0,
            f64::NAN,
            f64::INFINITY,
            f64::MAX,
            f64::MIN_POSITIVE,
            281_474_976_710_656.0,
            281_474_976_710_657.0,
            -9_007_199_254_740_993.0,
        ]),
    ]
}

fn readings() -> impl Strategy<Value = Vec<Reading>> {
    let count = SITE.signals.len() as u16;
    let reading = (0..count, value(), any::<bool>(), any::utc()).prop_map(
        |(signal, value, source_good, at)| Reading {
            signal: SignalId(signal),
            value,
            source_good,
            at,
        },
    );
    vec(reading, 0..30)
}

fn carried() -> impl Strategy<Value = Carried> {
    let authorisation = (vec(any::text(), 5), any::utc()).prop_map(|(mut t, until)| {
        let mut next = || t.pop().unwrap();
        StandingAuthorisation {
            by: next(),
            reason: next(),
            until,
            build: next(),
            site_digest: next(),
            licence_digest: next(),
        }
    });
    let head =
        (of(any::<u64>()), vec(any::text(), 3), of(any::mode()), of(authorisation), of(any::utc()));
    let instants = || vec((any::asset(), any::utc()), 0..5);
    let intent = (any::asset(), any::<u64>(), any::action(), any::utc())
        .prop_map(|(asset, command, action, at)| OpenIntent { asset, command, action, at });
    let released = (any::window(), any::number().prop_map(CubicMetres::of), any::<i64>());
    let lists = (
        vec((of(any::asset()), any::text()), 0..4),
        vec((any::asset(), any::text()), 0..4),
        instants(),
        vec(released, 0..9),
        vec(intent, 0..4),
        instants(),
        of(any::<u64>().prop_map(PlanId)),
    );
    (head, lists).prop_map(|(head, lists)| {
        let (term, mut texts, mode, authorisation, last_seen) = head;
        let (latches, locks, holds, released, open_intents, starts, last_plan) = lists;
        let mut next = || texts.pop().unwrap();
        Carried {
            term: term.map(Term),
            build: next(),
            site_digest: next(),
            licence_digest: next(),
            mode,
            authorisation,
            last_seen,
            latches,
            locks,
            holds,
            released,
            open_intents,
            starts,
            last_plan,
        }
    })
}

fn event() -> BoxedStrategy<Event> {
    let product = prop_oneof![
        Just(Product::Forecast(Box::new(forecast()))),
        Just(Product::Plan(Box::new(plan()))),
        any::text().prop_map(Product::Failed),
    ];
    prop_oneof![
        carried().prop_map(|c| Event::Started(Box::new(c))),
        readings().prop_map(Event::Frame),
        Just(Event::AdapterUp(AdapterId(0))),
        any::text().prop_map(|why| Event::AdapterDown { adapter: AdapterId(0), why }),
        (any::<u64>(), any::outcome())
            .prop_map(|(command, outcome)| Event::Outcome { command, outcome }),
        any::act().prop_map(Event::Act),
        (any::<u64>(), product)
            .prop_map(|(job, product)| Event::JobDone { job: JobId(job), product }),
        any::text().prop_map(|why| Event::JournalLost { why }),
        Just(Event::JournalBack),
        any::text().prop_map(|why| Event::ClockChanged { why }),
        any::text().prop_map(|why| Event::Stopping { why }),
        Just(Event::Replan),
        Just(Event::Wake),
    ]
    .boxed()
}

/// Equal to the bit: a value that is no number is equal to itself here.
fn same(a: &Recorded, b: &Recorded) -> bool {
    let (Recorded::Frame(a), Recorded::Frame(b)) = (a, b) else { return a == b };
    let bits = |r: &Reading| (r.signal, r.value.to_bits(), r.source_good, r.at);
    a.iter().map(bits).eq(b.iter().map(bits))
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, cases: 1_000, ..ProptestConfig::default() })]

    #[test]
    fn prop_an_event_reads_back_as_it_was(stamp in stamp(), event in event()) {
        let bytes = encode_event(&stamp, &event, &SITE);
        let (stamp_back, back) = decode_event(&bytes, &SITE).unwrap();
        prop_assert_eq!(stamp_back, stamp);
        prop_assert!(same(&back, &Recorded::of(&event)), "{:?}", back);
    }

    #[test]
    fn prop_an_event_cut_anywhere_or_too_long_is_refused(
        stamp in stamp(), event in event(), cut in any::<prop::sample::Index>(),
    ) {
        let mut bytes = encode_event(&stamp, &event, &SITE);
        prop_assert!(decode_event(&bytes[..cut.index(bytes.len())], &SITE).is_err());
        bytes.push(0);
        prop_assert_eq!(decode_event(&bytes, &SITE).unwrap_err(), RecordError::Long { bytes: 1 });
    }

    #[test]
    fn prop_garbled_events_are_read_or_refused(
        stamp in stamp(),
        event in event(),
        changes in vec((any::<prop::sample::Index>(), any::<u8>()), 1..4),
    ) {
        let mut bytes = encode_event(&stamp, &event, &SITE);
        for (place, byte) in changes {
            let place = place.index(bytes.len());
            bytes[place] = byte;
        }
        if let Ok((_, Recorded::Frame(readings))) = decode_event(&bytes, &SITE) {
            prop_assert!(readings.iter().all(|r| r.signal.index() < SITE.signals.len()));
        }
    }

    #[test]
    fn prop_any_bytes_are_read_or_refused(kind in any::<u8>(), bytes in vec(any::<u8>(), 0..200)) {
        let _ = decode_event(&bytes, &SITE);
        let with_head = [&[1, kind], &bytes[..]].concat();
        let _ = decode_event(&with_head, &SITE);
    }
}

#[test]
fn the_generator_makes_every_kind() {
    let mut runner = TestRunner::deterministic();
    let strategy = event();
    let made = |_| {
        let event = strategy.new_tree(&mut runner).unwrap().current();
        encode_event(&usual(), &event, &SITE)[1]
    };
    let kinds: BTreeSet<u8> = (0..1_000).map(made).collect();
    assert_eq!(kinds, event_kinds().map(|(kind, _)| kind).collect());
    let names: BTreeSet<&str> = event_kinds().map(|(_, name)| name).collect();
    assert_eq!(names.len(), kinds.len());
}

fn usual() -> Stamp {
    let boot = Mono::from_nanos(864_000_000_000_000);
    Stamp { seq: 1_000_000, term: Term(40), utc: at(0), boot, trust: ClockTrust::Trusted }
}

#[test]
fn the_list_of_kinds_is_what_is_read() {
    let known: BTreeSet<u8> = event_kinds().map(|(kind, _)| kind).collect();
    let wake = encode_event(&usual(), &Event::Wake, &SITE);
    for kind in 0..0x80 {
        let mut bytes = wake.clone();
        bytes[1] = kind;
        let unknown = match decode_event(&bytes, &SITE) {
            Err(RecordError::Bad { field: "event", why }) => why.ends_with("stands for nothing"),
            _ => false,
        };
        assert_eq!(unknown, !known.contains(&kind), "kind {kind}");
    }
}

#[test]
fn another_form_is_refused() {
    let mut bytes = encode_event(&usual(), &Event::Wake, &SITE);
    bytes[0] = 2;
    let error = decode_event(&bytes, &SITE).unwrap_err();
    assert_eq!(error.to_string(), "`form of the event` cannot be: 2 stands for nothing");
    let short = decode_event(&[], &SITE).unwrap_err();
    assert_eq!(short, RecordError::Short { field: "form of the event" });
}

#[test]
fn a_number_of_more_than_64_bits_is_refused() {
    let mut bytes = vec![1, 12];
    bytes.extend([0xff; 9]);
    bytes.push(2);
    let error = decode_event(&bytes, &SITE).unwrap_err();
    assert!(matches!(error, RecordError::Bad { field: "sequence", .. }), "{error}");
    bytes[11] = 1;
    assert_eq!(decode_event(&bytes, &SITE).unwrap_err(), RecordError::Short { field: "term" });
    bytes[11] = 0xff;
    let error = decode_event(&bytes, &SITE).unwrap_err();
    assert!(matches!(error, RecordError::Bad { field: "sequence", .. }), "{error}");
}

/// One reading of each signal, as instruments give them: three decimals, all of one instant.
fn frame() -> Vec<Reading> {
    let at = usual().utc - Span::millis(3);
    (0..14)
        .map(|n| Reading {
            signal: SignalId(n),
            value: 2.417 + f64::from(n),
            source_good: true,
            at,
        })
        .collect()
}

#[test]
fn a_frame_of_fourteen_signals_is_small() {
    let bytes = encode_event(&usual(), &Event::Frame(frame()), &SITE).len();
    let head = encode_event(&usual(), &Event::Wake, &SITE).len();
    // 14 of a byte of head and 2 or 3 of value (36 in all); 4 of check, 1 of count, 2 of time.
    assert_eq!((head, bytes), (22, 79));
}

#[test]
fn a_frame_is_not_read_with_another_sites_signals() {
    let bytes = encode_event(&usual(), &Event::Frame(frame()), &SITE);
    let mut other = SITE.clone();
    other.signals.swap(0, 1);
    let error = decode_event(&bytes, &other).unwrap_err();
    assert!(error.to_string().contains("other signals"), "{error}");
}

#[test]
fn a_signal_beyond_the_site_files_is_refused() {
    let beyond = Reading { signal: SignalId(500), ..frame()[0] };
    let bytes = encode_event(&usual(), &Event::Frame(vec![beyond]), &SITE);
    let error = decode_event(&bytes, &SITE).unwrap_err();
    assert_eq!(error.to_string(), "`signal` cannot be: the site file has no signal 500");
}

#[test]
fn names_that_the_site_file_does_not_have_are_refused() {
    let bytes = encode_event(&usual(), &Event::AdapterUp(AdapterId(0)), &SITE);
    let mut other = SITE.clone();
    "gone".clone_into(&mut other.adapters[0].name);
    let error = decode_event(&bytes, &other).unwrap_err();
    assert!(matches!(error, RecordError::NoSuchName { what: "adapter", .. }), "{error}");
}

#[test]
fn products_leave_their_digests() {
    let seen = |product| {
        let event = Event::JobDone { job: JobId(4), product };
        decode_event(&encode_event(&usual(), &event, &SITE), &SITE).unwrap().1
    };
    let Recorded::JobDone { product: ProductSeen::Plan { digest }, .. } =
        seen(Product::Plan(Box::new(plan())))
    else {
        panic!("no plan")
    };
    let mut other = plan();
    other.cost += 1e-9;
    let other = ProductSeen::of(&Product::Plan(Box::new(other)));
    assert_ne!(other, ProductSeen::Plan { digest });
}

/// The start of a term holds what the fold handed over, so that both can be compared.
#[test]
fn a_start_keeps_what_was_carried_over_in_full() {
    let mut rows = super::Rows::new();
    rows.started("a", engine::Mode::Observe);
    let mut fold = Fold::new(&SITE);
    rows.rows.iter().for_each(|r| fold.push(r));
    let carried = fold.finish();
    let event = Event::Started(Box::new(carried.clone()));
    let (_, back) = decode_event(&encode_event(&usual(), &event, &SITE), &SITE).unwrap();
    assert_eq!(back, Recorded::Started(Box::new(carried)));
}
