//! An intent against its committed row: every field that is not what the permit says is found.

use engine::Entry;
use interlock::{
    Action, Bounds, ClockTrust, GateRules, Kind, PermitLife, Raw, Rules, Scene, State, Verdict,
    Wish, judge,
};
use units::{Mono, Percent, Span};

use super::{GATE, PUMP, at, row_of, site};
use crate::{Draft, Intent, RecordError, Row, encode, kind};

const NOW: Mono = Mono::from_nanos(1_000_000_000_000);
const TERM: u64 = 3;
const COMMAND: u64 = 41;
const OPEN: Action = Action::Open(Percent::of(20.0));

/// A field, and what changes it.
type Change = (&'static str, fn(&mut Entry));

/// What the interlock gives for opening the gate in a scene where nothing stands against it.
fn intent() -> Intent {
    let kind = Kind::Gate(GateRules {
        port_centre_m: -3.6,
        density_excess: 0.02,
        assist_grace: Span::seconds(60),
    });
    let lease = Span::seconds(120);
    let move_rest = Span::seconds(30);
    let rules =
        Rules { site: 1, asset: GATE.0, kind, lease, permit_life: PermitLife::REAL, move_rest };
    let bounds = Bounds { min: -20.0, max: 200.0, age_max: Span::seconds(60), frozen_after: None };
    let raw = |value| Some(Raw { value, age: Span::seconds(1), unchanged_for: Span::ZERO, bounds });
    let state = State {
        active: false,
        locked_out: false,
        latched: false,
        since_move: None,
        since_stop: None,
        starts_last_hour: 0,
        pump_runs: false,
        assisted_for: None,
    };
    let scene = Scene {
        clock: ClockTrust::Trusted,
        state,
        position: raw(0.0),
        selector: None,
        inner: [Some(raw(5.0)), None],
        outer: Some(raw(1.0)),
        way: None,
    };
    let (anchored_on_time, state_seq) = (true, 77);
    let wish = Wish { action: OPEN, anchored_on_time, command: COMMAND, term: TERM, state_seq };
    match judge(&rules, &scene, &wish, NOW) {
        Verdict::Permit(permit) => Intent::new(permit, &site()),
        other => panic!("{other:?}"),
    }
}

fn row(draft: &Draft) -> Row {
    row_of(draft.clone(), 9, TERM, at(0))
}

/// The engine's own entry for the same command.
fn entry(intent: &Intent) -> Entry {
    let p = intent.permit();
    Entry::Intent {
        asset: GATE,
        action: p.action(),
        command: p.command(),
        lease_end: p.lease_end(),
        state_seq: p.state_seq(),
        readings: p.readings(),
    }
}

#[test]
fn the_draft_is_what_the_engines_entry_gives() {
    let intent = intent();
    assert_eq!(intent.draft(), &encode(&entry(&intent), &site()));
    intent.agrees(&row(intent.draft())).unwrap();
    assert_eq!(intent.into_permit().command(), COMMAND);
}

#[test]
fn a_row_that_says_something_else_is_found_by_its_field() {
    let intent = intent();
    let found = |row: &Row| match intent.agrees(row).unwrap_err() {
        RecordError::Mismatch { field, .. } => field,
        other => panic!("{other}"),
    };
    let with = |change: fn(&mut Entry)| {
        let mut entry = entry(&intent);
        change(&mut entry);
        row(&encode(&entry, &site()))
    };
    let changes: [Change; 5] = [
        ("action", |e| {
            if let Entry::Intent { action, .. } = e {
                *action = Action::Shut
            }
        }),
        ("command", |e| {
            if let Entry::Intent { command, .. } = e {
                *command += 1
            }
        }),
        ("state sequence", |e| {
            if let Entry::Intent { state_seq, .. } = e {
                *state_seq += 1
            }
        }),
        ("readings", |e| {
            if let Entry::Intent { readings, .. } = e {
                *readings ^= 1
            }
        }),
        ("lease end", |e| {
            if let Entry::Intent { lease_end, .. } = e {
                *lease_end = NOW
            }
        }),
    ];
    for (field, change) in changes {
        assert_eq!(found(&with(change)), field);
    }
    let mut other = with(|e| {
        if let Entry::Intent { asset, .. } = e {
            *asset = PUMP
        }
    });
    assert_eq!(found(&other), "subject");
    "gate".clone_into(&mut other.subject);
    assert_eq!(found(&other), "asset", "the body names it too");
    let later = Row { term: TERM + 1, ..row(intent.draft()) };
    assert_eq!(found(&later), "term");
}

#[test]
fn a_row_of_another_kind_or_a_garbled_one_is_refused() {
    let intent = intent();
    let never_left = row(intent.never_left());
    let unknown = RecordError::Unknown { kind: kind::OUTCOME, version: 1 };
    assert_eq!(intent.agrees(&never_left), Err(unknown));
    let mut short = row(intent.draft());
    short.body.pop();
    assert_eq!(intent.agrees(&short), Err(RecordError::Short { field: "readings" }));
    let mut newer = row(intent.draft());
    newer.version = 2;
    assert!(intent.agrees(&newer).is_err());
}

/// After a permit that was dropped the next term must not think that water may be flowing.
#[test]
fn a_command_that_never_left_is_not_open() {
    let intent = intent();
    let rows = vec![row(intent.draft()), row(intent.never_left())];
    assert_eq!(crate::fold(rows.clone().into_iter().take(1), &site()).open_intents.len(), 1);
    assert_eq!(crate::fold(rows.into_iter(), &site()).open_intents, []);
}
