//! Caps over more than one tide, repaired to feasible. The forward pass never breaks one; but the
//! programme did not know that a later tide would have less. So it is told what each tide had, and
//! solves again. Where water still spills while such a cap binds, tides are held back one by one, so
//! that a later one has more. Of all the trajectories (each lawful) the cheapest is kept.

use model::ClauseId;

use crate::forward::{Does, Idle, Path, walk};
use crate::problem::Problem;
use crate::throttle::Bound;

/// A third round changed no figure in two stretches of twenty days at Tarrow Works.
const ROUNDS_MOST: usize = 2;
/// Allotments that moved less than this are the same.
const SAME_M3: f64 = 100.0;
/// What a tide is held back to, as shares of what it released, one try each.
const HELD_TO: [f64; 3] = [0.4, 0.65, 0.85];
/// Tries in all: as many as half a second has time for.
const TRIES_MOST: usize = 24;
/// A spill that is not worth trying for.
const SPILL_LEAST_M3: f64 = 5.0;

pub(crate) fn feasible(problem: &Problem) -> Path {
    let mut limits: Vec<f64> = problem.periods.iter().map(|p| p.allotment_m3).collect();
    let mut best = repaired(problem, &limits);
    let mut tries = 0;
    for n in 0..problem.periods.len() {
        for share in HELD_TO {
            if !spills_by_a_long_cap(problem, &best) || tries == TRIES_MOST {
                return best;
            }
            let mut held = limits.clone();
            held[n] = best.in_period(n) * share;
            tries += 1;
            let path = walk(problem, &problem.solve(&held), &held);
            if path.cost < best.cost {
                (best, limits) = (path, held);
            }
        }
    }
    best
}

fn repaired(problem: &Problem, limits: &[f64]) -> Path {
    let mut allotments = limits.to_vec();
    let mut best: Option<Path> = None;
    for _ in 0..ROUNDS_MOST {
        let path = walk(problem, &problem.solve(&allotments), limits);
        let had: Vec<f64> = path.allotments.iter().map(|a| a.0).collect();
        let same = had.iter().zip(&allotments).all(|(a, b)| a >= b || (b - a) < SAME_M3);
        if best.as_ref().is_none_or(|b| path.cost < b.cost) {
            best = Some(path);
        }
        if same {
            break;
        }
        allotments = had;
    }
    best.expect("at least one round is made")
}

/// Whether water spills, and before its end a cap over more than one tide kept a release down.
fn spills_by_a_long_cap(problem: &Problem, path: &Path) -> bool {
    let spilled: f64 = path.spills.iter().map(|s| s.2).sum();
    let Some((_, end, _)) = path.spills.last().filter(|_| spilled > SPILL_LEAST_M3) else {
        return false;
    };
    let long = |clause: ClauseId| problem.request.caps.iter().any(|c| c.clause == clause);
    path.steps.iter().filter(|s| s.slot.start() < *end).any(|s| match s.does {
        Does::Idle(Idle::Used(clause)) => long(clause),
        Does::Release { bound: Bound::Volume(clause), .. } => long(clause),
        _ => false,
    })
}
