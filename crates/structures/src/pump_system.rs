//! A pump against a rising main and the tide: where the two curves meet.

use crate::bisect::crossing;
use crate::{Pipe, PumpCurve};

/// Where a pump works.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Duty {
    /// Flow of all units together.
    pub flow_m3_s: f64,
    pub head_m: f64,
}

/// The head a pump must lift before anything flows, m: to the tide or to the outlet's soffit,
/// whichever is higher. With the tide below the soffit it no longer matters.
pub fn static_head_m(sump_m: f64, outer_m: f64, soffit_m: f64) -> f64 {
    outer_m.max(soffit_m) - sump_m
}

/// The duty of `units` equal pumps side by side at `speed_share` of full speed into one pipe;
/// `None` when the static head is more than they have at no flow.
///
/// **Source**: intersection of H = H_pump(Q/units, N) with H = H_static + K Q2 (common practice;
/// pumps in parallel add flows at equal head).
pub fn duty(
    curve: &PumpCurve,
    units: u32,
    speed_share: f64,
    static_head_m: f64,
    pipe: &Pipe,
) -> Option<Duty> {
    if units == 0 || speed_share <= 0.0 || curve.head_m(0.0, speed_share) <= static_head_m {
        return None;
    }
    let per_unit = |q: f64| curve.head_m(q / f64::from(units), speed_share);
    let short = |q: f64| static_head_m + pipe.head_loss_m(q) - per_unit(q);
    // A pipe with no loss and a flat pump never meet; 1000 m3/s a unit is past any pump.
    let flow_m3_s = crossing(0.0, 1_000.0 * f64::from(units), short);
    Some(Duty { flow_m3_s, head_m: per_unit(flow_m3_s) })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::Friction;

    #[test]
    fn too_high_a_tide_gives_nothing_and_two_pumps_more_than_one() {
        let pipe = Pipe::new(0.4, 60.0, Friction::Darcy(0.022), 3.5).unwrap();
        let curve = PumpCurve::new(14.0, 90.0).unwrap();
        assert_eq!(duty(&curve, 1, 0.8, 9.0, &pipe), None);
        let one = duty(&curve, 1, 1.0, 5.0, &pipe).unwrap().flow_m3_s;
        let two = duty(&curve, 2, 1.0, 5.0, &pipe).unwrap().flow_m3_s;
        assert!(two > one && two < 2.0 * one);
    }
}
