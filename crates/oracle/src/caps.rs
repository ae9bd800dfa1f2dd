//! Volumes: on each tide, in any span, in each fixed stretch.

use crate::flow::Total;
use crate::{Finding, Report, Rules, Run};

/// Rounding alone is no breach, m3.
const FORGIVEN_M3: f64 = 1e-6;

pub(crate) fn volumes(run: &Run, rules: &Rules, report: &mut Report) {
    let total = Total::of(&run.samples);
    for t in &rules.tides {
        let (volume_m3, max_m3) = (total.in_window(&t.window), t.volume_max_m3);
        if volume_m3 > max_m3 + FORGIVEN_M3 {
            report.findings.push(Finding::TideOverCap { tide: t.tide, volume_m3, max_m3 });
        }
    }
    for c in &rules.fixed {
        let (volume_m3, max_m3) = (total.in_window(&c.window), c.volume_max_m3);
        if volume_m3 > max_m3 + FORGIVEN_M3 {
            let from = c.window.start();
            report.findings.push(Finding::FixedOverCap { from, volume_m3, max_m3 });
        }
    }
    let Some((span, max_m3)) = rules.rolling else { return };
    for s in &run.samples {
        let volume_m3 = s.released_m3 - total.at(s.utc - span);
        report.totals.rolling_max_m3 = report.totals.rolling_max_m3.max(volume_m3);
        if volume_m3 > max_m3 + FORGIVEN_M3 {
            report.findings.push(Finding::RollingOverCap { at: s.utc, volume_m3, max_m3 });
        }
    }
}
