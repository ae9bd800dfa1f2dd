//! Water at the ports: the running total, when it flowed, and what left outside the windows.

use units::{Span, Utc, Window, Windows};

use crate::{EventKind, Finding, Report, Rules, Run, Sample};

/// The running total at any instant: exact at samples, straight between, level beyond the ends.
pub(crate) struct Total<'a> {
    samples: &'a [Sample],
}

impl<'a> Total<'a> {
    pub(crate) const fn of(samples: &'a [Sample]) -> Self {
        Self { samples }
    }
    pub(crate) fn at(&self, t: Utc) -> f64 {
        between(self.samples, t, |s| s.released_m3)
    }
    pub(crate) fn in_window(&self, w: &Window) -> f64 {
        self.at(w.end()) - self.at(w.start())
    }
}

/// A figure at any instant, straight between samples, level beyond the ends; zero with no sample.
pub(crate) fn between(samples: &[Sample], t: Utc, of: impl Fn(&Sample) -> f64) -> f64 {
    let after = samples.partition_point(|s| s.utc <= t);
    match (after.checked_sub(1).map(|i| &samples[i]), samples.get(after)) {
        (Some(a), Some(b)) => {
            let share = (t - a.utc).as_seconds() / (b.utc - a.utc).as_seconds();
            of(a) + (of(b) - of(a)) * share
        }
        (Some(one), None) | (None, Some(one)) => of(one),
        (None, None) => 0.0,
    }
}

/// When water left the ports: from the events, and where the record begins in a flow, from there.
/// A plant that stopped in a flow is taken to have flowed until its next sample says otherwise.
pub(crate) fn flowing(run: &Run) -> Windows {
    let (Some(first), Some(last)) = (run.samples.first(), run.samples.last()) else {
        return Windows::none();
    };
    let mut since = (first.ports_m3_s > 0.0).then_some(first.utc);
    let mut list = Vec::new();
    for e in &run.events {
        match e.kind {
            EventKind::PortsFlow => since = since.or(Some(e.utc)),
            EventKind::PortsStill => {
                list.extend(since.take().and_then(|from| Window::new(from, e.utc).ok()));
            }
            EventKind::PlantStarted => {
                let next = run.samples.iter().find(|s| s.utc >= e.utc);
                if next.is_some_and(|s| s.ports_m3_s <= 0.0) {
                    list.extend(since.take().and_then(|from| Window::new(from, e.utc).ok()));
                }
            }
            _ => {}
        }
    }
    list.extend(since.and_then(|from| Window::new(from, last.utc).ok()));
    list.into_iter().collect()
}

/// Flow belongs to its instant. In a minute that an edge cuts, the volume is spread over the part
/// of the minute that flowed.
pub(crate) fn windows(run: &Run, rules: &Rules, report: &mut Report) {
    let flowing = flowing(run);
    let lawful: Windows = rules.lawful.iter().map(|w| w.window).collect();
    report.totals.releases =
        flowing.iter().filter(|w| Total::of(&run.samples).in_window(w) >= 1.0).count();
    let mut open: Option<(Utc, Utc, f64)> = None;
    for pair in run.samples.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        let volume_m3 = b.released_m3 - a.released_m3;
        let Ok(minute) = Window::new(a.utc, b.utc) else { continue };
        let mut flowed = flowing.intersect(&Windows::from(minute));
        if flowed.is_empty() && volume_m3 > 0.0 {
            flowed = Windows::from(minute);
        }
        let outside = flowed.minus(&lawful);
        let outside_s = outside.total().as_seconds();
        if outside_s <= 0.0 {
            continue;
        }
        let out_m3 = volume_m3 * outside_s / flowed.total().as_seconds();
        if out_m3 / outside_s <= rules.still_m3_s {
            continue;
        }
        report.totals.outside_window_m3 += out_m3;
        let (from, to) = (outside.as_slice()[0].start(), b.utc);
        open = match open {
            Some((start, end, sum)) if end == a.utc => Some((start, to, sum + out_m3)),
            before => {
                report.findings.extend(before.map(outside_finding));
                Some((from, to, out_m3))
            }
        };
    }
    report.findings.extend(open.map(outside_finding));
}

fn outside_finding((from, to, volume_m3): (Utc, Utc, f64)) -> Finding {
    Finding::FlowOutsideWindow { from, to, volume_m3 }
}

/// The mean over the averaging span up to each sample, against the cap of the window that began
/// last; and the change from sample to sample where no rest is under way.
pub(crate) fn rates(run: &Run, rules: &Rules, report: &mut Report) {
    let total = Total::of(&run.samples);
    for s in &run.samples {
        let mean =
            (total.at(s.utc) - total.at(s.utc - rules.averaging)) / rules.averaging.as_seconds();
        report.totals.flow_mean_max_m3_s = report.totals.flow_mean_max_m3_s.max(mean);
        let began = rules.lawful.iter().rev().find(|w| w.window.start() <= s.utc);
        if let Some(max_m3_s) = began.map(|w| w.flow_max_m3_s)
            && mean > max_m3_s + 1e-9
        {
            report.findings.push(Finding::FlowOverCap { at: s.utc, mean_m3_s: mean, max_m3_s });
        }
    }
    if let Some(max_m3_s) = rules.ramp_max_m3_s {
        ramps(run, max_m3_s, &resting(run), report);
    }
}

fn ramps(run: &Run, max_m3_s: f64, resting: &Windows, report: &mut Report) {
    for pair in run.samples.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        let minutes = (b.utc - a.utc).as_minutes();
        let change_m3_s = (b.ports_m3_s - a.ports_m3_s) / minutes;
        let apart = Window::new(a.utc, b.utc)
            .is_ok_and(|w| resting.intersect(&Windows::from(w)).is_empty());
        // What is over by rounding alone is not over.
        if apart && change_m3_s.abs() > max_m3_s + 1e-6 {
            report.findings.push(Finding::RampOverCap { at: b.utc, change_m3_s, max_m3_s });
        }
    }
}

/// From the beginning of any rest until it is done, or something else is asked, and a while beyond:
/// water that is on its way in the pipe runs out.
fn resting(run: &Run) -> Windows {
    const RUNS_OUT: Span = Span::minutes(10);
    let begun = run.events.iter().filter(|e| matches!(e.kind, EventKind::RestBegun { .. }));
    let end = |from: Utc| {
        let done = run.events.iter().find(|e| {
            e.utc >= from && matches!(e.kind, EventKind::RestDone { .. } | EventKind::Driven { .. })
        });
        done.map_or(from, |e| e.utc) + RUNS_OUT
    };
    let protection = |e: &&crate::Event| matches!(e.kind, EventKind::ProtectionStopped { .. });
    let stopped = run.events.iter().filter(protection);
    begun.chain(stopped).filter_map(|e| Window::new(e.utc, end(e.utc)).ok()).collect()
}
