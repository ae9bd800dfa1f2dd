//! Why each slot is as it is, in the model's words.

use model::{ClauseId, FlowLimit, Lawful, LawfulWindow, SlotReason};
use units::{Span, Utc, Window};

use crate::forward::{Does, Idle, Path, Step};
use crate::problem::Problem;
use crate::throttle::Bound;

/// Mean time from one tide to the next: half a lunar day (24 h 50 min 28 s, common knowledge).
const TIDE: Span = Span::seconds(44_714);

/// The gate's reason for a step.
pub(crate) fn of_gate(problem: &Problem, path: &Path, step: &Step) -> SlotReason {
    match step.does {
        Does::Release { bound, .. } => {
            let flow_by = step.window.and_then(|w| problem.windows[w].flow_by);
            let limited_by = match bound {
                Bound::Aim => flow_by.map_or(FlowLimit::Head, FlowLimit::Clause),
                Bound::Volume(clause) => FlowLimit::Clause(clause),
                Bound::Head => FlowLimit::Head,
                Bound::Pump => FlowLimit::Pump,
                Bound::Ramp => FlowLimit::Ramp,
            };
            SlotReason::Releasing { limited_by }
        }
        Does::Idle(Idle::Used(clause)) => SlotReason::CapReached { clause },
        Does::Idle(Idle::Low) => SlotReason::StorageLow,
        Does::Idle(Idle::Waiting) => SlotReason::WaitingForHead,
        // Where pumps could go at once, not to is a choice; a release later says what for.
        Does::Idle(Idle::NoHead) if !problem.pumps.is_empty() && released_after(path, step) => {
            SlotReason::WaitingForHead
        }
        Does::Idle(Idle::NoHead) => SlotReason::NoHead,
        Does::Idle(Idle::Between) => {
            let next = problem.request.lawful.next_after(step.slot.start());
            SlotReason::OutsideWindow { clause: next.and_then(|w| w.opens.clause) }
        }
    }
}

fn released_after(path: &Path, step: &Step) -> bool {
    let later = |s: &&Step| s.period == step.period && s.slot.start() > step.slot.start();
    path.steps.iter().filter(later).any(|s| s.released_m3 > 0.0)
}

/// Why the pump of this turn (1 is the first of its tide) stands still in a step with a release.
pub(crate) fn of_pump_at_rest(problem: &Problem, step: &Step, tide: i64) -> SlotReason {
    let middle = step.slot.start() + step.slot.length().scaled(0.5);
    let gravity = problem.gravity_m3_s(step.volume_middle, problem.outer_m(middle));
    let all = problem.pumped_m3_s(problem.pumps.len(), tide);
    let at_head = matches!(step.does, Does::Release { bound: Bound::Head, .. });
    if at_head && gravity < all { SlotReason::WaitingForHead } else { SlotReason::GravityEnough }
}

/// Between the release windows: the stretch from `at` that has one reason, and the reason.
pub(crate) fn between(problem: &Problem, at: Utc, to: Utc) -> (Utc, SlotReason) {
    let lawful = &problem.request.lawful;
    if let Some(w) = lawful.holding(at) {
        let flow = problem.windows.iter().find(|r| r.lawful == w.window).map(|r| r.flow);
        return match flow.filter(|f| at < f.start()) {
            Some(f) => (f.start().min(to), SlotReason::EdgeMargin { clause: w.opens.clause }),
            None => (w.window.end().min(to), SlotReason::EdgeMargin { clause: w.shuts.clause }),
        };
    }
    let next = lawful.next_after(at);
    let to = next.map_or(to, |w| w.window.start().min(to));
    let nil = nil_windows(lawful);
    if let Some((w, clause)) = nil.iter().find(|(w, _)| w.contains(at)) {
        return (w.end().min(to), SlotReason::OutsideWindow { clause: Some(*clause) });
    }
    let until = nil.iter().map(|(w, _)| w.start()).filter(|s| *s > at).min();
    let clause = match next {
        Some(w) => w.opens.clause,
        None => last_before(lawful, at).and_then(|w| w.shuts.clause),
    };
    (until.map_or(to, |u| u.min(to)), SlotReason::OutsideWindow { clause })
}

fn last_before(lawful: &Lawful, at: Utc) -> Option<&LawfulWindow> {
    lawful.windows.iter().rev().find(|w| w.window.end() <= at)
}

/// Where the windows of nil tides would about have been, counted in tides from their neighbours,
/// with the clause that took each.
pub(crate) fn nil_windows(lawful: &Lawful) -> Vec<(Window, ClauseId)> {
    let each = lawful.nil.iter().filter_map(|nil| {
        let before = lawful.windows.iter().rev().find(|w| w.tide < nil.tide);
        let after = lawful.windows.iter().find(|w| w.tide > nil.tide);
        let known = before.or(after)?;
        let start = known.window.start() + TIDE * (nil.tide - known.tide);
        let end = start + known.window.length();
        // Never into a neighbour that is known.
        let start = before.map_or(start, |w| start.max(w.window.end()));
        let end = after.map_or(end, |w| end.min(w.window.start()));
        Some((Window::new(start, end).ok()?, nil.clause))
    });
    each.collect()
}
