//! The guard: every clause against live conditions and sums, at the moment of action.
//!
//! Each hold rests on one fact that could be otherwise: put what it must be in the place of what it
//! is, and that hold is gone.

use model::{
    About, Applies, AssetId, By, Cap, Cause, Clause, ClauseKind, Fact, Forecast, Is, Lawful,
    MustBe, OnStale, Quality, RangeBand, Rounding, Sense, SignalCondition, SignalId, Site,
    Validated,
};
use units::{CubicMetres, CubicMetresPerSecond, MetresPerSecond, Span, Utc, Window};

use crate::caps::{band, governing, least};
use crate::clause_windows;
use crate::tallies::Tallies;

/// Whether water is about to move or moves already.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Phase {
    Starting,
    Running,
}

/// What the guard reads.
#[derive(Clone, Copy, Debug)]
pub struct Conditions<'a> {
    pub now: Utc,
    /// In the order of `Site::signals`; one that is missing here counts as never read.
    pub signals: &'a [Validated],
    pub forecast: Option<&'a Forecast>,
    /// Only to say when the next window is; every clause is read anew.
    pub lawful: Option<&'a Lawful>,
    pub tallies: &'a Tallies,
    /// Pieces of the last hour with the mean flow in each, m3/s, oldest first.
    pub recent_flow: &'a [(Window, f64)],
}

impl Conditions<'_> {
    fn signal(&self, id: SignalId) -> Validated {
        self.signals.get(id.index()).copied().unwrap_or(Validated::NEVER)
    }
}

/// All holds, and the caps as they stand now, each with the clause that sets it.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Guarded {
    pub causes: Vec<Cause>,
    pub flow_max: Option<Cap<CubicMetresPerSecond>>,
    /// Greatest change of flow, m3/s a minute.
    pub ramp_max_per_min: Option<Cap<CubicMetresPerSecond>>,
    /// The least of what is left of the tide, of rolling spans and of the month; below zero where
    /// more has gone than may.
    pub volume_left: Option<Cap<CubicMetres>>,
}

impl Guarded {
    fn hold(&mut self, clause: &Clause, about: About, is: Is, must_be: MustBe) {
        let fact = Fact { about, is, must_be };
        self.causes.push(Cause { by: By::Clause(clause.id), fact });
    }
    fn flow(&mut self, clause: &Clause, max: CubicMetresPerSecond) {
        self.flow_max = least(self.flow_max, Cap { max, clause: clause.id });
    }
    /// Holds when nothing is left of a volume.
    fn volume(&mut self, clause: &Clause, about: About, used: CubicMetres, max: CubicMetres) {
        let left = max - used;
        self.volume_left = least(self.volume_left, Cap { max: left, clause: clause.id });
        if left.get() <= 0.0 {
            // Just under the cap and not at it: with the cap reached, nothing may follow.
            let must = MustBe::AtMost(max.get().next_down());
            self.hold(clause, about, Is::Number(used.get()), must);
        }
    }
    fn stale(&mut self, clause: &Clause, on_stale: OnStale, about: About, is: &str) {
        match on_stale {
            OnStale::Allow => {}
            OnStale::Reduced(max) => self.flow(clause, max),
            OnStale::Hold => {
                let must = MustBe::Words("readable");
                self.hold(clause, about, Is::Words(is.to_owned()), must);
            }
        }
    }
}

/// Reads every clause that governs the asset. All holds are listed, not the first, in the order of
/// the licence; clause kinds that need a forecast hold without one, unless `on_stale` lets them.
pub fn guard(site: &Site, c: &Conditions, asset: AssetId, phase: Phase) -> Guarded {
    let mut g = Guarded::default();
    for (clause, on_stale) in governing(site, asset) {
        match &clause.kind {
            // The anchor is a prediction: there is nothing to fall back upon.
            ClauseKind::TideWindow { .. } => window(&mut g, clause, c, OnStale::Hold),
            ClauseKind::CurrentSeaward { speed_min, meter, .. } => {
                current(&mut g, clause, on_stale, *speed_min, *meter, c);
            }
            ClauseKind::Rate { flow_max, averaging, ramp_max_per_min } => {
                g.flow(clause, *flow_max);
                if let Some(max) = *ramp_max_per_min {
                    let cap = Cap { max, clause: clause.id };
                    g.ramp_max_per_min = least(g.ramp_max_per_min, cap);
                }
                let mean = mean_flow(c.recent_flow, c.now, *averaging);
                if mean > flow_max.get() {
                    let must = MustBe::AtMost(flow_max.get());
                    g.hold(clause, About::MeanFlow, Is::Number(mean), must);
                }
            }
            ClauseKind::VolumePerTide { rounding, bands } => {
                this_tide(&mut g, clause, rounding, bands, c);
            }
            ClauseKind::RollingVolume { span, volume_max } => {
                let used = c.tallies.gone_since(c.now - *span);
                g.volume(clause, About::VolumeRolling, used, *volume_max);
            }
            ClauseKind::MonthVolume { volume_max } => {
                let (start, end) = site.zone.month_of(c.now);
                let month = Window::new(start, end).expect("a month is not empty");
                let used = c.tallies.in_window(&month);
                g.volume(clause, About::VolumeMonth, used, *volume_max);
            }
            ClauseKind::SignalGate { conditions, applies } => {
                if *applies == Applies::Throughout || phase == Phase::Starting {
                    let each = conditions.iter();
                    each.for_each(|s| signal(&mut g, clause, on_stale, s, c));
                }
            }
        }
    }
    g
}

