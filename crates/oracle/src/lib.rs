//! **Was the run lawful and safe, by the plant's own record?**
//!
//! An independent judge, written from the constraint list and not from the code that is judged: it
//! knows `units` alone and shares nothing with planner, licence, interlock or engine. It reads what
//! the plant wrote down (levels, flows, positions, commands received, leases, rests) and what was
//! allowed, and gives findings and sums. It is reached from tests only.
//!
//! ```
//! // Acknowledged and gone is what must never be.
//! assert_eq!(oracle::lost(&[1, 2, 3], &[1, 3, 4]), [2]);
//! ```

mod foresight;
mod leases;
mod record;
pub mod strict;
mod volumes;
mod water;

pub use foresight::{Capacity, most_movable_m3};
pub use record::{Allowed, Event, Finding, Kind, Rule, Rules, Sample};

/// Everything that the judge found, in order of time, and the sums.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Judgement {
    pub findings: Vec<Finding>,
    pub releases: usize,
    pub released_m3: f64,
    /// Water through the ports while it was not allowed.
    pub outside_m3: f64,
    pub spilled_m3: f64,
    pub avoidable_spill_m3: f64,
}

impl Judgement {
    pub fn of(&self, rule: Rule) -> usize {
        self.findings.iter().filter(|f| f.rule == rule).count()
    }
}

/// Judges a run. Samples and events are in order of time.
pub fn judge(samples: &[Sample], events: &[Event], rules: &Rules) -> Judgement {
    let mut j = Judgement::default();
    water::judge(samples, rules, &mut j);
    volumes::judge(samples, rules, &mut j);
    leases::judge(samples, events, rules, &mut j);
    j.findings.sort_by_key(|f| f.at);
    j
}

/// Acknowledged numbers that the record does not hold.
pub fn lost(acknowledged: &[u64], rows: &[u64]) -> Vec<u64> {
    let mut rows = rows.to_vec();
    rows.sort_unstable();
    acknowledged.iter().copied().filter(|n| rows.binary_search(n).is_err()).collect()
}

#[cfg(test)]
mod tests;
