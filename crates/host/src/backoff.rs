//! How long to wait before an adapter is started again.

use std::collections::VecDeque;
use std::time::Duration;

/// 0.2 s doubling to 30 s; after 5 deaths within a minute it is quarantined for 5 minutes.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Backoff {
    /// Deaths, on any clock that only grows.
    deaths: VecDeque<Duration>,
    doublings: u32,
}

const FIRST: Duration = Duration::from_millis(200);
const MOST: Duration = Duration::from_secs(30);
const INTENSITY: usize = 5;
const PERIOD: Duration = Duration::from_secs(60);
const QUARANTINE: Duration = Duration::from_secs(300);

/// What follows a death.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Wait {
    pub span: Duration,
    pub quarantined: bool,
}

impl Backoff {
    /// It was up and well for long enough that earlier deaths say nothing.
    pub fn well(&mut self) {
        self.doublings = 0;
    }
    pub fn died(&mut self, now: Duration) -> Wait {
        self.deaths.push_back(now);
        while self.deaths.front().is_some_and(|t| now.saturating_sub(*t) > PERIOD) {
            self.deaths.pop_front();
        }
        if self.deaths.len() >= INTENSITY {
            self.deaths.clear();
            self.doublings = 0;
            return Wait { span: QUARANTINE, quarantined: true };
        }
        let span = FIRST.saturating_mul(1 << self.doublings.min(8)).min(MOST);
        self.doublings += 1;
        Wait { span, quarantined: false }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_waits_longer_each_time_and_not_for_ever() {
        let mut b = Backoff::default();
        let spans: Vec<_> = (0..12).map(|n| b.died(Duration::from_secs(n * 61)).span).collect();
        assert_eq!(spans[..4], [200, 400, 800, 1600].map(Duration::from_millis));
        assert!(spans[8..].iter().all(|s| *s == MOST));
        b.well();
        assert_eq!(b.died(Duration::from_secs(9999)).span, FIRST);
    }

    #[test]
    fn five_deaths_in_a_minute_are_quarantined() {
        let mut b = Backoff::default();
        let waits: Vec<_> = (0..5).map(|n| b.died(Duration::from_secs(n * 10))).collect();
        assert!(waits[..4].iter().all(|w| !w.quarantined));
        assert_eq!(waits[4], Wait { span: QUARANTINE, quarantined: true });
    }
}
