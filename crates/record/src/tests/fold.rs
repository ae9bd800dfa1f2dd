//! The rules of the fold, one by one as its module names them.

use engine::{Act, ActKind, Entry, Mode, OpenIntent, Outcome};
use interlock::Action;
use model::{AssetId, PlanId, RestAction, Term};
use units::{CubicMetres, Mono, Percent, Span, Utc, Window};

use super::{GATE, PUMP, Rows, at, strange};
use crate::{Fold, RELEASED_KEPT, encode_note, fold};

fn act(kind: ActKind) -> Entry {
    let by = "A. Reeve".to_owned();
    Entry::Act {
        act: Act { by, reason: "test".to_owned(), peer: "uid 1".to_owned(), kind },
        refused: None,
    }
}

fn refused(kind: ActKind) -> Entry {
    let Entry::Act { act, .. } = act(kind) else { unreachable!() };
    Entry::Act { act, refused: Some("not now".to_owned()) }
}

fn latched(asset: Option<AssetId>, cause: &str) -> Entry {
    Entry::Latched { asset, cause: cause.to_owned() }
}

fn intent(asset: AssetId, command: u64, action: Action) -> Entry {
    let lease_end = Mono::from_nanos(9);
    Entry::Intent { asset, action, command, lease_end, state_seq: 1, readings: 2 }
}

fn outcome(asset: AssetId, command: u64, outcome: Outcome) -> Entry {
    Entry::Outcome { asset, command, outcome }
}

fn confirmed(asset: AssetId, command: u64) -> Entry {
    Entry::Confirmed { asset, command, position: 1.0 }
}

const OPEN: Action = Action::Open(Percent::of(40.0));

/// The commands that stay open, by number, after these entries.
fn open_after(entries: &[Entry]) -> Vec<u64> {
    let mut rows = Rows::new();
    for entry in entries {
        rows.push(entry.clone());
    }
    rows.folded().open_intents.iter().map(|o| o.command).collect()
}

#[test]
fn nothing_hands_over_nothing() {
    assert_eq!(Rows::new().folded(), engine::Carried::default());
}

#[test]
fn mode_is_that_of_the_last_start_change_or_reset_of_the_site() {
    let mut rows = Rows::new();
    rows.started("a", Mode::Observe);
    assert_eq!(rows.folded().mode, Some(Mode::Observe));
    rows.push(Entry::ModeChanged { mode: Mode::Automatic, why: String::new() });
    assert_eq!(rows.folded().mode, Some(Mode::Automatic));
    rows.push(Entry::Reset { asset: Some(GATE) });
    assert_eq!(rows.folded().mode, Some(Mode::Automatic), "a trip's reset leaves it");
    rows.push(Entry::Reset { asset: None });
    assert_eq!(rows.folded().mode, Some(Mode::Observe));
    // The act alone is not yet the change.
    rows.push(act(ActKind::Mode(Mode::Advise)));
    assert_eq!(rows.folded().mode, Some(Mode::Observe));
}

#[test]
fn authorisation_is_the_last_accepted_with_the_digests_of_its_run() {
    let mut rows = Rows::new();
    rows.started("a", Mode::Observe);
    rows.push(act(ActKind::Authorise { until: at(50) }));
    rows.push(refused(ActKind::Authorise { until: at(90) }));
    rows.term = 2;
    rows.started("b", Mode::Observe);
    let carried = rows.folded();
    let given = carried.authorisation.clone().unwrap();
    assert_eq!(
        (given.by.as_str(), given.reason.as_str(), given.until),
        ("A. Reeve", "test", at(50))
    );
    let digests = (given.build.as_str(), given.site_digest.as_str(), given.licence_digest.as_str());
    assert_eq!(digests, ("a", "5e", "1c"));
    // Those of the last start stand beside it.
    assert_eq!((carried.build.as_str(), carried.term), ("b", Some(Term(2))));
    rows.push(act(ActKind::Mode(Mode::Automatic)));
    assert!(rows.folded().authorisation.is_some());
    rows.push(refused(ActKind::Mode(Mode::Observe)));
    assert!(rows.folded().authorisation.is_some());
    rows.push(act(ActKind::Mode(Mode::Observe)));
    assert_eq!(rows.folded().authorisation, None);
}

#[test]
fn authorisation_ends_with_its_time() {
    let mut rows = Rows::new();
    rows.push(act(ActKind::Authorise { until: at(2) }));
    rows.push(Entry::AdapterUp { adapter: "plant-bus".to_owned() });
    assert_eq!(rows.rows[1].utc, at(1));
    assert!(rows.folded().authorisation.is_some());
    rows.push(Entry::AdapterUp { adapter: "plant-bus".to_owned() });
    assert_eq!(rows.folded().authorisation, None, "at its end it is over");
}

