//! `why` names facts. Changing what it names, and nothing else, turns the decision.

use std::collections::BTreeMap;

use engine::{ActKind, ClockTrust, Decision, Effects, Event, Mode, Stamp, State, decide, step};
use model::{About, AssetId, By, Cause, MustBe, Reading};
use units::{Span, Utc};
use world::World;

use super::tarrow::{act, at, setup, tarrow};

/// A state with the stamp and the readings that it stood on.
#[derive(Clone)]
struct Scene {
    state: State,
    stamp: Stamp,
    frame: Vec<Reading>,
}

impl Scene {
    fn feed(&mut self, event: Event) {
        self.stamp.seq += 1;
        step(&mut self.state, &self.stamp, event, &mut Effects::default());
    }
    /// Time goes on with fresh readings: the water outside as forecast, all else as it was, moved
    /// by a hair so that nothing looks frozen.
    fn go_to(&mut self, t: Utc) {
        // A few readings: a jump that stands is believed.
        for before in [60, 45, 30, 15, 0] {
            let then = t - Span::seconds(before);
            if then > self.stamp.utc {
                self.read_at(then);
            }
        }
    }
    fn read_at(&mut self, t: Utc) {
        self.stamp.boot = self.stamp.boot + (t - self.stamp.utc);
        self.stamp.utc = t;
        let outer = self.state.site().outlets[0].outer_signal;
        let level = self.state.forecast().and_then(|f| f.places[0].level.at(t));
        for r in &mut self.frame {
            r.at = t;
            if Some(r.signal) == outer {
                r.value = level.unwrap_or(r.value);
            }
            let freezes = self.state.site().signal(r.signal).frozen_after.is_some();
            r.value += if freezes { 1e-7 } else { 0.0 };
        }
        self.feed(Event::Frame(self.frame.clone()));
    }
    fn set(&mut self, signal: model::SignalId, value: f64) {
        for r in self.frame.iter_mut().filter(|r| r.signal == signal) {
            (r.value, r.source_good) = (value, true);
        }
        self.go_to(self.stamp.utc + Span::seconds(75));
    }
    fn decision(&self, asset: AssetId) -> Decision {
        decide(&self.state, &self.stamp, asset)
    }
}

/// Makes true what the cause says must be, and nothing else.
fn mend(scene: &mut Scene, asset: AssetId, cause: &Cause) {
    match (cause.fact.about, &cause.fact.must_be) {
        (About::Now, MustBe::Inside(w)) => scene.go_to(w.start() + Span::minutes(2)),
        (About::Now | About::LastMove(_), MustBe::After(t)) => scene.go_to(*t),
        (About::LastMove(_), MustBe::AtLeast(s)) => {
            scene.go_to(scene.stamp.utc + Span::from_seconds_f64(*s));
        }
        (About::Mode, _) => scene.feed(Event::Act(act(ActKind::Mode(Mode::Automatic)))),
        (About::Hold(_), _) => scene.feed(Event::Act(act(ActKind::Auto { asset }))),
        (About::Confirmation(_), _) => {
            scene.feed(Event::Act(act(ActKind::Confirm { asset })));
        }
        (About::Lock(_), _) => {
            scene.feed(Event::Act(act(ActKind::OutOfService { asset, locked: false })));
        }
        (About::Selector(_), _) => {
            let signal = scene.state.site().asset(asset).local.unwrap();
            scene.set(signal, 0.0);
        }
        (About::ClockTrust, _) => {
            scene.stamp.trust = ClockTrust::Trusted;
            scene.feed(Event::Wake);
        }
        (About::Journal, _) => scene.feed(Event::JournalBack),
        (About::Signal(s), MustBe::AtMost(v) | MustBe::AtLeast(v)) => scene.set(s, *v),
        (About::Signal(s), _) => {
            let spec = scene.state.site().signal(s);
            let middle = scene.frame.iter().find(|r| r.signal == s).map(|r| r.value);
            let value = middle.filter(|v| v.is_finite()).unwrap_or(spec.value_min);
            scene.set(s, value);
        }
        other => panic!("no way to mend {other:?}"),
    }
}

/// Something that keeps the penstock shut, by number.
fn disturb(scene: &mut Scene, n: usize) {
    let site = scene.state.site().clone();
    let gate = site.outlets[0].gate;
    let signal = |name: &str| site.signal_named(name).unwrap().id;
    let until = scene.stamp.utc + Span::hours(5);
    match n {
        0 => scene.feed(Event::Act(act(ActKind::Mode(Mode::Observe)))),
        1 => scene.feed(Event::Act(act(ActKind::Hold { asset: gate, until }))),
        2 => scene.feed(Event::Act(act(ActKind::OutOfService { asset: gate, locked: true }))),
        3 => scene.set(signal("ammonia"), 5.5),
        4 => scene.set(signal("analyser-check-age"), 7.5),
        5 => scene.set(signal("penstock-local"), 1.0),
        6 => scene.feed(Event::Act(act(ActKind::Mode(Mode::Advise)))),
        7 => scene.feed(Event::JournalLost { why: "test".to_owned() }),
        8 => scene.set(signal("sampler-ready"), 0.0),
        _ => {}
    }
}

/// Scenes through three days with the penstock at rest.
fn scenes() -> Vec<Scene> {
    let mut world = World::new(setup(tarrow(), at("2027-05-01T00:00:00Z"), 3));
    let mut list = Vec::new();
    let mut next = at("2027-05-01T01:00:00Z");
    while world.advance().unwrap() {
        if world.now() >= next {
            next = world.now() + Span::minutes(40);
            let (state, stamp) = world.state();
            list.push(Scene { state: state.clone(), stamp, frame: world.frame() });
        }
    }
    list
}

#[test]
fn scen_why_names_the_fact_that_turns_the_decision() {
    let mut turned: BTreeMap<String, u32> = BTreeMap::new();
    let mut single = 0;
    for (i, scene) in scenes().iter().enumerate() {
        let site = scene.state.site().clone();
        let gate = site.outlets[0].gate;
        for n in [i % 9, (i + 3) % 9, (i + 6) % 9, 9] {
            let mut s = scene.clone();
            disturb(&mut s, n);
            let before = s.decision(gate);
            if before.active() {
                // Under way already, and the disturbance bars only a start.
                continue;
            }
            assert!(!before.causes.is_empty(), "rest without a cause at {}", s.stamp.utc);
            // One fact at a time, each as the decision then names it, until nothing is left.
            let mut steps = 0;
            let mut now = before.clone();
            while let Some(cause) = now.causes.first().cloned() {
                mend(&mut s, gate, &cause);
                let after = s.decision(gate);
                let gone = !after
                    .causes
                    .iter()
                    .any(|c| (c.by, c.fact.about) == (cause.by, cause.fact.about));
                assert!(gone, "{cause:?} stands after mending: {:?}", after.causes);
                now = after;
                steps += 1;
                assert!(steps < 12, "{:?}", now.causes);
            }
            assert!(now.active(), "{:?}", now);
            if before.causes.len() == 1 && steps == 1 {
                single += 1;
            }
            let key = match before.causes[0].by {
                By::Clause(c) => format!("clause {}", site.licence.clause(c).number),
                other => format!("{other:?}"),
            };
            *turned.entry(key).or_default() += 1;
        }
    }
    let all: u32 = turned.values().sum();
    println!(
        "{all} decisions turned by the facts they name ({single} by their one fact): {turned:?}"
    );
    assert!(all >= 200, "{all}");
    assert!(single >= 60, "{single}");
}
