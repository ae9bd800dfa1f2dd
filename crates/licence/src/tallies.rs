//! Sums of what was released, by 5-minute buckets of UTC. Flow belongs to its instant; a bucket is
//! counted whole by its start for a tide and a month, and by its overlap for a rolling span.

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

/// Two months and a day: no clause that is read here looks further back.
const KEPT: Span = Span::days(63);

impl Tallies {
    /// Adds to the bucket, which keeps the tide that it had first. Old buckets are dropped.
    pub fn add(&mut self, window: Window, volume: CubicMetres, tide: TideNumber) {
        let volume_m3 = volume.get();
        let at = self.list.partition_point(|b| b.window.start() < window.start());
        match self.list.get_mut(at).filter(|b| b.window == window) {
            Some(bucket) => bucket.volume_m3 += volume_m3,
            None => self.list.insert(at, Bucket { window, volume_m3, tide }),
        }
        let newest = self.list.last().map_or(window.end(), |b| b.window.end());
        let old = self.list.partition_point(|b| b.window.end() < newest - KEPT);
        self.list.drain(..old);
    }
    pub fn in_tide(&self, tide: TideNumber) -> CubicMetres {
        let of_tide = self.list.iter().filter(|b| b.tide == tide);
        CubicMetres::of(of_tide.map(|b| b.volume_m3).sum())
    }
    /// Of buckets that start in the window.
    pub fn in_window(&self, window: &Window) -> CubicMetres {
        let inside = self.list.iter().filter(|b| window.contains(b.window.start()));
        CubicMetres::of(inside.map(|b| b.volume_m3).sum())
    }
    /// In (at - span, at], the buckets at the edges by their share.
    pub fn rolling(&self, span: Span, at: Utc) -> CubicMetres {
        let Ok(window) = Window::new(at - span, at) else { return CubicMetres::ZERO };
        let from = self.list.partition_point(|b| b.window.end() <= window.start());
        let share = |b: &Bucket| match b.window.intersect(&window) {
            Some(part) => b.volume_m3 * part.length().as_seconds() / b.window.length().as_seconds(),
            None => 0.0,
        };
        CubicMetres::of(self.list[from..].iter().map(share).sum())
    }
    /// Buckets that end after `from`, in order.
    pub fn since(&self, from: Utc) -> Vec<(Window, CubicMetres)> {
        let at = self.list.partition_point(|b| b.window.end() <= from);
        self.list[at..].iter().map(|b| (b.window, CubicMetres::of(b.volume_m3))).collect()
    }
    /// The tide of the newest bucket.
    pub fn last_tide(&self) -> Option<TideNumber> {
        self.list.last().map(|b| b.tide)
    }
}
