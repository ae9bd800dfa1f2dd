//! Calls that wait for their answer.

use std::collections::BTreeMap;
use std::time::Duration;

/// What a call was for.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Call {
    Introduce,
    Drive {
        command: u64,
    },
    /// Nobody waits for the answer, but its absence tells that the adapter hangs.
    Other,
}

#[derive(Debug, Default)]
pub(crate) struct Pending {
    calls: BTreeMap<u64, (Call, Duration)>,
    next: u64,
}

impl Pending {
    /// A new id for a call whose answer is due by `due`.
    pub(crate) fn add(&mut self, call: Call, due: Duration) -> u64 {
        self.next += 1;
        self.calls.insert(self.next, (call, due));
        self.next
    }
    /// The call of that id, once; a second answer, or one that nobody asked for, finds nothing.
    pub(crate) fn take(&mut self, id: u64) -> Option<Call> {
        self.calls.remove(&id).map(|(call, _)| call)
    }
    pub(crate) fn next_due(&self) -> Option<Duration> {
        self.calls.values().map(|(_, due)| *due).min()
    }
    pub(crate) fn all(&mut self) -> Vec<Call> {
        std::mem::take(&mut self.calls).into_values().map(|(call, _)| call).collect()
    }
}
