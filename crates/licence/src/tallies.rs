//! Sums of what was released, by 5-minute buckets of UTC and by tide. Flow belongs to its instant:
//! what is added is spread over the buckets that it ran through, and a bucket that low water cuts
//! is kept once for each of the two tides.

use model::TideNumber;
use units::{CubicMetres, Span, Utc, Window};

#[derive(Clone, Copy, PartialEq, Debug)]
struct Bucket {
    window: Window,
    volume_m3: f64,
    tide: TideNumber,
}

/// Everything released in the last months, in order, sparse: buckets without flow are absent.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Tallies {
    list: Vec<Bucket>,
}

const BUCKET: Span = Span::minutes(5);

/// Two months of flow without a pause, over twice the longest span and month that a clause may
/// have. A count and not an age: one stamp far ahead, from a clock that jumped, must not empty the
/// sums.
const BUCKETS_MAX: usize = 63 * 24 * 12;

impl Tallies {
    /// Adds a volume that ran evenly through the window, on this tide. A volume below zero counts
    /// as none: backflow earns no allowance. The oldest buckets go when there are too many.
    pub fn add(&mut self, window: Window, volume: CubicMetres, tide: TideNumber) {
        self.spread(window, volume, tide);
        let too_many = self.list.len().saturating_sub(BUCKETS_MAX);
        self.list.drain(..too_many);
    }
    /// As `add`, and nothing is dropped: for judging a past span as a whole.
    pub(crate) fn spread(&mut self, window: Window, volume: CubicMetres, tide: TideNumber) {
        let per_s = volume.get().max(0.0) / window.length().as_seconds();
        let mut start = window.start().floor_to(BUCKET);
        while start < window.end() {
            let bucket = Window::new(start, start + BUCKET).expect("a bucket is not empty");
            let part = bucket.intersect(&window).expect("a bucket that the window reaches");
            // The whole volume where the bucket holds all of it, so that nothing is rounded.
            let whole = part == window;
            let volume_m3 =
                if whole { volume.get().max(0.0) } else { per_s * part.length().as_seconds() };
            self.put(Bucket { window: bucket, volume_m3, tide });
            start = bucket.end();
        }
    }
    fn put(&mut self, new: Bucket) {
        let key = |b: &Bucket| (b.window.start(), b.tide);
        match self.list.binary_search_by_key(&key(&new), key) {
            Ok(at) => self.list[at].volume_m3 += new.volume_m3,
            Err(at) => self.list.insert(at, new),
        }
    }
    /// Drops the buckets that ended at or before this instant.
    pub fn prune(&mut self, before: Utc) {
        self.list.drain(..self.first_after(before));
    }
    pub fn in_tide(&self, tide: TideNumber) -> CubicMetres {
        sum(self.list.iter().filter(|b| b.tide == tide).map(|b| b.volume_m3))
    }
    /// Of buckets that start in the window.
    pub fn in_window(&self, window: &Window) -> CubicMetres {
        let from = self.list.partition_point(|b| b.window.start() < window.start());
        let to = self.list.partition_point(|b| b.window.start() < window.end());
        sum(self.list[from..to].iter().map(|b| b.volume_m3))
    }
    /// In (at - span, at], the buckets at both edges by their share: for looking back at a past
    /// instant. What counts now is [`Tallies::gone_since`].
    pub fn rolling(&self, span: Span, at: Utc) -> CubicMetres {
        let Ok(window) = Window::new(at - span, at) else { return CubicMetres::ZERO };
        let ahead = self.list.partition_point(|b| b.window.start() < at);
        let from = self.first_after(window.start()).min(ahead);
        sum(self.list[from..ahead].iter().map(|b| share_m3(b, &window)))
    }
    /// All that is known to have gone since `from`, the bucket that holds `from` by its share.
    ///
    /// There is no end to it: a bucket that is still running holds nothing but water that has gone
    /// already, and so does one stamped ahead by a clock that has since gone back.
    pub fn gone_since(&self, from: Utc) -> CubicMetres {
        let share = |b: &Bucket| {
            let after = Window::new(from, b.window.end()).expect("the bucket ends after it");
            share_m3(b, &after)
        };
        sum(self.list[self.first_after(from)..].iter().map(share))
    }
    /// Buckets that end after `from`, in order.
    pub fn since(&self, from: Utc) -> Vec<(Window, CubicMetres)> {
        let later = self.list[self.first_after(from)..].iter();
        later.map(|b| (b.window, CubicMetres::of(b.volume_m3))).collect()
    }
    /// The tide of the newest bucket.
    pub fn last_tide(&self) -> Option<TideNumber> {
        self.list.last().map(|b| b.tide)
    }
    /// Where each bucket starts and ends, the tides and the volumes, in order.
    pub(crate) fn pieces(&self) -> impl Iterator<Item = (Window, TideNumber)> {
        self.list.iter().map(|b| (b.window, b.tide))
    }
    fn first_after(&self, from: Utc) -> usize {
        self.list.partition_point(|b| b.window.end() <= from)
    }
}

fn share_m3(b: &Bucket, window: &Window) -> f64 {
    match b.window.intersect(window) {
        Some(part) if part == b.window => b.volume_m3,
        Some(part) => b.volume_m3 * part.length().as_seconds() / b.window.length().as_seconds(),
        None => 0.0,
    }
}

/// From zero upward: the sum of nothing is 0 and not -0.
fn sum(parts: impl Iterator<Item = f64>) -> CubicMetres {
    CubicMetres::of(parts.fold(0.0, |a, b| a + b))
}