#[test]
fn latches_keep_the_last_cause_until_the_same_is_reset() {
    let mut rows = Rows::new();
    rows.push(latched(Some(GATE), "jam")).push(latched(Some(GATE), "jam again"));
    rows.push(latched(None, "clock")).push(latched(Some(PUMP), "dry"));
    let found = |rows: &Rows| rows.folded().latches;
    let all = [
        (None, "clock".to_owned()),
        (Some(GATE), "jam again".to_owned()),
        (Some(PUMP), "dry".to_owned()),
    ];
    assert_eq!(found(&rows), all);
    rows.push(Entry::Reset { asset: Some(GATE) });
    assert_eq!(found(&rows), [all[0].clone(), all[2].clone()]);
    rows.push(Entry::Reset { asset: None });
    assert_eq!(found(&rows), [all[2].clone()]);
}

#[test]
fn locks_are_set_and_cleared_by_accepted_acts() {
    let lock = |locked| act(ActKind::OutOfService { asset: PUMP, locked });
    let mut rows = Rows::new();
    rows.push(refused(ActKind::OutOfService { asset: GATE, locked: true }));
    assert_eq!(rows.folded().locks, []);
    rows.push(lock(true));
    assert_eq!(rows.folded().locks, [(PUMP, "A. Reeve".to_owned())]);
    rows.push(refused(ActKind::OutOfService { asset: PUMP, locked: false }));
    assert_eq!(rows.folded().locks.len(), 1);
    rows.push(lock(false));
    assert_eq!(rows.folded().locks, []);
}

#[test]
fn holds_last_until_their_time_or_until_given_back() {
    let hold = |asset, until| act(ActKind::Hold { asset, until });
    let mut rows = Rows::new();
    rows.push(hold(GATE, at(3))).push(hold(PUMP, at(9)));
    rows.push(refused(ActKind::Hold { asset: GATE, until: at(30) }));
    assert_eq!(rows.folded().holds, [(GATE, at(3)), (PUMP, at(9))]);
    rows.push(refused(ActKind::Auto { asset: PUMP }));
    assert_eq!(rows.folded().holds, [(PUMP, at(9))], "three hours have passed");
    rows.push(act(ActKind::Auto { asset: PUMP }));
    assert_eq!(rows.folded().holds, []);
}

#[test]
fn a_rest_holds_for_an_hour() {
    let mut rows = Rows::new();
    rows.push(act(ActKind::Rest { asset: Some(GATE) }));
    assert_eq!(rows.folded().holds, [(GATE, at(1))]);
    rows.later(Span::hours(1));
    assert_eq!(rows.folded().holds, []);
}

#[test]
fn a_rest_of_all_holds_every_asset_but_those_given_back() {
    let mut rows = Rows::new();
    rows.push(act(ActKind::Hold { asset: GATE, until: at(90) }));
    rows.push(act(ActKind::Rest { asset: None }));
    let ids: Vec<AssetId> = rows.site.assets.iter().map(|a| a.id).collect();
    let all: Vec<(AssetId, Utc)> = ids.iter().map(|a| (*a, at(2))).collect();
    assert_eq!(rows.folded().holds, all, "it stands in the place of the hold before");
    rows.utc = at(1) + Span::minutes(1);
    rows.push(act(ActKind::Auto { asset: PUMP }));
    rows.utc = at(1) + Span::minutes(2);
    rows.push(act(ActKind::Hold { asset: GATE, until: at(1) + Span::minutes(3) }));
    rows.later(Span::minutes(5));
    // The gate's own, later hold is over; the pump was given back.
    let left: Vec<(AssetId, Utc)> =
        all.into_iter().filter(|(a, _)| *a != PUMP && *a != GATE).collect();
    assert_eq!(rows.folded().holds, left);
}

fn released(from: Utc, m3: f64) -> Entry {
    let bucket = Window::new(from, from + Span::minutes(5)).unwrap();
    Entry::Released { tide: 7, bucket, volume: CubicMetres::of(m3), estimated: false }
}

#[test]
fn released_buckets_count_for_62_days() {
    let mut rows = Rows::new();
    rows.push(released(at(0), 10.0)).push(released(at(1), 20.0));
    let whole = rows.folded().released;
    assert_eq!(whole.iter().map(|r| (r.1.get(), r.2)).collect::<Vec<_>>(), [(10.0, 7), (20.0, 7)]);
    rows.utc = at(0) + Span::minutes(5) + RELEASED_KEPT;
    rows.push(released(at(2), 30.0));
    let left: Vec<f64> = rows.folded().released.iter().map(|r| r.1.get()).collect();
    assert_eq!(left, [20.0, 30.0], "the first ended 62 days ago to the microsecond");
}