/// A good meter beats the model, both ways.
fn current(
    g: &mut Guarded,
    clause: &Clause,
    on_stale: OnStale,
    speed_min: MetresPerSecond,
    meter: Option<SignalId>,
    c: &Conditions,
) {
    match meter.and_then(|m| Some((m, c.signal(m).now()?))) {
        Some((_, v)) if v >= speed_min.get() => {}
        Some((m, v)) => {
            let must = MustBe::AtLeast(speed_min.get());
            g.hold(clause, About::Signal(m), Is::Number(v), must);
        }
        // The model says nothing outside the span that it was made for.
        None if c.forecast.is_some_and(|f| !f.span.contains(c.now)) => {
            g.stale(clause, on_stale, About::Forecast, "a forecast that does not reach to now");
        }
        None => window(g, clause, c, on_stale),
    }
}

/// A clause that is a window: inside it now, or the next one is what the time must come to.
fn window(g: &mut Guarded, clause: &Clause, c: &Conditions, on_stale: OnStale) {
    let Some(forecast) = c.forecast else {
        return g.stale(clause, on_stale, About::Forecast, "no forecast");
    };
    let Some(set) = clause_windows::of(clause, forecast) else {
        return g.stale(clause, on_stale, About::Forecast, "nothing modelled for this clause");
    };
    if set.windows.contains(c.now) {
        return;
    }
    match set.windows.next_after(c.now) {
        Some(next) => g.hold(clause, About::Now, Is::Instant(c.now), MustBe::Inside(*next)),
        None => g.stale(clause, OnStale::Hold, About::Forecast, "no window in the forecast"),
    }
}

/// What is left of this tide; a nil tide holds until it is over.
fn this_tide(
    g: &mut Guarded,
    clause: &Clause,
    rounding: &Rounding,
    bands: &[RangeBand],
    c: &Conditions,
) {
    let Some(tide) = c.forecast.and_then(|f| f.tide_at(c.now)) else {
        return g.stale(clause, OnStale::Hold, About::Forecast, "no tide known");
    };
    match band(rounding, bands, tide.ebb_range).filter(|b| b.volume_max.get() > 0.0) {
        None => {
            let cap = Cap { max: CubicMetres::ZERO, clause: clause.id };
            g.volume_left = least(g.volume_left, cap);
            let next = c.lawful.and_then(|l| l.next_after(tide.window.end() - Span::micros(1)));
            let must = next.map_or(MustBe::After(tide.window.end()), |w| MustBe::Inside(w.window));
            g.hold(clause, About::Now, Is::Instant(c.now), must);
        }
        Some(b) => {
            let used = c.tallies.in_tide(tide.number);
            g.volume(clause, About::VolumeThisTide, used, b.volume_max);
            if let Some(max) = b.flow_max {
                g.flow(clause, max);
            }
        }
    }
}

fn signal(
    g: &mut Guarded,
    clause: &Clause,
    on_stale: OnStale,
    s: &SignalCondition,
    c: &Conditions,
) {
    let about = About::Signal(s.signal);
    let reading = c.signal(s.signal);
    match reading.within(s.age_max) {
        None => g.stale(clause, on_stale, about, &unreadable(&reading, s.age_max)),
        Some(v) => {
            let (met, must) = match s.sense {
                Sense::AtMost => (v <= s.limit, MustBe::AtMost(s.limit)),
                Sense::AtLeast => (v >= s.limit, MustBe::AtLeast(s.limit)),
            };
            if !met {
                g.hold(clause, about, Is::Number(v), must);
            }
        }
    }
}

/// Why a reading does not count for a clause: its own fault, or its age, whose limit here is the
/// clause's and not the signal's.
fn unreadable(reading: &Validated, age_max: Span) -> String {
    match (reading.quality, reading.good) {
        (Quality::Good | Quality::Stale, Some(g)) => {
            format!("{} old, over the clause's {age_max}", g.age)
        }
        (quality, _) => quality.words().to_owned(),
    }
}

/// Mean over (now - span, now]; time of which nothing is known counts as no flow.
fn mean_flow(pieces: &[(Window, f64)], now: Utc, span: Span) -> f64 {
    let Ok(window) = Window::new(now - span, now) else { return 0.0 };
    let volume = |(piece, flow): &(Window, f64)| {
        piece.intersect(&window).map_or(0.0, |w| w.length().as_seconds() * flow)
    };
    pieces.iter().map(volume).sum::<f64>() / span.as_seconds()
}
