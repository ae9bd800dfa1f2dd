//! All rules over one run.

use crate::{Finding, Report, Rules, Run, caps, drives, flow, rests, sound, spill};

/// Judges the run by every rule; findings by rule, each in order of time. A record that is not sound
/// is not judged at all, and that is the finding: silence must never look like obedience.
pub fn judge(run: &Run, rules: &Rules) -> Report {
    let mut report = Report::default();
    let unsound = sound::faults(run, rules);
    if !unsound.is_empty() {
        report.findings.extend(unsound.into_iter().map(|why| Finding::Unjudgeable { why }));
        return report;
    }
    if let (Some(first), Some(last)) = (run.samples.first(), run.samples.last()) {
        report.totals.released_m3 = last.released_m3 - first.released_m3;
        report.totals.spilled_m3 = last.spilled_m3 - first.spilled_m3;
    }
    report.totals.inflow_m3 = run
        .samples
        .windows(2)
        .map(|p| p[0].inflow_m3_s * (p[1].utc - p[0].utc).as_seconds())
        .fold(0.0, |a, b| a + b);
    flow::windows(run, rules, &mut report);
    flow::rates(run, rules, &mut report);
    caps::volumes(run, rules, &mut report);
    drives::drives(run, rules, &mut report);
    rests::rests(run, rules, &mut report);
    spill::spills(run, rules, &mut report);
    report
}

#[cfg(test)]
mod tests;
