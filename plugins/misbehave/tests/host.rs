//! The host against an adapter that does everything wrong: it stays alive, says what happened, and
//! the adapter beside it goes on.

use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::mpsc::{Receiver, channel};
use std::time::Duration;

use host::{AdapterSpec, Host, HostEvent};
use units::Mono;

fn spec(id: u16, how: &str) -> AdapterSpec {
    AdapterSpec {
        id,
        name: format!("{how}-{id}"),
        program: PathBuf::from(env!("CARGO_BIN_EXE_misbehave")),
        args: vec![how.to_owned()],
        settings: BTreeMap::new(),
        site: "test".to_owned(),
        term: 1,
        answer_within: Duration::from_millis(400),
    }
}

/// A host with the ill-behaved adapter 0 and a good one, 1.
fn start(how: &str) -> (Host, Receiver<HostEvent>) {
    let (to, events) = channel();
    let tell: host::Events = Arc::new(move |e| {
        let _ = to.send(e);
    });
    let now: host::Now = Arc::new(|| Mono::ZERO);
    (
        Host::start(vec![spec(0, how), spec(1, "well")], &tell, &now)
            .expect("two supervisors start"),
        events,
    )
}

/// Everything told until `enough`, or for five seconds.
fn until(events: &Receiver<HostEvent>, enough: impl Fn(&[HostEvent]) -> bool) -> Vec<HostEvent> {
    let mut all = Vec::new();
    while !enough(&all) {
        match events.recv_timeout(Duration::from_secs(5)) {
            Ok(e) => all.push(e),
            Err(_) => break,
        }
    }
    all
}

fn downs(all: &[HostEvent]) -> Vec<String> {
    all.iter()
        .filter_map(|e| match e {
            HostEvent::Down { adapter: 0, why, .. } => Some(why.clone()),
            _ => None,
        })
        .collect()
}

fn ups(all: &[HostEvent], id: u16) -> usize {
    all.iter().filter(|e| matches!(e, HostEvent::Up { adapter, .. } if *adapter == id)).count()
}

/// The bad one is down with this reason, twice (it was started again); the good one is up, once.
fn goes_down_for(how: &str, why: &str) {
    let (host, events) = start(how);
    let all = until(&events, |all| downs(all).len() >= 2 && ups(all, 1) == 1);
    let downs = downs(&all);
    assert!(downs.len() >= 2 && downs[0].contains(why), "{how}: {downs:?}");
    assert_eq!(ups(&all, 1), 1, "the good adapter is not touched");
    host.finish(Duration::from_secs(2));
}

#[test]
fn fault_garbage_is_no_message() {
    goes_down_for("garbage", "not JSON");
}

#[test]
fn fault_silence_is_a_time_out() {
    goes_down_for("silent", "did not answer in time");
}

#[test]
fn fault_an_early_exit_is_seen() {
    goes_down_for("exit-early", "");
}

#[test]
fn fault_a_wrong_version_is_refused() {
    goes_down_for("wrong-version", "-32009");
}

#[test]
fn fault_a_line_too_long_ends_it() {
    goes_down_for("long-line", "more than");
}

#[test]
fn fault_half_a_line_and_no_more_is_a_time_out() {
    goes_down_for("half-line", "did not answer in time");
}

#[test]
fn fault_an_adapter_that_gives_orders_is_ended() {
    goes_down_for("request", "sent a request");
}

#[test]
fn fault_an_answer_twice_or_to_nobody_changes_nothing() {
    for how in ["twice", "wrong-id"] {
        let (host, events) = start(how);
        let all = until(&events, |all| ups(all, 0) == 1 && ups(all, 1) == 1);
        assert_eq!((ups(&all, 0), downs(&all).len()), (1, 0), "{how}: {all:?}");
        host.finish(Duration::from_secs(2));
    }
}

#[test]
fn fault_a_crash_loop_is_quarantined() {
    let (host, events) = start("die-after");
    let quarantined =
        |e: &HostEvent| matches!(e, HostEvent::Down { adapter: 0, quarantined: true, .. });
    let all = until(&events, |all| all.iter().any(quarantined));
    assert_eq!(downs(&all).len(), 5);
    assert!(all.iter().any(quarantined), "{all:?}");
    host.finish(Duration::from_secs(2));
}

#[test]
fn fault_a_flood_holds_nobody_else_up() {
    let (host, events) = start("flood");
    let all = until(&events, |all| ups(all, 0) == 1 && ups(all, 1) == 1);
    assert_eq!((ups(&all, 0), ups(&all, 1)), (1, 1));
    host.finish(Duration::from_secs(2));
}

#[test]
fn an_anchor_goes_to_those_who_asked_for_it_and_to_nobody_else() {
    let (host, events) = start("anchors");
    let both_up =
        |all: &[HostEvent]| all.iter().filter(|e| matches!(e, HostEvent::Up { .. })).count() == 2;
    until(&events, both_up);
    host.anchor("41:abcd");
    let told = |e: &HostEvent| match e {
        HostEvent::Trouble { adapter, trouble } => Some((*adapter, trouble.words.clone())),
        _ => None,
    };
    let all = until(&events, |all| all.iter().any(|e| told(e).is_some()));
    let [(0, words)] = &all.iter().filter_map(told).collect::<Vec<_>>()[..] else {
        panic!("{all:?}")
    };
    assert!(words.contains("'site':'test'") && words.contains("'anchor':'41:abcd'"), "{words}");
    host.finish(Duration::from_secs(2));
    assert!(downs(&events.try_iter().collect::<Vec<_>>()).is_empty());
}
