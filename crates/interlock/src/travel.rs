//! Has the asset gone where it was told, in the time that it may take?

use units::{Percent, Span};

/// How a movement stands.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Travel {
    Arrived,
    Moving,
    /// Not there in the time that it may take: a discrepancy.
    Late,
}

/// Feedback within this much of the setting is "there" (common practice: 1 to 3 %).
const THERE_PERCENT: f64 = 2.5;
/// Reading period and transmission, on top of the stroke (common practice).
const DETECTION: Span = Span::seconds(45);

/// Judges a stroke from `from` to `to` that began `since` ago, by the position now.
///
/// The time allowed is the share of the full stroke times `factor` (1.2 to 1.5, common practice)
/// and a fixed detection time. A position that cannot be read is `Moving` until then, `Late` after.
pub fn travel(
    stroke: Span,
    factor: f64,
    from: Percent,
    to: Percent,
    since: Span,
    position_percent: Option<f64>,
) -> Travel {
    if position_percent.is_some_and(|p| (p - to.get()).abs() <= THERE_PERCENT) {
        return Travel::Arrived;
    }
    let share = (to.get() - from.get()).abs() / 100.0;
    if since > stroke.scaled(share * factor) + DETECTION { Travel::Late } else { Travel::Moving }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_stroke_is_late_only_after_its_time_and_factor() {
        let at = |s, p| {
            let (from, to) = (Percent::ZERO, Percent::of(50.0));
            travel(Span::minutes(8), 1.3, from, to, Span::seconds(s), p)
        };
        // Half of 8 min x 1.3 + 45 s = 357 s.
        assert_eq!(at(357, Some(20.0)), Travel::Moving);
        assert_eq!(at(358, Some(20.0)), Travel::Late);
        assert_eq!(at(358, None), Travel::Late);
        assert_eq!(at(10, None), Travel::Moving);
        assert_eq!(at(400, Some(48.0)), Travel::Arrived);
    }
}
