//! Commands past an interlock, by the true state of the plant at the moment that each arrived.

use units::{Span, Utc};

use crate::flow::between;
use crate::{Event, EventKind, Finding, Report, Rules, Run};

/// An opening smaller than this is the same position read back, percent.
const SAME_PERCENT: f64 = 0.5;

pub(crate) fn drives(run: &Run, rules: &Rules, report: &mut Report) {
    let mut local = vec![None; rules.assets.len()];
    for e in &run.events {
        let why = match e.kind {
            EventKind::LocalTaken { asset } => {
                local[asset] = Some(e.utc);
                None
            }
            EventKind::LocalGiven { asset } => {
                local[asset] = None;
                None
            }
            EventKind::Driven { asset, setting_percent, .. } => {
                report.totals.drives += 1;
                let held = barred(rules, &local, asset, e.utc);
                held.or_else(|| against_state(run, rules, e, asset, setting_percent))
                    .map(|why| (asset, why))
            }
            EventKind::DriveRefused { asset } => {
                report.totals.drives_refused_by_plant += 1;
                barred(rules, &local, asset, e.utc).map(|why| (asset, why))
            }
            _ => None,
        };
        let finding = why.map(|(asset, why)| Finding::PastInterlock { at: e.utc, asset, why });
        report.findings.extend(finding);
    }
}

/// Nothing may be commanded at all: a lock, a panel, or a position that cannot be read.
fn barred(rules: &Rules, local: &[Option<Utc>], asset: usize, at: Utc) -> Option<String> {
    let known = |since: Utc| at - since > rules.known_within;
    if local[asset].is_some_and(known) {
        return Some("it is in local control".to_owned());
    }
    let held =
        |b: &&crate::Barred| b.asset == asset && b.window.contains(at) && known(b.window.start());
    rules.barred.iter().find(held).map(|b| b.why.clone())
}

fn against_state(
    run: &Run,
    rules: &Rules,
    e: &Event,
    asset: usize,
    setting_percent: f64,
) -> Option<String> {
    let level_m = between(&run.samples, e.utc, |s| s.level_m);
    let gate = between(&run.samples, e.utc, |s| s.gate_percent);
    if asset == 0 {
        let outer_m = between(&run.samples, e.utc, |s| s.outer_m);
        let net_m = rules.head.net_m(level_m, outer_m);
        let opens = setting_percent > gate + SAME_PERCENT;
        let against = opens && net_m <= -rules.instruments_m;
        return (against && !assisted(run, e.utc, rules.assist_within))
            .then(|| format!("net head {net_m:.3} m and no pump within {}", rules.assist_within));
    }
    if setting_percent < 50.0 {
        return None;
    }
    if level_m <= rules.level_lowest_working_m - rules.instruments_m {
        return Some(format!("level {level_m:.3} m is at the lowest working level"));
    }
    // The gate may pass the mark within the minute between two samples.
    let soon = between(&run.samples, e.utc + Span::minutes(1), |s| s.gate_percent);
    let way = gate.max(soon);
    (way < rules.way_open_min_percent).then(|| format!("the way is open by {way:.1} % only"))
}

/// A pump runs, or starts soon enough.
fn assisted(run: &Run, at: Utc, within: Span) -> bool {
    let last = run.samples.partition_point(|s| s.utc <= at).saturating_sub(1);
    let near = run.samples[last..].iter().take_while(|s| s.utc <= at + within);
    let mut starts = run.events.iter().filter(|e| at <= e.utc && e.utc <= at + within);
    near.clone().any(|s| s.pumps_run > 0)
        || starts.any(|e| {
            matches!(e.kind, EventKind::Driven { asset, setting_percent, .. }
                if asset > 0 && setting_percent >= 50.0)
        })
}
