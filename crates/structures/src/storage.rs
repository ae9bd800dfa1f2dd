//! Storage: how much water stands below a level, straight between surveyed points.

use crate::StructureError;

/// A level-volume curve, piecewise linear both ways.
///
/// Above the last point the last piece goes on straight, so that a storage that overtops its survey
/// still holds its water; below the first point there is nothing: the level stays at the first
/// point's and the volume at its volume.
///
/// **Source**: linear interpolation of a surveyed capacity table (common practice).
#[derive(Clone, PartialEq, Debug)]
pub struct StorageCurve {
    points: Vec<(f64, f64)>,
}

impl StorageCurve {
    /// From (level in m above datum, volume in m3) points, both strictly rising, two or more.
    pub fn new(points: &[(f64, f64)]) -> Result<Self, StructureError> {
        if points.len() < 2 {
            return Err(StructureError::CurveTooShort { points: points.len() });
        }
        for (index, (level_m, volume_m3)) in points.iter().copied().enumerate() {
            let rises = level_m.is_finite()
                && volume_m3.is_finite()
                && (index == 0
                    || (level_m > points[index - 1].0 && volume_m3 > points[index - 1].1));
            if !rises {
                return Err(StructureError::CurveNotRising { index, level_m, volume_m3 });
            }
        }
        Ok(Self { points: points.to_vec() })
    }
    pub fn points(&self) -> &[(f64, f64)] {
        &self.points
    }
    /// Lowest level of the curve, m.
    pub fn floor_m(&self) -> f64 {
        self.points[0].0
    }
    /// Volume below `level_m`, m3.
    pub fn volume_m3(&self, level_m: f64) -> f64 {
        let ((l0, v0), (l1, v1)) = self.piece(|p| p.0 <= level_m);
        if level_m <= l0 { v0 } else { v0 + (v1 - v0) * ((level_m - l0) / (l1 - l0)) }
    }
    /// Level at which `volume_m3` stands, m.
    pub fn level_m(&self, volume_m3: f64) -> f64 {
        let ((l0, v0), (l1, v1)) = self.piece(|p| p.1 <= volume_m3);
        if volume_m3 <= v0 { l0 } else { l0 + (l1 - l0) * ((volume_m3 - v0) / (v1 - v0)) }
    }
    /// Water surface at `level_m`, m2: the slope of the curve just above that level.
    pub fn area_m2(&self, level_m: f64) -> f64 {
        let ((l0, v0), (l1, v1)) = self.piece(|p| p.0 <= level_m);
        (v1 - v0) / (l1 - l0)
    }
    /// The piece whose start is the last point that is `reached`; the first or last piece outside.
    fn piece(&self, reached: impl Fn(&(f64, f64)) -> bool) -> ((f64, f64), (f64, f64)) {
        let n = self.points.partition_point(reached);
        let start = n.saturating_sub(1).min(self.points.len() - 2);
        (self.points[start], self.points[start + 1])
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn a_curve_must_rise_and_names_the_point() {
        assert_eq!(
            StorageCurve::new(&[(0.0, 1.0)]),
            Err(StructureError::CurveTooShort { points: 1 })
        );
        let bad = StorageCurve::new(&[(0.0, 0.0), (1.0, 5.0), (1.5, 5.0)]);
        assert!(matches!(bad, Err(StructureError::CurveNotRising { index: 2, .. })));
        let nan = StorageCurve::new(&[(0.0, 0.0), (f64::NAN, 5.0)]);
        assert!(matches!(nan, Err(StructureError::CurveNotRising { index: 1, .. })));
    }

    /// The lagoon of the scenario: 7,000 m2 with vertical sides from 3.40 to 6.60 is 22,400 m3.
    #[test]
    fn vertical_sides_go_on_above_and_nothing_is_below() {
        let c = StorageCurve::new(&[(3.40, 0.0), (6.60, 22_400.0)]).unwrap();
        assert!((c.volume_m3(6.70) - 23_100.0).abs() < 1e-8);
        assert!((c.level_m(23_100.0) - 6.70).abs() < 1e-12);
        assert_eq!((c.volume_m3(3.0), c.level_m(-5.0)), (0.0, 3.40));
        assert!((c.area_m2(5.0) - 7_000.0).abs() < 1e-8);
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        #[test]
        fn prop_level_and_volume_are_inverses(
            steps in proptest::collection::vec((0.01f64..2.0, 1.0f64..5_000.0), 1..8),
            share in 0.0f64..1.5,
        ) {
            let mut points = vec![(-2.0, 10.0)];
            for (dl, dv) in steps {
                let (l, v) = points[points.len() - 1];
                points.push((l + dl, v + dv));
            }
            let c = StorageCurve::new(&points).unwrap();
            let top = points[points.len() - 1].0;
            let level_m = -2.0 + share * (top + 2.0);
            prop_assert!((c.level_m(c.volume_m3(level_m)) - level_m).abs() < 1e-9);
        }
    }
}
