//! **May this reading be used, and if not, why?**
//!
//! Turns raw readings into validated signals: a number, in range, not faster than it can change,
//! alive and young, or else a quality that says which of these it is not. It never invents a value
//! and never votes between signals; a decision that rests on a signal says what a bad one means.
//!
//! ```
//! use model::Quality;
//! # use model::{Reading, Signal, SignalId, AdapterId};
//! # use units::{Span, Utc};
//! # let spec = Signal { id: SignalId(0), name: "level".into(), adapter: AdapterId(0),
//! #   point: "level".into(), unit: "m".into(), value_min: 0.0, value_max: 10.0,
//! #   rate_max_per_s: None, age_max: Span::seconds(60), frozen_after: None };
//! let mut signals = signals::Validator::for_signals(vec![spec]);
//! let t = Utc::EPOCH;
//! signals.take(&Reading { signal: SignalId(0), value: 4.2, source_good: true, at: t }, t);
//! assert_eq!(signals.state(SignalId(0), t).now(), Some(4.2));
//! assert_eq!(signals.state(SignalId(0), t + Span::seconds(61)).quality, Quality::Stale);
//! ```

mod track;

use model::{Quality, Reading, Signal, SignalId, Site, Validated};
use units::Utc;

use crate::track::Track;

/// All signals of a site, each with what is known of it.
#[derive(Clone, PartialEq, Debug)]
pub struct Validator {
    specs: Vec<Signal>,
    tracks: Vec<Track>,
}

impl Validator {
    pub fn new(site: &Site) -> Self {
        Self::for_signals(site.signals.clone())
    }
    /// For these signals, in the order of their ids.
    pub fn for_signals(specs: Vec<Signal>) -> Self {
        let tracks = vec![Track::default(); specs.len()];
        Self { specs, tracks }
    }
    /// Takes a reading in at `now`. A signal that the site does not have is ignored, and so is a
    /// sound reading no younger than the last. A reading that is not good never becomes the last
    /// good value, but says why the signal is not good until the next sound one.
    pub fn take(&mut self, reading: &Reading, now: Utc) {
        let index = reading.signal.index();
        if let (Some(spec), Some(track)) = (self.specs.get(index), self.tracks.get_mut(index)) {
            track.take(spec, reading, now);
        }
    }
    /// The signal as it may be used at `now`.
    pub fn state(&self, signal: SignalId, now: Utc) -> Validated {
        let index = signal.index();
        match (self.specs.get(index), self.tracks.get(index)) {
            (Some(spec), Some(track)) => track.state(spec, now),
            _ => Validated { quality: Quality::Missing, good: None },
        }
    }
    /// Every signal, in the order of their ids.
    pub fn all(&self, now: Utc) -> Vec<Validated> {
        let mut list = Vec::new();
        self.all_into(now, &mut list);
        list
    }
    /// As [`Validator::all`], into a list that the caller owns and uses again; what it held is gone.
    pub fn all_into(&self, now: Utc, list: &mut Vec<Validated>) {
        list.clear();
        list.extend(self.specs.iter().zip(&self.tracks).map(|(s, t)| t.state(s, now)));
    }
}
