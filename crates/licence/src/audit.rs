//! Looking back: which clause of a volume kind did a list of releases break?

use core::fmt;

use model::{AssetId, Clause, ClauseId, ClauseKind, RangeBand, Rounding, Site, TideNumber};
use units::{CubicMetres, Metres, Span, Utc, Window};

use crate::caps::{band, governing};
use crate::tallies::Tallies;

/// One volume over what a clause allows.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Breach {
    pub clause: ClauseId,
    pub over: Over,
    pub used: CubicMetres,
    pub max: CubicMetres,
}

/// What the volume was summed over.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Over {
    Tide(TideNumber),
    /// A tide whose range is not known counts as nil.
    TideOfUnknownRange(TideNumber),
    /// The worst instant: (t - span, t].
    SpanTo(Utc),
    Month(Window),
}

impl fmt::Display for Breach {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self { over, used, max, .. } = self;
        write!(f, "{used:.0} went where {max:.0} may, ")?;
        match over {
            Over::Tide(n) => write!(f, "on tide {n}"),
            Over::TideOfUnknownRange(n) => write!(f, "on tide {n}, whose range is not known"),
            Over::SpanTo(t) => write!(f, "in the span that ended at {t}"),
            Over::Month(w) => write!(f, "in the month of {w}"),
        }
    }
}

/// A volume that rounding alone put over its cap is not over it, m3.
const FORGIVEN_M3: f64 = 1e-6;

/// Every breach of a volume clause that governs the asset, in the licence's order: each tide and
/// each month that is over, and of each rolling span the worst instant, the earliest of equals.
///
/// `done` are windows with the volume that ran in each and its tide; `ranges` the ebb range of each
/// tide at the port, unrounded. No forecast enters, and windows, rates and signals are not judged.
pub fn audit(
    site: &Site,
    asset: AssetId,
    done: &[(Window, CubicMetres, TideNumber)],
    ranges: &[(TideNumber, Metres)],
) -> Vec<Breach> {
    let mut sums = Tallies::default();
    done.iter().for_each(|(w, volume, tide)| sums.spread(*w, *volume, *tide));
    let mut breaches = Vec::new();
    for (clause, _) in governing(site, asset) {
        match &clause.kind {
            ClauseKind::VolumePerTide { rounding, bands } => {
                tides(clause, rounding, bands, &sums, ranges, &mut breaches);
            }
            ClauseKind::RollingVolume { span, volume_max } => {
                breaches.extend(rolling(clause, *span, *volume_max, &sums));
            }
            ClauseKind::MonthVolume { volume_max } => {
                months(site, clause, *volume_max, &sums, &mut breaches);
            }
            _ => {}
        }
    }
    breaches
}

fn breach(clause: &Clause, over: Over, used: CubicMetres, max: CubicMetres) -> Option<Breach> {
    let is_over = used.get() > max.get() + FORGIVEN_M3;
    is_over.then_some(Breach { clause: clause.id, over, used, max })
}

fn tides(
    clause: &Clause,
    rounding: &Rounding,
    bands: &[RangeBand],
    sums: &Tallies,
    ranges: &[(TideNumber, Metres)],
    breaches: &mut Vec<Breach>,
) {
    let mut numbers: Vec<TideNumber> = sums.pieces().map(|(_, tide)| tide).collect();
    numbers.sort_unstable();
    numbers.dedup();
    for n in numbers {
        let range = ranges.iter().find(|(tide, _)| *tide == n).map(|(_, range)| *range);
        let band = range.and_then(|r| band(rounding, bands, r));
        let max = band.map_or(CubicMetres::ZERO, |b| b.volume_max);
        let over = if range.is_some() { Over::Tide(n) } else { Over::TideOfUnknownRange(n) };
        breaches.extend(breach(clause, over, sums.in_tide(n), max));
    }
}

/// Between the ends of buckets, and a span after their starts, the sum moves straight: its greatest
/// value is at one of these.
fn rolling(clause: &Clause, span: Span, max: CubicMetres, sums: &Tallies) -> Option<Breach> {
    let mut worst: Option<Breach> = None;
    let mut instants: Vec<Utc> =
        sums.pieces().flat_map(|(w, _)| [w.end(), w.start() + span]).collect();
    instants.sort_unstable();
    instants.dedup();
    for at in instants {
        let used = sums.rolling(span, at);
        let more = worst.is_none_or(|w| used > w.used);
        worst = breach(clause, Over::SpanTo(at), used, max).filter(|_| more).or(worst);
    }
    worst
}

fn months(
    site: &Site,
    clause: &Clause,
    max: CubicMetres,
    sums: &Tallies,
    breaches: &mut Vec<Breach>,
) {
    let mut after: Option<Utc> = None;
    for (bucket, _) in sums.pieces() {
        if after.is_some_and(|end| bucket.start() < end) {
            continue;
        }
        let (start, end) = site.zone.month_of(bucket.start());
        let month = Window::new(start, end).expect("a month is not empty");
        breaches.extend(breach(clause, Over::Month(month), sums.in_window(&month), max));
        after = Some(end);
    }
}
