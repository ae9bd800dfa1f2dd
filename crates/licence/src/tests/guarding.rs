//! The guard at the moment of action, on the whole of Tarrow's permit.

use super::*;
use crate::fixture::{METER, tarrow};

/// Signals in their order: ammonia, sampler, current meter.
fn signals(ammonia: f64, sampler: f64, meter: Option<f64>, now: Utc) -> [Validated; 3] {
    let good = |value: f64| Validated {
        quality: Quality::Good,
        good: Some(GoodValue { value, at: now, age: Span::ZERO }),
    };
    [good(ammonia), good(sampler), meter.map_or(Validated::NEVER, good)]
}

struct Case {
    site: Site,
    forecast: Option<Forecast>,
    lawful: Option<Lawful>,
    tallies: Tallies,
    signals: Vec<Validated>,
    now: Utc,
}

/// Five in the morning, in the middle of tide 0's window, everything well.
fn well() -> Case {
    let (site, f) = (tarrow(), forecast(&[6.0, 2.0, 6.0]));
    let now = t(5.0);
    Case {
        lawful: Some(lawful(&site, &f, GATE)),
        site,
        forecast: Some(f),
        tallies: Tallies::default(),
        signals: signals(2.0, 1.0, None, now).to_vec(),
        now,
    }
}

impl Case {
    fn guard(&self, phase: Phase) -> Guarded {
        let conditions = Conditions {
            now: self.now,
            signals: &self.signals,
            forecast: self.forecast.as_ref(),
            lawful: self.lawful.as_ref(),
            tallies: &self.tallies,
            recent_flow: &[],
        };
        guard(&self.site, &conditions, GATE, phase)
    }
    fn holds(&self) -> Vec<String> {
        numbers(&self.site, &self.guard(Phase::Starting).causes)
    }
    fn on_stale(&mut self, clause: usize, on_stale: OnStale) {
        self.site.licence.clauses[clause].governs[0].on_stale = on_stale;
    }
    fn gone(&mut self, at_h: f64, volume: f64, tide: i64) {
        self.tallies.add(bucket(t(at_h)), CubicMetres::of(volume), tide);
    }
}

#[test]
fn with_everything_well_there_are_caps_and_no_hold() {
    let g = well().guard(Phase::Starting);
    assert_eq!(g.causes, []);
    assert_eq!(g.flow_max.map(|c| (c.max.get(), c.clause.0)), Some((1.2, 2)));
    assert_eq!(g.ramp_max_per_min.map(|c| (c.max.get(), c.clause.0)), Some((0.1, 2)));
    assert_eq!(g.volume_left.map(|c| (c.max.get(), c.clause.0)), Some((9000.0, 3)));
}

#[test]
fn a_sampler_must_be_ready_to_begin_and_may_stop_later() {
    let mut c = well();
    c.signals[1] = signals(2.0, 0.0, None, c.now)[1];
    assert_eq!(c.holds(), ["2.1"]);
    assert_eq!(c.guard(Phase::Running).causes, []);
    c.signals[1] = Validated::NEVER;
    assert_eq!(c.holds(), ["2.1"]);
    assert_eq!(c.guard(Phase::Running).causes, []);
}

#[test]
fn ammonia_counts_throughout() {
    let mut c = well();
    c.signals[0] = signals(5.1, 1.0, None, c.now)[0];
    for phase in [Phase::Starting, Phase::Running] {
        assert_eq!(numbers(&c.site, &c.guard(phase).causes), ["2.10"]);
    }
}

#[test]
fn a_good_meter_beats_the_modelled_current_both_ways() {
    let mut c = well();
    c.signals = signals(2.0, 1.0, Some(0.05), c.now).to_vec();
    let g = c.guard(Phase::Running);
    assert_eq!(numbers(&c.site, &g.causes), ["2.3"]);
    assert_eq!(g.causes[0].fact.about, About::Signal(METER));
    assert_eq!(g.causes[0].fact.is, Is::Number(0.05));
    assert_eq!(g.causes[0].fact.must_be, MustBe::AtLeast(0.1));
    // The model says landward at 03:32, which is inside the tide window.
    c.now = t(3.0) + Span::minutes(32);
    c.signals = signals(2.0, 1.0, Some(0.1), c.now).to_vec();
    assert_eq!(c.holds(), Vec::<String>::new());
    // A meter that is not good leaves the model to decide.
    c.signals[2].quality = Quality::Frozen;
    assert_eq!(c.holds(), ["2.3"]);
}

#[test]
fn without_a_forecast_the_tide_holds_and_the_current_does_what_it_says() {
    let mut c = well();
    c.forecast = None;
    assert_eq!(c.holds(), ["2.2", "2.3", "2.5"]);
    let reduced = CubicMetresPerSecond::of(0.2);
    for n in 0..8 {
        c.on_stale(n, OnStale::Reduced(reduced));
    }
    assert_eq!(c.holds(), ["2.2", "2.5"], "a predicted anchor and its tide have no substitute");
    let g = c.guard(Phase::Running);
    assert_eq!(g.flow_max, Some(Cap { max: reduced, clause: ClauseId(1) }));
    c.on_stale(1, OnStale::Allow);
    assert_eq!(c.guard(Phase::Running).flow_max.map(|c| c.max.get()), Some(1.2));
    // A good meter needs no forecast.
    c.on_stale(1, OnStale::Hold);
    c.signals = signals(2.0, 1.0, Some(0.5), c.now).to_vec();
    assert_eq!(c.holds(), ["2.2", "2.5"]);
}