#[test]
fn an_intent_is_open_until_rest_shut_or_stop() {
    let rest = Entry::Rest { asset: GATE, action: RestAction::Close, cause: String::new() };
    let stopping = Entry::Stopping { why: String::new() };
    let open = intent(GATE, 1, OPEN);
    assert_eq!(open_after(core::slice::from_ref(&open)), [1]);
    assert_eq!(open_after(&[open.clone(), outcome(GATE, 1, Outcome::Accepted)]), [1]);
    assert_eq!(open_after(&[open.clone(), confirmed(GATE, 1)]), [1], "it stands open");
    assert_eq!(open_after(&[open.clone(), rest.clone()]), [] as [u64; 0]);
    assert_eq!(open_after(&[open.clone(), stopping]), [] as [u64; 0]);
    let shut = intent(GATE, 2, Action::Shut);
    assert_eq!(open_after(&[open.clone(), shut.clone()]), [1], "it may not have come through");
    assert_eq!(open_after(&[open.clone(), shut.clone(), confirmed(GATE, 2)]), [] as [u64; 0]);
    // A rest of one asset is none of another.
    assert_eq!(open_after(&[intent(PUMP, 3, Action::Run), open, rest]), [3]);
}

#[test]
fn an_intent_that_was_refused_never_counted() {
    let why = || "no".to_owned();
    let (first, second) = (intent(GATE, 1, OPEN), intent(GATE, 2, Action::Open(Percent::FULL)));
    let both = [first, second];
    assert_eq!(open_after(&both), [2]);
    let with = |last: Outcome| [both[0].clone(), both[1].clone(), outcome(GATE, 2, last)];
    assert_eq!(open_after(&with(Outcome::Refused(why()))), [1], "what stood before it does");
    assert_eq!(open_after(&with(Outcome::Unknown(why()))), [2], "it may be under way");
    assert_eq!(open_after(&with(Outcome::Accepted)), [2]);
}

#[test]
fn an_open_intent_says_what_and_when() {
    let mut rows = Rows::new();
    rows.push(intent(GATE, 1, OPEN));
    let expected = OpenIntent { asset: GATE, command: 1, action: OPEN, at: at(0) };
    assert_eq!(rows.folded().open_intents, [expected]);
}

#[test]
fn starts_are_intents_to_run_within_a_day() {
    let mut rows = Rows::new();
    rows.push(intent(PUMP, 1, Action::Run)).push(intent(PUMP, 2, Action::Run));
    rows.push(intent(PUMP, 3, Action::Stop)).push(intent(GATE, 4, OPEN));
    assert_eq!(rows.folded().starts, [(PUMP, at(0)), (PUMP, at(1))]);
    rows.utc = at(24);
    rows.push(intent(PUMP, 5, Action::Run));
    assert_eq!(rows.folded().starts, [(PUMP, at(1)), (PUMP, at(24))]);
}

#[test]
fn the_greatest_plan_and_the_last_row_count() {
    let plan = |n| Entry::PlanAdopted {
        plan: PlanId(n),
        parent: None,
        request_digest: 1,
        forecast_digest: 2,
        released: CubicMetres::ZERO,
        spill: CubicMetres::ZERO,
    };
    let mut rows = Rows::new();
    rows.push(plan(9));
    rows.term = 4;
    rows.push(plan(3));
    let carried = rows.folded();
    assert_eq!(carried.last_plan, Some(PlanId(9)));
    assert_eq!((carried.term, carried.last_seen), (Some(Term(4)), Some(at(1))));
}

#[test]
fn a_row_that_does_not_read_is_a_safe_latch_until_a_person_has_looked() {
    let mut rows = Rows::new();
    rows.push(latched(None, "clock"));
    rows.push_draft(strange()).push_draft(strange());
    let latches = rows.folded().latches;
    let words = "clock; row 2 of the record cannot be read: kind 930 in form 1 is not known to this \
                 version";
    assert_eq!(latches, [(None, words.to_owned())], "the first one is named");
    rows.push(Entry::Reset { asset: None });
    assert_eq!(rows.folded().latches, []);
    rows.push_draft(strange());
    assert!(rows.folded().latches[0].1.contains("row 5"));
}

