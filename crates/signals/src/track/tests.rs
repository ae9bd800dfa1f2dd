//! Each way in which a reading can be wrong, and that none of them is ever taken for good.

use model::{AdapterId, SignalId};
use proptest::prelude::*;

use super::*;
use crate::Validator;

fn level() -> Signal {
    Signal {
        id: SignalId(0),
        name: "level".to_owned(),
        adapter: AdapterId(0),
        point: "level".to_owned(),
        unit: "m".to_owned(),
        value_min: 0.0,
        value_max: 10.0,
        rate_max_per_s: Some(0.01),
        age_max: Span::seconds(60),
        frozen_after: Some(Span::minutes(30)),
    }
}

fn at(s: i64) -> Utc {
    Utc::EPOCH + Span::seconds(s)
}

fn reading(s: i64, value: f64) -> Reading {
    Reading { signal: SignalId(0), value, source_good: true, at: at(s) }
}

/// Each reading taken in at the moment that it was true.
fn fed(list: &[(i64, f64)]) -> Validator {
    let mut v = Validator::for_signals(vec![level()]);
    list.iter().for_each(|(s, value)| v.take(&reading(*s, *value), at(*s)));
    v
}

fn quality(v: &Validator, s: i64) -> Quality {
    v.state(SignalId(0), at(s)).quality
}

fn good(v: &Validator, s: i64) -> Option<f64> {
    v.state(SignalId(0), at(s)).now()
}

#[test]
fn what_was_never_read_is_missing() {
    assert_eq!(fed(&[]).state(SignalId(0), at(0)), Validated::NEVER);
    assert_eq!(fed(&[(0, 5.0)]).state(SignalId(1), at(0)), Validated::NEVER);
}

#[test]
fn what_is_no_number_is_named_so_and_the_last_good_value_stays_with_its_age() {
    for value in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        let v = fed(&[(0, 5.0), (10, value)]);
        let state = v.state(SignalId(0), at(20));
        assert_eq!(state.quality, Quality::NotANumber);
        let kept = GoodValue { value: 5.0, at: at(0), age: Span::seconds(20) };
        assert_eq!(state.good, Some(kept));
        assert_eq!((state.now(), state.within(Span::hours(1))), (None, None));
    }
}

#[test]
fn the_ends_of_the_range_are_in_it() {
    assert_eq!(good(&fed(&[(0, 0.0)]), 0), Some(0.0));
    assert_eq!(good(&fed(&[(0, 10.0)]), 0), Some(10.0));
    assert_eq!(quality(&fed(&[(0, 10.0_f64.next_up())]), 0), Quality::OutOfRange);
    assert_eq!(quality(&fed(&[(0, -0.001)]), 0), Quality::OutOfRange);
    assert_eq!(good(&fed(&[(0, 5.0), (10, 11.0), (20, 5.1)]), 20), Some(5.1));
}

#[test]
fn a_reading_grows_old() {
    let v = fed(&[(0, 5.0)]);
    assert_eq!(quality(&v, 60), Quality::Good);
    assert_eq!(quality(&v, 61), Quality::Stale);
    assert_eq!(v.state(SignalId(0), at(61)).within(Span::seconds(61)), Some(5.0));
}

#[test]
fn a_source_that_says_bad_is_believed_even_with_an_old_stamp() {
    let bad = |s| Reading { source_good: false, ..reading(s, 5.0) };
    for stamp in [10, 20, 30] {
        let mut v = fed(&[(20, 5.0)]);
        v.take(&bad(stamp), at(30));
        assert_eq!(quality(&v, 30), Quality::BadAtSource, "stamp {stamp}");
        // A sound one from before the last does not end it; the next sound reading does.
        v.take(&reading(15, 5.0), at(31));
        assert_eq!(quality(&v, 31), Quality::BadAtSource, "stamp {stamp}");
        v.take(&reading(40, 5.1), at(40));
        assert_eq!(good(&v, 40), Some(5.1));
    }
}