#[test]
fn a_forecast_that_has_run_out_counts_as_none() {
    let mut c = well();
    c.now = t(200.0);
    c.signals = signals(2.0, 1.0, None, c.now).to_vec();
    assert_eq!(c.holds(), ["2.2", "2.3", "2.5"]);
    c.on_stale(1, OnStale::Allow);
    assert_eq!(c.holds(), ["2.2", "2.5"]);
}

#[test]
fn every_hold_is_listed_and_not_the_first() {
    let mut c = well();
    // Three minutes after high water of the nil tide, with all else wrong too.
    c.now = t(15.42) + Span::minutes(3);
    c.signals = vec![Validated::NEVER; 3];
    c.gone(15.0, 400_000.0, 1);
    assert_eq!(c.holds(), ["2.2", "2.3", "2.5", "2.6", "2.7", "2.10", "2.1"]);
}

#[test]
fn a_signal_that_the_site_does_not_deliver_is_never_read() {
    let mut c = well();
    c.signals.clear();
    assert_eq!(c.holds(), ["2.10", "2.1"]);
}

#[test]
fn a_nil_tide_holds_until_the_next_window() {
    let mut c = well();
    c.now = t(15.42 + 2.0);
    let g = c.guard(Phase::Starting);
    let nil = g.causes.iter().find(|c| c.by == By::Clause(ClauseId(3))).unwrap();
    let next = c.lawful.as_ref().unwrap().windows[1].clone();
    assert_eq!(next.tide, 2);
    assert_eq!(nil.fact.must_be, MustBe::Inside(next.window));
    c.lawful = None;
    let g = c.guard(Phase::Starting);
    let end = c.forecast.as_ref().unwrap().tides[1].window.end();
    assert_eq!(g.causes.last().unwrap().fact.must_be, MustBe::After(end));
    assert_eq!(g.volume_left, Some(Cap { max: CubicMetres::ZERO, clause: ClauseId(3) }));
}

#[test]
fn the_least_volume_left_names_its_clause() {
    let mut c = well();
    c.gone(4.0, 8000.0, 0);
    let left = |c: &Case| c.guard(Phase::Running).volume_left.map(|v| (v.max.get(), v.clause.0));
    assert_eq!(left(&c), Some((1000.0, 3)));
    c.gone(-6.0, 8000.0, -1);
    assert_eq!(left(&c), Some((500.0, 4)));
    c.gone(4.1, 500.0, 0);
    assert_eq!(c.holds(), ["2.6"]);
    c.gone(4.2, 500.5, 0);
    assert_eq!(c.holds(), ["2.5", "2.6"]);
    // Earlier in the month, but over a day ago.
    let mut month = well();
    month.now = t(12.42 * 2.0 + 5.0);
    month.signals = signals(2.0, 1.0, None, month.now).to_vec();
    month.gone(1.0, 379_900.0, -1);
    assert_eq!(left(&month), Some((100.0, 5)));
}

#[test]
fn an_old_reading_is_called_old_and_a_bad_one_bad() {
    let mut c = well();
    let age = Span::minutes(31);
    let good = Some(GoodValue { value: 2.0, at: c.now - age, age });
    let words = |c: &Case| match &c.guard(Phase::Starting).causes[..] {
        [Cause { fact: Fact { is: Is::Words(w), .. }, .. }] => w.clone(),
        other => panic!("one hold with words, not {other:?}"),
    };
    c.signals[0] = Validated { quality: Quality::Good, good };
    assert_eq!(words(&c), "0:31:00 old, over the clause's 0:30:00");
    c.signals[0].quality = Quality::BadAtSource;
    assert_eq!(words(&c), "bad at its source");
    c.signals[0] = Validated::NEVER;
    assert_eq!(words(&c), "never read");
    // Stale by the signal's own limit, but young enough for the clause.
    let good = good.map(|g| GoodValue { age: Span::minutes(29), ..g });
    c.signals[0] = Validated { quality: Quality::Stale, good };
    assert_eq!(c.holds(), Vec::<String>::new());
}

#[test]
fn an_asset_that_no_clause_governs_is_held_by_none() {
    let c = well();
    let none = Conditions {
        now: c.now,
        signals: &[],
        forecast: None,
        lawful: None,
        tallies: &c.tallies,
        recent_flow: &[],
    };
    assert_eq!(guard(&c.site, &none, AssetId(9), Phase::Starting), Guarded::default());
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    /// Where the guard finds no window and no tide against it, a lawful window lies, and nowhere
    /// else: the two read the same clauses by different ways.
    #[test]
    fn prop_guard_and_windows_agree(
        ranges in prop::collection::vec(1.5..8.0_f64, 3..4), at_s in 0..100_000_i64,
    ) {
        let mut c = well();
        let f = forecast(&ranges);
        let l = lawful(&c.site, &f, GATE);
        c.now = t(0.0) + Span::seconds(at_s);
        c.signals = signals(2.0, 1.0, None, c.now).to_vec();
        (c.forecast, c.lawful) = (Some(f), Some(l));
        let inside = c.lawful.as_ref().unwrap().holding(c.now).is_some();
        prop_assert_eq!(c.holds().is_empty(), inside, "{:?}", c.holds());
    }
}