#[test]
fn what_names_an_asset_that_is_gone_is_a_safe_latch() {
    let mut rows = Rows::new();
    rows.push(latched(Some(PUMP), "dry"));
    rows.push(act(ActKind::OutOfService { asset: PUMP, locked: true }));
    rows.push(intent(PUMP, 1, Action::Run));
    rows.push(act(ActKind::Hold { asset: PUMP, until: at(90) }));
    let mut without = rows.site.clone();
    "pump-new".clone_into(&mut without.assets[PUMP.index()].name);
    let carried = fold(rows.rows.iter().cloned(), &without);
    let [(None, words)] = carried.latches.as_slice() else { panic!("{carried:?}") };
    for what in ["a trip on pump-1", "a lock of A. Reeve on pump-1", "an open command on pump-1"] {
        assert!(words.contains(what), "{what}: {words}");
    }
    assert!(carried.locks.is_empty() && carried.open_intents.is_empty());
    // Holds and starts of what is gone are of no consequence.
    assert!(carried.holds.is_empty() && carried.starts.is_empty());
    rows.push(Entry::Reset { asset: None });
    assert_eq!(fold(rows.rows.into_iter(), &without).latches, []);
}

#[test]
fn the_ids_handed_over_are_those_of_the_site_file_as_it_is_now() {
    let mut rows = Rows::new();
    rows.push(latched(Some(PUMP), "dry"));
    let mut turned = rows.site.clone();
    turned.assets.swap(0, 1);
    turned.assets[0].id = AssetId(0);
    turned.assets[1].id = AssetId(1);
    let latches = fold(rows.rows.into_iter(), &turned).latches;
    assert_eq!(latches, [(Some(AssetId(0)), "dry".to_owned())]);
}

#[test]
fn notes_have_no_consequence_even_garbled_ones() {
    let mut rows = Rows::new();
    rows.started("a", Mode::Observe);
    let before = rows.folded();
    let mut note = encode_note(&crate::Note::Migrated { from: 1, to: 2 });
    rows.push_draft(note.clone());
    note.body.pop();
    rows.push_draft(note);
    let after = rows.folded();
    assert_eq!(after, engine::Carried { last_seen: Some(at(2)), ..before });
}

#[test]
fn decisions_and_the_like_have_no_consequence_even_garbled_ones() {
    let mut rows = Rows::new();
    for kind in [4, 5, 7, 12, 16, 17, 18, 19] {
        rows.push_draft(crate::Draft { kind, ..strange() });
    }
    let carried = rows.folded();
    let last_seen = carried.last_seen;
    let term = Some(Term(1));
    assert_eq!(carried, engine::Carried { term, last_seen, ..engine::Carried::default() });
}

/// Buckets that the fold itself still keeps, whatever it would hand over.
fn kept(rows: &Rows) -> usize {
    let mut fold = Fold::new(&rows.site);
    rows.rows.iter().for_each(|row| fold.push(row));
    fold.carried.released.len()
}

#[test]
fn what_has_ended_is_dropped_on_the_way() {
    let mut rows = Rows::new();
    rows.push(released(at(0), 10.0));
    rows.push(intent(PUMP, 1, Action::Run));
    rows.push(act(ActKind::Hold { asset: GATE, until: at(3) }));
    for _ in 0..62 {
        rows.later(Span::days(1));
    }
    assert_eq!((kept(&rows), rows.folded().released.len()), (1, 0), "a day more than it counts");
    rows.later(Span::days(1));
    assert_eq!(kept(&rows), 0);
    let mut fold = Fold::new(&rows.site);
    rows.rows.iter().for_each(|row| fold.push(row));
    assert!(fold.carried.starts.is_empty() && fold.holds.is_empty());
}

#[test]
fn a_clock_that_jumps_ahead_and_back_loses_no_bucket() {
    let mut rows = Rows::new();
    rows.push(released(at(0), 10.0));
    let right = rows.utc;
    // For ten days the clock is a hundred years ahead.
    rows.later(Span::days(36_500));
    for _ in 0..10 {
        rows.later(Span::days(1));
    }
    assert_eq!(rows.folded().released, [], "by that clock it is long over");
    rows.utc = right + Span::days(10);
    rows.push(released(right + Span::days(10), 20.0));
    assert_eq!(rows.folded().released.len(), 2, "by the right one it still counts");
}

#[test]
fn after_a_long_outage_buckets_are_kept_until_the_clock_has_gone_on_for_62_days() {
    let mut rows = Rows::new();
    rows.push(released(at(0), 10.0));
    rows.later(Span::days(70));
    for _ in 0..61 {
        rows.later(Span::days(1));
    }
    assert_eq!((kept(&rows), rows.folded().released.len()), (1, 0));
    rows.later(Span::days(1));
    rows.later(Span::days(1));
    assert_eq!(kept(&rows), 0);
}