#[test]
fn a_reading_from_the_future_is_not_taken_in_and_blocks_none_that_follow() {
    let mut v = fed(&[(0, 5.0)]);
    v.take(&reading(15, 5.0), at(10));
    assert_eq!(good(&v, 10), Some(5.0), "five seconds ahead are forgiven");
    v.take(&reading(26, 6.0), at(20));
    assert_eq!(quality(&v, 20), Quality::FromTheFuture);
    v.take(&reading(25, 5.1), at(25));
    assert_eq!(good(&v, 25), Some(5.1));
    // Wrong in itself and from the future too: it blocks none either.
    v.take(&Reading { source_good: false, ..reading(4000, 5.0) }, at(26));
    assert_eq!(quality(&v, 26), Quality::BadAtSource);
    v.take(&reading(30, 5.12), at(30));
    assert_eq!(good(&v, 30), Some(5.12));
}

#[test]
fn an_older_or_repeated_reading_changes_nothing() {
    let once = fed(&[(20, 5.0)]);
    for late in [(10, 5.05), (20, 5.1), (19, 99.0)] {
        let mut v = once.clone();
        v.take(&reading(late.0, late.1), at(21));
        assert_eq!(v, once);
    }
}

#[test]
fn a_value_that_never_moves_is_frozen_and_one_that_moves_a_little_is_not() {
    let flat = |n: i64| (0..=n).map(|n| (n * 30, 5.0)).collect::<Vec<_>>();
    assert_eq!(quality(&fed(&flat(59)), 59 * 30), Quality::Good);
    assert_eq!(quality(&fed(&flat(60)), 60 * 30), Quality::Frozen);
    let alive: Vec<_> = (0..62).map(|n| (n * 30, 5.0 + 1e-6 * n as f64)).collect();
    assert_eq!(quality(&fed(&alive), 61 * 30), Quality::Good);
    // It moves: it is well again. Zero is zero with either sign.
    let mut v = fed(&flat(60));
    v.take(&reading(61 * 30, 5.01), at(61 * 30));
    assert_eq!(good(&v, 61 * 30), Some(5.01));
    let zeros: Vec<_> = (0..62).map(|n| (n * 30, if n % 2 == 0 { 0.0 } else { -0.0 })).collect();
    assert_eq!(quality(&fed(&zeros), 61 * 30), Quality::Frozen);
    let healthy = Signal { frozen_after: None, ..level() };
    let mut v = Validator::for_signals(vec![healthy]);
    flat(600).iter().for_each(|(s, value)| v.take(&reading(*s, *value), at(*s)));
    assert_eq!(good(&v, 600 * 30), Some(5.0));
}

#[test]
fn a_change_at_the_fastest_rate_is_true_and_a_faster_one_is_not() {
    assert_eq!(good(&fed(&[(0, 5.0), (100, 6.0)]), 100), Some(6.0));
    assert_eq!(quality(&fed(&[(0, 5.0), (100, 6.001)]), 100), Quality::TooFast);
    assert_eq!(quality(&fed(&[(0, 5.0), (100, 3.999)]), 100), Quality::TooFast);
}

#[test]
fn a_spike_is_held_back_and_a_step_that_stands_is_believed() {
    let spike = fed(&[(0, 5.0), (10, 7.0)]);
    assert_eq!(quality(&spike, 10), Quality::TooFast);
    assert_eq!(spike.state(SignalId(0), at(10)).good.map(|g| g.value), Some(5.0));
    assert_eq!(good(&fed(&[(0, 5.0), (10, 7.0), (20, 5.05)]), 20), Some(5.05));
    assert_eq!(quality(&fed(&[(0, 5.0), (10, 7.0), (20, 7.01)]), 20), Quality::TooFast);
    assert_eq!(good(&fed(&[(0, 5.0), (10, 7.0), (20, 7.01), (30, 7.02)]), 30), Some(7.02));
}

