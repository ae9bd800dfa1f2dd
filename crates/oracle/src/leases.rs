//! Commands and leases as the plant received them.

use units::{Mono, Span};

use crate::Judgement;
use crate::record::{Event, Finding, Kind, Rule, Rules, Sample};

/// The controller looks at its timers at least so often.
const TIMER: Span = Span::seconds(5);
/// A pump follows its opening gate within this.
const PUMP_FOLLOWS: Span = Span::minutes(5);
/// A position that has grown by less than this has not been opened.
const MOVED_PERCENT: f64 = 0.5;

pub(crate) fn judge(samples: &[Sample], events: &[Event], rules: &Rules, j: &mut Judgement) {
    for (i, e) in events.iter().enumerate() {
        match e.kind {
            Kind::Driven { setting_percent, .. } if e.asset == 0 && setting_percent > 0.0 => {
                opening(samples, e, setting_percent, rules, j);
            }
            Kind::LeaseOut { lease_end } => rest(events, i, lease_end, rules, j),
            _ => {}
        }
    }
    unled(samples, events, j);
}

/// A gate that is told to open further, against the head, without a pump to follow.
fn opening(samples: &[Sample], e: &Event, setting: f64, rules: &Rules, j: &mut Judgement) {
    let n = samples.partition_point(|s| s.utc <= e.utc);
    let Some(s) = n.checked_sub(1).and_then(|n| samples.get(n)) else { return };
    if setting <= s.gate_percent || rules.net_head_m(s) > 0.0 {
        return;
    }
    let soon = samples[n - 1..].iter().take_while(|s| s.utc - e.utc <= PUMP_FOLLOWS);
    if !soon.into_iter().any(|s| s.pump_runs) {
        let head = rules.net_head_m(s);
        let what = format!("told to open to {setting:.0} % with a head of {head:.2} m");
        j.findings.push(Finding { rule: Rule::PastInterlock, at: e.utc, what });
    }
}

/// A lease that ran out: rest begun at once, and done within the stroke, unless a new command came
/// or the gate was jammed meanwhile.
fn rest(events: &[Event], i: usize, lease_end: Mono, rules: &Rules, j: &mut Judgement) {
    let out = &events[i];
    let later = || events[i..].iter().filter(|e| e.asset == out.asset);
    let begun = later().find(|e| e.kind == Kind::RestBegun);
    if begun.is_none_or(|b| b.boot > lease_end + TIMER) {
        let what = format!("asset {}: rest not begun when its lease ended", out.asset);
        j.findings.push(Finding { rule: Rule::RestLate, at: out.utc, what });
    }
    let stroke = if out.asset == 0 { rules.stroke } else { TIMER };
    let by = lease_end + stroke + TIMER;
    let spared = |e: &Event| matches!(e.kind, Kind::Driven { .. } | Kind::JamBegun);
    let taken_over = later().any(|e| spared(e) && e.boot <= by) || jammed(events, i);
    let done = later().any(|e| e.kind == Kind::RestDone && e.boot <= by);
    if !done && !taken_over {
        let what = format!("asset {}: not at rest within lease and stroke", out.asset);
        j.findings.push(Finding { rule: Rule::RestNotDone, at: out.utc, what });
    }
}

fn jammed(events: &[Event], i: usize) -> bool {
    let jam = |e: &&Event| matches!(e.kind, Kind::JamBegun | Kind::JamEnded);
    events[..i].iter().rfind(jam).is_some_and(|e| e.kind == Kind::JamBegun)
}

/// The gate opens further only while a lease is alive.
fn unled(samples: &[Sample], events: &[Event], j: &mut Judgement) {
    let mut alive = false;
    let mut next = 0;
    for pair in samples.windows(2) {
        let [a, b] = pair else { continue };
        let mut led = alive;
        while let Some(e) = events.get(next).filter(|e| e.utc <= b.utc) {
            if e.asset == 0 {
                match e.kind {
                    Kind::Driven { .. } | Kind::Renewed { .. } => alive = true,
                    Kind::LeaseOut { .. } | Kind::RestTold | Kind::RestBegun => alive = false,
                    _ => {}
                }
            }
            led |= alive;
            next += 1;
        }
        if !led && b.gate_percent > a.gate_percent + MOVED_PERCENT {
            let what = format!("opened from {:.0} to {:.0} %", a.gate_percent, b.gate_percent);
            j.findings.push(Finding { rule: Rule::NoLease, at: a.utc, what });
        }
    }
}
