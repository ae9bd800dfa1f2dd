//! Caps over more than one tide, repaired to feasible: the tide that first breaks one has its
//! allotment cut by the excess, and the plan is made again.

use model::{ClauseId, LongCap, LongCapKind};
use units::{Utc, Window};

use crate::forward::{Path, walk};
use crate::problem::Problem;

/// Each round cuts one tide; more rounds than tides times caps would mean that we go in circles.
const ROUNDS_MOST: usize = 40;
/// Cut a little deeper than the excess, so that rounding does not bring it back.
const CUT_EXTRA_M3: f64 = 1.0;

pub(crate) fn feasible(problem: &mut Problem) -> Path {
    for _ in 0..ROUNDS_MOST {
        let path = walk(problem, &problem.solve());
        let Some(excess) = first_excess(problem, &path) else { return path };
        cut(problem, &path, &excess);
    }
    // Not repaired: a plan that releases nothing breaks no cap.
    problem.windows.clear();
    walk(problem, &problem.solve())
}

struct Excess {
    window: usize,
    m3: f64,
    clause: ClauseId,
}

/// What of a piece with an even flow lies in a window.
fn part_m3(piece: &Window, volume_m3: f64, window: &Window) -> f64 {
    let share = |w: Window| w.length().as_seconds() / piece.length().as_seconds();
    piece.intersect(window).map_or(0.0, |w| volume_m3 * share(w))
}

fn sum_m3(path: &Path, cap: &LongCap, window: &Window) -> f64 {
    let past: f64 = cap.past.iter().map(|(w, v)| part_m3(w, v.get(), window)).sum();
    let planned: f64 = path.steps.iter().map(|s| part_m3(&s.slot, s.released_m3, window)).sum();
    past + planned
}

fn cap_window(cap: &LongCap, at: Utc) -> Option<Window> {
    match cap.kind {
        LongCapKind::Rolling(span) => Window::new(at - span, at).ok(),
        LongCapKind::Fixed(window) => window.contains(at).then_some(window),
    }
}

/// The first slot at whose end a cap is broken.
fn first_excess(problem: &Problem, path: &Path) -> Option<Excess> {
    for step in path.steps.iter().filter(|s| s.released_m3 > 0.0) {
        for cap in &problem.request.caps {
            let Some(whole) = cap_window(cap, step.slot.end()) else { continue };
            let Ok(so_far) = Window::new(whole.start(), step.slot.end()) else { continue };
            let m3 = sum_m3(path, cap, &so_far) - cap.volume_max.get();
            if m3 > 1e-6 {
                return Some(Excess { window: step.window, m3, clause: cap.clause });
            }
        }
    }
    None
}

/// Leaves the tide what it had released up to the excess, and no more.
fn cut(problem: &mut Problem, path: &Path, excess: &Excess) {
    let tide = problem.windows[excess.window].tide;
    let released = path.in_tide(&problem.windows, tide);
    for w in problem.windows.iter_mut().filter(|w| w.tide == tide) {
        // The whole tide's excess is not known from its first broken slot; halving towards it would
        // take rounds, so what is over at this slot is taken off what the tide released.
        let allotment = (released.min(w.allotment_m3) - excess.m3 - CUT_EXTRA_M3).max(0.0);
        w.allotment_m3 = allotment;
        w.volume_by = Some(excess.clause);
    }
}
