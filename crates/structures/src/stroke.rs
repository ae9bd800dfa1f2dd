//! The stroke of a gate: its position moves at one rate, whatever the water does.

use crate::StructureError;
use crate::error::positive;

/// A drive that takes a fixed time for the whole stroke.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Stroke {
    full_s: f64,
}

impl Stroke {
    /// `full_s`: seconds from shut to fully open.
    pub fn new(full_s: f64) -> Result<Self, StructureError> {
        Ok(Self { full_s: positive("full stroke time_s", full_s)? })
    }
    /// Where a gate at `position_share` stands after `elapsed_s` on its way to `target_share`
    /// (all shares 0 to 1; a target outside is taken as the nearer end).
    ///
    /// **Source**: constant-speed actuator (common practice for electric penstock drives).
    pub fn moved(&self, position_share: f64, target_share: f64, elapsed_s: f64) -> f64 {
        let target = target_share.clamp(0.0, 1.0);
        let reach = elapsed_s.max(0.0) / self.full_s;
        if (target - position_share).abs() <= reach {
            target
        } else {
            position_share + reach.copysign(target - position_share)
        }
    }
    /// Seconds from one position to another.
    pub fn time_s(&self, from_share: f64, to_share: f64) -> f64 {
        (to_share.clamp(0.0, 1.0) - from_share.clamp(0.0, 1.0)).abs() * self.full_s
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_gate_moves_at_its_rate_and_stops_on_its_target() {
        let s = Stroke::new(480.0).unwrap();
        assert_eq!(s.moved(0.0, 0.5, 120.0), 0.25);
        assert_eq!(s.moved(0.25, 0.5, 500.0), 0.5);
        assert_eq!(s.moved(0.5, 0.0, 120.0), 0.25);
        assert_eq!(s.moved(0.5, -3.0, 1e6), 0.0);
        assert_eq!(s.time_s(0.5, 0.0), 240.0);
        assert!(Stroke::new(0.0).is_err());
    }
}
