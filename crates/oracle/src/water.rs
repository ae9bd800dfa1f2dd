//! Flow at the ports against the windows, the current and the flow cap; spills that need not be.

use units::Span;

use crate::Judgement;
use crate::record::{Finding, Rule, Rules, Sample};

/// Less than this is a meter's noise.
const FLOW_LEAST_M3_S: f64 = 0.005;
/// A spill is looked at back so far: was there a lawful way that was not used?
const LOOK_BACK: Span = Span::hours(24);
/// Head by which water certainly runs out.
const HEAD_SURE_M: f64 = 0.5;

pub(crate) fn judge(samples: &[Sample], rules: &Rules, j: &mut Judgement) {
    let mut flowing = false;
    for pair in samples.windows(2) {
        let [s, next] = pair else { continue };
        let flows = s.ports_m3_s > FLOW_LEAST_M3_S;
        j.releases += usize::from(flows && !flowing);
        flowing = flows;
        let released = next.released_m3 - s.released_m3;
        j.released_m3 += released;
        if flows {
            outside(s, released, rules, j);
        }
        let spilled = next.spilled_m3 - s.spilled_m3;
        j.spilled_m3 += spilled;
        if spilled > 0.0 && was_avoidable(samples, s, rules) {
            j.avoidable_spill_m3 += spilled;
        }
    }
    mean_flows(samples, rules, j);
}

fn outside(s: &Sample, released: f64, rules: &Rules, j: &mut Judgement) {
    let window = rules.allowed_at(s.utc).is_some();
    let current = s.current_m_s >= rules.current_min_m_s;
    if window && current {
        return;
    }
    j.outside_m3 += released;
    let why = if window { "against the current" } else { "outside its window" };
    let what = format!("{:.3} m3/s {why} (current {:.2} m/s)", s.ports_m3_s, s.current_m_s);
    j.findings.push(Finding { rule: Rule::OutsideWindow, at: s.utc, what });
}

/// The mean of every averaging span that ends at a sample, by the cumulated volume.
fn mean_flows(samples: &[Sample], rules: &Rules, j: &mut Judgement) {
    let mut from = 0;
    for s in samples {
        while s.utc - samples[from].utc > rules.averaging {
            from += 1;
        }
        let start = &samples[from];
        // A span that began a little later is judged by what it holds: never more than it had.
        let mean = (s.released_m3 - start.released_m3) / rules.averaging.as_seconds();
        let cap = rules.allowed_at(start.utc).or_else(|| rules.allowed_at(s.utc));
        if let Some(cap) = cap
            && mean > cap.flow_max_m3_s + 1e-6
        {
            let what = format!("mean {mean:.3} m3/s over {}", cap.flow_max_m3_s);
            j.findings.push(Finding { rule: Rule::Flow, at: s.utc, what });
        }
    }
}

/// Whether, in the day before, a lawful minute with head and water passed unused while the tide's
/// volume was not used up.
fn was_avoidable(samples: &[Sample], spill: &Sample, rules: &Rules) -> bool {
    let before = |s: &&Sample| s.utc < spill.utc && spill.utc - s.utc < LOOK_BACK;
    samples.iter().filter(before).any(|s| {
        let Some(a) = rules.allowed_at(s.utc) else { return false };
        let lawful = s.current_m_s >= rules.current_min_m_s;
        let able = s.level_m > rules.level_low_m && rules.net_head_m(s) > HEAD_SURE_M;
        let idle = s.ports_m3_s <= FLOW_LEAST_M3_S;
        lawful && able && idle && released_in(samples, &a.window) < 0.9 * a.volume_max_m3
    })
}

pub(crate) fn released_in(samples: &[Sample], window: &units::Window) -> f64 {
    let from = samples.partition_point(|s| s.utc < window.start());
    let to = samples.partition_point(|s| s.utc <= window.end());
    match (samples.get(from), to.checked_sub(1).and_then(|n| samples.get(n))) {
        (Some(a), Some(b)) if b.utc > a.utc => b.released_m3 - a.released_m3,
        _ => 0.0,
    }
}
