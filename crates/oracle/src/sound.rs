//! Whether there is anything to judge: a record that is empty, out of order or not a number would
//! pass every comparison.

use crate::{Event, EventKind, Rules, Run, Sample};

/// What makes the record or the rules unfit, each kind of fault once; nothing where they are sound.
pub(crate) fn faults(run: &Run, rules: &Rules) -> Vec<String> {
    let mut list = Vec::new();
    if run.samples.len() < 2 {
        list.push(format!("the record holds {} samples", run.samples.len()));
    }
    let numbers = run.samples.iter().find(|s| !is_finite(s));
    list.extend(numbers.map(|s| format!("the sample of {} holds what is no number", s.utc)));
    let disordered = run.samples.windows(2).find(|p| p[1].utc <= p[0].utc || p[1].boot < p[0].boot);
    list.extend(disordered.map(|p| format!("the sample of {} is out of order", p[1].utc)));
    // Totals count since the very beginning: one that falls hides a volume.
    let falls =
        |p: &&[Sample]| p[1].released_m3 < p[0].released_m3 || p[1].spilled_m3 < p[0].spilled_m3;
    let fallen = run.samples.windows(2).find(falls);
    list.extend(fallen.map(|p| format!("a total falls to {}", p[1].utc)));
    let disordered = run.events.windows(2).find(|p| p[1].utc < p[0].utc);
    list.extend(disordered.map(|p| format!("the event of {} is out of order", p[1].utc)));
    let unknown = |e: &&Event| asset(&e.kind).is_some_and(|a| a >= rules.assets.len());
    let unknown = run.events.iter().find(unknown);
    list.extend(unknown.map(|e| format!("the event of {} is of an unknown asset", e.utc)));
    let crossed = rules.lawful.windows(2).find(|p| p[1].window.start() < p[0].window.end());
    list.extend(crossed.map(|p| format!("lawful windows cross at {}", p[1].window.start())));
    list
}

fn is_finite(s: &Sample) -> bool {
    let all = [
        s.level_m,
        s.outer_m,
        s.gate_percent,
        s.ports_m3_s,
        s.inflow_m3_s,
        s.released_m3,
        s.spilled_m3,
    ];
    all.iter().all(|x| x.is_finite())
}

fn asset(kind: &EventKind) -> Option<usize> {
    match *kind {
        EventKind::Driven { asset, .. }
        | EventKind::Renewed { asset, .. }
        | EventKind::DriveRefused { asset }
        | EventKind::RestTold { asset }
        | EventKind::RestBegun { asset }
        | EventKind::RestDone { asset }
        | EventKind::ProtectionStopped { asset }
        | EventKind::LocalTaken { asset }
        | EventKind::LocalGiven { asset } => Some(asset),
        EventKind::JamBegun
        | EventKind::JamEnded
        | EventKind::PortsFlow
        | EventKind::PortsStill
        | EventKind::PlantStarted => None,
    }
}
