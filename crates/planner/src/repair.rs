//! Caps over more than one tide, repaired to feasible. The forward pass never breaks one; but the
//! programme did not know that a later tide would have less. So it is told what each tide had, and
//! solves again, and of all the trajectories (each lawful) the cheapest is kept.

use crate::forward::{Path, walk};
use crate::problem::Problem;

/// A third round changed no figure in two stretches of twenty days at Tarrow Works.
const ROUNDS_MOST: usize = 2;
/// Allotments that moved less than this are the same.
const SAME_M3: f64 = 100.0;

pub(crate) fn feasible(problem: &Problem) -> Path {
    let mut allotments: Vec<f64> = problem.periods.iter().map(|p| p.allotment_m3).collect();
    let mut best: Option<Path> = None;
    for _ in 0..ROUNDS_MOST {
        let path = walk(problem, &problem.solve(&allotments));
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
