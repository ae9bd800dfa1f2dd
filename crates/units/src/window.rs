//! Half-open windows `[start, end)` of UTC and sets of them.

use core::fmt;

use crate::time::{Span, Utc};

/// `[start, end)`, never empty: the start belongs to it, the end does not.
#[derive(Clone, Copy, PartialEq, Eq, Hash, Debug)]
pub struct Window {
    start: Utc,
    end: Utc,
}

/// A window that would not start before it ends.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct EmptyWindow {
    pub start: Utc,
    pub end: Utc,
}

impl fmt::Display for EmptyWindow {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "a window must end after it starts, but {} is not after {}", self.end, self.start)
    }
}
impl std::error::Error for EmptyWindow {}

impl Window {
    pub fn new(start: Utc, end: Utc) -> Result<Self, EmptyWindow> {
        if start < end { Ok(Self { start, end }) } else { Err(EmptyWindow { start, end }) }
    }
    pub const fn start(&self) -> Utc {
        self.start
    }
    pub const fn end(&self) -> Utc {
        self.end
    }
    pub fn length(&self) -> Span {
        self.end - self.start
    }
    pub fn contains(&self, t: Utc) -> bool {
        self.start <= t && t < self.end
    }
    pub fn intersect(&self, o: &Self) -> Option<Self> {
        Self::new(self.start.max(o.start), self.end.min(o.end)).ok()
    }
    /// The window with both edges moved inwards; `None` when nothing is left.
    pub fn trimmed(&self, at_start: Span, at_end: Span) -> Option<Self> {
        Self::new(self.start + at_start, self.end - at_end).ok()
    }
}

impl fmt::Display for Window {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} to {}", self.start, self.end)
    }
}

/// A set of instants as disjoint windows in order, none touching the next.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Windows {
    list: Vec<Window>,
}

impl From<Window> for Windows {
    fn from(w: Window) -> Self {
        Self { list: vec![w] }
    }
}

impl FromIterator<Window> for Windows {
    /// Any windows in any order; those that overlap or touch become one.
    fn from_iter<I: IntoIterator<Item = Window>>(iter: I) -> Self {
        let mut all: Vec<Window> = iter.into_iter().collect();
        all.sort_by_key(|w| (w.start, w.end));
        let mut list: Vec<Window> = Vec::with_capacity(all.len());
        for w in all {
            match list.last_mut() {
                Some(last) if w.start <= last.end => last.end = last.end.max(w.end),
                _ => list.push(w),
            }
        }
        Self { list }
    }
}

impl Windows {
    pub fn none() -> Self {
        Self::default()
    }
    pub fn as_slice(&self) -> &[Window] {
        &self.list
    }
    pub fn iter(&self) -> core::slice::Iter<'_, Window> {
        self.list.iter()
    }
    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }
    pub fn total(&self) -> Span {
        self.list.iter().fold(Span::ZERO, |sum, w| sum + w.length())
    }
    /// The window that holds `t`.
    pub fn holding(&self, t: Utc) -> Option<&Window> {
        let after = self.list.partition_point(|w| w.start <= t);
        self.list[..after].last().filter(|w| w.contains(t))
    }
    pub fn contains(&self, t: Utc) -> bool {
        self.holding(t).is_some()
    }
    /// The first window that starts after `t`.
    pub fn next_after(&self, t: Utc) -> Option<&Window> {
        self.list.get(self.list.partition_point(|w| w.start <= t))
    }
    pub fn union(&self, o: &Self) -> Self {
        self.list.iter().chain(&o.list).copied().collect()
    }
    pub fn intersect(&self, o: &Self) -> Self {
        let (mut a, mut b) = (self.list.iter().peekable(), o.list.iter().peekable());
        let mut list = Vec::new();
        while let (Some(x), Some(y)) = (a.peek(), b.peek()) {
            list.extend(x.intersect(y));
            if x.end <= y.end {
                a.next();
            } else {
                b.next();
            }
        }
        Self { list }
    }
    /// What of `span` is not in the set.
    pub fn complement_in(&self, span: &Window) -> Self {
        let mut list = Vec::new();
        let mut from = span.start;
        for w in &self.list {
            list.extend(Window::new(from, w.start.min(span.end)).ok());
            from = from.max(w.end);
        }
        list.extend(Window::new(from, span.end).ok());
        Self { list }
    }
    pub fn minus(&self, o: &Self) -> Self {
        match (self.list.first(), self.list.last()) {
            (Some(first), Some(last)) => {
                let hull = Window { start: first.start, end: last.end };
                self.intersect(&o.complement_in(&hull))
            }
            _ => Self::none(),
        }
    }
    /// Each window with both edges moved inwards; those that vanish are dropped.
    pub fn trimmed(&self, at_start: Span, at_end: Span) -> Self {
        self.list.iter().filter_map(|w| w.trimmed(at_start, at_end)).collect()
    }
}

#[cfg(test)]
mod tests;