#[test]
fn readings_that_jump_about_or_are_broken_into_make_no_step() {
    let about = fed(&[(0, 5.0), (10, 7.0), (20, 9.0), (30, 7.0), (40, 9.0), (50, 7.0)]);
    assert_eq!(quality(&about, 50), Quality::TooFast);
    let broken = [(0, 5.0), (10, 7.0), (20, 7.0), (25, f64::NAN), (30, 7.0), (40, 7.0)];
    assert_eq!(quality(&fed(&broken), 40), Quality::TooFast);
    let broken = [(0, 5.0), (10, 7.0), (20, 7.0), (25, 11.0), (30, 7.0), (40, 7.0), (50, 7.0)];
    assert_eq!(quality(&fed(&broken[..6]), 40), Quality::TooFast);
    assert_eq!(good(&fed(&broken), 50), Some(7.0));
}

/// With our clock put back an hour, a value stayed good for that hour, though no reading got in.
#[test]
fn regress_a_clock_that_goes_back_leaves_no_old_value_good() {
    let mut v = fed(&[(3600, 5.0)]);
    assert_eq!(quality(&v, 0), Quality::FromTheFuture);
    v.take(&reading(10, 9.0), at(10));
    assert_eq!(good(&v, 10), Some(9.0));
    v.take(&reading(20, 9.05), at(20));
    assert_eq!(good(&v, 20), Some(9.05));
}

#[test]
fn all_signals_come_in_the_order_of_their_ids_into_a_list_that_is_used_again() {
    let second = Signal { id: SignalId(1), ..level() };
    let mut v = Validator::for_signals(vec![level(), second]);
    v.take(&Reading { signal: SignalId(1), ..reading(0, 3.0) }, at(0));
    v.take(&Reading { signal: SignalId(7), ..reading(0, 3.0) }, at(0));
    let mut list = vec![Validated::NEVER; 9];
    v.all_into(at(0), &mut list);
    assert_eq!(list.iter().map(Validated::now).collect::<Vec<_>>(), [None, Some(3.0)]);
    assert_eq!(v.all(at(0)), list);
}

fn any_value() -> impl Strategy<Value = f64> {
    prop_oneof![
        4 => -5.0..15.0_f64,
        1 => Just(f64::NAN),
        1 => Just(f64::NEG_INFINITY),
        1 => any::<f64>(),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    /// Whatever comes, with whatever stamp and at whatever time, clocks going back included: what
    /// is kept is a number in range that a source called good, and it is good only while young.
    #[test]
    fn prop_nothing_but_a_sound_and_young_number_is_ever_good(
        list in prop::collection::vec(
            (-50..4000_i64, any_value(), any::<bool>(), -20..4000_i64), 0..60),
        ask in -100..5000_i64,
    ) {
        let mut v = Validator::for_signals(vec![level()]);
        for (stamp, value, source_good, now) in &list {
            v.take(&Reading { source_good: *source_good, ..reading(*stamp, *value) }, at(*now));
            let state = v.state(SignalId(0), at(ask));
            if let Some(g) = state.good {
                prop_assert!((0.0..=10.0).contains(&g.value));
                prop_assert_eq!(g.age, at(ask) - g.at);
                let came = list.iter().any(|(stamp, value, source_good, _)| {
                    *source_good && *value == g.value && at(*stamp) == g.at
                });
                prop_assert!(came, "a value that nobody sent");
            }
            if state.now().is_some() {
                let age = state.good.unwrap().age;
                prop_assert!(age <= Span::seconds(60) && age >= Span::seconds(-5));
            }
        }
    }

    /// Whatever came before, three sound readings in a row at one level make the signal good.
    #[test]
    fn prop_three_sound_readings_always_mend_a_signal(
        list in prop::collection::vec(
            (-50..4000_i64, any_value(), any::<bool>(), -20..4000_i64), 0..40),
        value in 0.0..10.0_f64,
    ) {
        let mut v = Validator::for_signals(vec![level()]);
        for (stamp, value, source_good, now) in list {
            v.take(&Reading { source_good, ..reading(stamp, value) }, at(now));
        }
        let sound = [5000, 5010, 5020];
        sound.iter().for_each(|s| v.take(&reading(*s, value), at(*s)));
        prop_assert_eq!(good(&v, 5020), Some(value));
    }
}
