//! Caps: on flow, on its change, on volume by range, and over longer spans.

use model::{
    AssetId, Cap, Clause, ClauseKind, LongCap, LongCapKind, OnStale, RangeBand, Rounding, Site,
};
use units::{CubicMetresPerSecond, Metres, Span, Utc, Window};

use crate::Tallies;

/// Clauses that govern the asset, in the licence's order, with what each means when unreadable.
pub(crate) fn governing(site: &Site, asset: AssetId) -> impl Iterator<Item = (&Clause, OnStale)> {
    site.licence.clauses.iter().filter_map(move |clause| {
        let governed = clause.governs.iter().find(|g| g.asset == asset)?;
        Some((clause, governed.on_stale))
    })
}

/// The smaller cap; of equal ones, the first.
pub(crate) fn least<T: Copy + PartialOrd>(a: Option<Cap<T>>, b: Cap<T>) -> Option<Cap<T>> {
    match a {
        Some(a) if a.max <= b.max => Some(a),
        _ => Some(b),
    }
}

/// The least flow cap of the asset's rate clauses.
pub fn flow_cap(site: &Site, asset: AssetId) -> Option<Cap<CubicMetresPerSecond>> {
    governing(site, asset).fold(None, |cap, (clause, _)| match clause.kind {
        ClauseKind::Rate { flow_max, .. } => least(cap, Cap { max: flow_max, clause: clause.id }),
        _ => cap,
    })
}

/// The least cap on a change of flow, m3/s a minute.
pub fn ramp_cap(site: &Site, asset: AssetId) -> Option<Cap<CubicMetresPerSecond>> {
    governing(site, asset).fold(None, |cap, (clause, _)| match clause.kind {
        ClauseKind::Rate { ramp_max_per_min: Some(max), .. } => {
            least(cap, Cap { max, clause: clause.id })
        }
        _ => cap,
    })
}

/// A range in whole steps, halves upward. A billionth of a step is forgiven, so that a range which
/// binary fractions put a hair under a half still counts as that half.
pub fn rounded(range: Metres, step: Metres) -> i64 {
    (range.get() / step.get() + 0.5 + 1e-9).floor() as i64
}

/// The rounded range in metres.
pub(crate) fn rounded_m(range: Metres, rounding: &Rounding) -> Metres {
    let step_m = rounding.step.get();
    let steps = rounded(range, rounding.step) as f64;
    let steps_per_m = (1.0 / step_m).round();
    // Divide where a metre has whole steps: 21 / 10 is 2.1 where 21 x 0.1 is not.
    let whole = (steps_per_m * step_m - 1.0).abs() < 1e-9;
    Metres::of(if whole { steps / steps_per_m } else { steps * step_m })
}

/// The band that the rounded range falls in, in whatever order they stand; `None` below them all,
/// which is nil.
pub(crate) fn band<'a>(
    rounding: &Rounding,
    bands: &'a [RangeBand],
    range: Metres,
) -> Option<&'a RangeBand> {
    let steps = rounded(range, rounding.step);
    let reached = bands.iter().filter(|b| steps >= rounded(b.range_min, rounding.step));
    reached.max_by(|a, b| a.range_min.total_cmp(&b.range_min))
}

/// Caps over more than one tide that govern the asset, with what has gone into each already.
pub fn long_caps(site: &Site, tallies: &Tallies, as_of: Utc, asset: AssetId) -> Vec<LongCap> {
    let mut caps = Vec::new();
    for (clause, _) in governing(site, asset) {
        match clause.kind {
            ClauseKind::RollingVolume { span, volume_max } => caps.push(LongCap {
                clause: clause.id,
                kind: LongCapKind::Rolling(span),
                volume_max,
                past: tallies.since(as_of - span),
            }),
            ClauseKind::MonthVolume { volume_max } => {
                let (start, end) = site.zone.month_of(as_of);
                let (_, next_end) = site.zone.month_of(end + Span::hours(1));
                for (from, to) in [(start, end), (end, next_end)] {
                    let window = Window::new(from, to).expect("a month is not empty");
                    caps.push(LongCap {
                        clause: clause.id,
                        kind: LongCapKind::Fixed(window),
                        volume_max,
                        past: tallies.since(from),
                    });
                }
            }
            _ => {}
        }
    }
    caps
}
