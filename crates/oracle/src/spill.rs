//! Spill that a lawful release could have avoided.

use units::{Span, Utc, Windows};

use crate::flow::Total;
use crate::{Finding, Report, Rules, Run, Sample};

/// How far back an unused minute counts.
const BACK: Span = Span::hours(24);
/// Less than this over the weir in a minute is a wet crest, m3.
const WET_CREST_M3: f64 = 0.01;
/// A cap with less than this left is used up, m3: less than a minute of the smallest flow.
const USED_UP_M3: f64 = 10.0;

/// A spill is avoidable if in the 24 h before it a whole lawful minute went unused, with water above
/// the lowest working level, a positive head, and room under the caps of its tide and span.
pub(crate) fn spills(run: &Run, rules: &Rules, report: &mut Report) {
    let unused = unused(run, rules);
    let mut before: Option<Utc> = None;
    for pair in run.samples.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        let volume_m3 = b.spilled_m3 - a.spilled_m3;
        if volume_m3 <= WET_CREST_M3 {
            continue;
        }
        let first = unused.partition_point(|t| *t < a.utc - BACK);
        let Some(at) = unused.get(first).filter(|t| **t <= a.utc) else { continue };
        report.totals.spilled_avoidably_m3 += volume_m3;
        match report.findings.last_mut() {
            // One finding for a spill that goes on.
            Some(Finding::AvoidableSpill { volume_m3: sum, .. }) if before == Some(a.utc) => {
                *sum += volume_m3;
            }
            _ => {
                let unused = *at;
                report.findings.push(Finding::AvoidableSpill { at: a.utc, volume_m3, unused });
            }
        }
        before = Some(b.utc);
    }
}

fn unused(run: &Run, rules: &Rules) -> Vec<Utc> {
    let total = Total::of(&run.samples);
    let lawful: Windows = rules.lawful.iter().map(|w| w.window).collect();
    let whole = |a: &Sample, b: &Sample| lawful.holding(a.utc).is_some_and(|w| b.utc <= w.end());
    let mut list = Vec::new();
    for pair in run.samples.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        let idle = a.ports_m3_s <= rules.still_m3_s && b.ports_m3_s <= rules.still_m3_s;
        let could = a.level_m > rules.level_lowest_working_m + rules.instruments_m
            && rules.head.net_m(a.level_m, a.outer_m) > rules.instruments_m;
        if idle && could && whole(a, b) && room_m3(rules, &total, a) > USED_UP_M3 {
            list.push(a.utc);
        }
    }
    list
}

/// What could still have left: the least room under the tide's whole sum, so that a cap that was
/// used later on that tide counts as used, and under the rolling cap at that minute.
fn room_m3(rules: &Rules, total: &Total, s: &Sample) -> f64 {
    let tide = rules.tides.iter().find(|t| t.window.contains(s.utc));
    let on_tide = tide.map_or(0.0, |t| t.volume_max_m3 - total.in_window(&t.window));
    let fixed = rules.fixed.iter().filter(|c| c.window.contains(s.utc));
    let fixed = fixed.map(|c| c.volume_max_m3 - total.in_window(&c.window));
    let rolling = rules.rolling.map(|(span, max)| {
        // What a release now adds is still in the span at every instant until `span` from now.
        let worst = |t: Utc| total.at(t) - total.at(t - span);
        max - worst(s.utc).max(worst(s.utc + span - Span::minutes(1)))
    });
    fixed.chain(rolling).fold(on_tide, f64::min)
}
