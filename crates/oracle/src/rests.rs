//! Leases and rests: begun no later than the lease's end, done within a stroke of it. A jam of the
//! gate is the one exception: the stroke's time then runs from its end.

use units::{Mono, Span, Utc};

use crate::{Event, EventKind, Finding, Report, Rules, Run};

/// The boot clock is read to the microsecond; a step of the plant ends within one of it.
const TO_THE_TICK: Span = Span::millis(1);

#[derive(Clone, Copy)]
enum Now {
    Idle,
    /// Driven, until this instant of the boot clock.
    Leased(Mono),
    /// Resting since; due to be done by, unless a jam stands; whether one stood meanwhile.
    Resting {
        since: Mono,
        due: Option<Mono>,
        behind_jam: bool,
    },
}

pub(crate) fn rests(run: &Run, rules: &Rules, report: &mut Report) {
    let mut jammed = false;
    let mut now = vec![Now::Idle; rules.assets.len()];
    for e in &run.events {
        // A lease that ended before this event without a rest is found here, whatever came next.
        for (asset, state) in now.iter_mut().enumerate() {
            if !own(e, asset) {
                overdue(asset, state, (e.utc, e.boot), report);
            }
        }
        match e.kind {
            EventKind::JamBegun => {
                jammed = true;
                if let Some(Now::Resting { due, behind_jam, .. }) = now.first_mut() {
                    (*due, *behind_jam) = (None, true);
                }
            }
            EventKind::JamEnded => {
                jammed = false;
                if let Some(Now::Resting { due: due @ None, .. }) = now.first_mut() {
                    // It can move again, and has a stroke's time from here on.
                    *due = Some(e.boot + rules.assets[0].stroke);
                }
            }
            EventKind::PlantStarted => now.fill(Now::Idle),
            EventKind::Driven { asset, lease_end, .. }
            | EventKind::Renewed { asset, lease_end } => {
                now[asset] = Now::Leased(lease_end);
            }
            EventKind::LocalTaken { asset } | EventKind::ProtectionStopped { asset } => {
                now[asset] = Now::Idle;
            }
            EventKind::RestBegun { asset } => {
                begun(asset, &mut now[asset], e, rules, jammed && asset == 0, report);
            }
            EventKind::RestDone { asset } => done(asset, &mut now[asset], e, report),
            _ => {}
        }
    }
    if let Some(last) = run.samples.last() {
        for (asset, state) in now.iter_mut().enumerate() {
            overdue(asset, state, (last.utc, last.boot), report);
        }
    }
}

/// Whether the event is this asset's rest beginning or done, which judges itself, or the start of a
/// plant that could write nothing meanwhile.
fn own(e: &Event, asset: usize) -> bool {
    match e.kind {
        EventKind::RestBegun { asset: a } | EventKind::RestDone { asset: a } => a == asset,
        EventKind::PlantStarted => true,
        _ => false,
    }
}

/// Finds what should have happened by now and has not; each once.
fn overdue(asset: usize, state: &mut Now, (utc, boot): (Utc, Mono), report: &mut Report) {
    match *state {
        Now::Leased(end) if boot > end + TO_THE_TICK => {
            let late = boot.since(end);
            report.findings.push(Finding::RestNotBegun { at: utc - late, asset, late });
            *state = Now::Idle;
        }
        Now::Resting { due: Some(due), .. } if boot > due + TO_THE_TICK => {
            let late = boot.since(due);
            report.findings.push(Finding::RestNotDone { at: utc - late, asset, late });
            *state = Now::Idle;
        }
        _ => {}
    }
}

fn begun(
    asset: usize,
    state: &mut Now,
    e: &Event,
    rules: &Rules,
    jammed: bool,
    report: &mut Report,
) {
    report.totals.rests_begun += 1;
    // Told while it is resting already: the first one counts.
    if let Now::Resting { .. } = state {
        return;
    }
    if let Now::Leased(end) = *state
        && e.boot + TO_THE_TICK >= end
    {
        let late = e.boot.since(end);
        report.totals.leases_run_out += 1;
        report.totals.rest_begun_latest = report.totals.rest_begun_latest.max(late);
        if late > TO_THE_TICK {
            report.findings.push(Finding::RestNotBegun { at: e.utc - late, asset, late });
        }
    }
    let due = (!jammed).then(|| e.boot + rules.assets[asset].stroke);
    *state = Now::Resting { since: e.boot, due, behind_jam: jammed };
}

fn done(asset: usize, state: &mut Now, e: &Event, report: &mut Report) {
    let Now::Resting { since, due, behind_jam } = *state else { return };
    *state = Now::Idle;
    if behind_jam {
        report.totals.rests_behind_jam += 1;
    } else {
        report.totals.rest_done_latest = report.totals.rest_done_latest.max(e.boot.since(since));
    }
    if let Some(due) = due
        && e.boot > due + TO_THE_TICK
    {
        let late = e.boot.since(due);
        report.findings.push(Finding::RestNotDone { at: e.utc - late, asset, late });
    }
}
