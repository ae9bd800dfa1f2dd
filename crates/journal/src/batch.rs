//! What is handed over to be committed, and the answers.

use record::{Draft, Intent, Row};
use units::{Mono, Utc};

use crate::{Committed, Done};

/// What one step of the engine wants kept.
#[derive(PartialEq, Debug)]
pub struct Batch {
    pub term: u64,
    pub utc: Utc,
    pub boot: Mono,
    /// In this order. An intent's own draft may stand among them, in its place; then it is written
    /// once, there.
    pub drafts: Vec<Draft>,
    /// Those whose draft is not among the above are written after them.
    pub intents: Vec<Intent>,
    /// What was seen since the batch before: it is on disk no later than what followed from it.
    pub seen: Seen,
}

/// What the engine was told, and what a minute's readings were. Kept apart from the chain until a
/// day is sealed.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Seen {
    /// Each in the bytes that `record` gives it.
    pub events: Vec<Vec<u8>>,
    pub minutes: Vec<Minute>,
}

impl Seen {
    pub fn is_empty(&self) -> bool {
        self.events.is_empty() && self.minutes.is_empty()
    }
}

/// One reading of each signal for a minute, for people and plots: rounded to a step that is fine
/// enough to show, and coarse enough to keep for ten years.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Minute {
    /// Its beginning.
    pub at: Utc,
    /// In the order of the site file.
    pub readings: Vec<MinuteReading>,
}

#[derive(Clone, PartialEq, Eq, Debug)]
pub struct MinuteReading {
    pub signal: String,
    /// The value is `steps` x 10^`exponent` in the signal's unit; none where nothing was read.
    pub steps: Option<i32>,
    pub exponent: i8,
    /// 0 good, 1 stale, 2 never read, 3 no number, 4 out of range, 5 too fast, 6 frozen, 7 bad at
    /// the source, 8 from the future. 255 is not used.
    pub quality: u8,
}

/// One batch is on disk.
#[derive(PartialEq, Debug)]
pub struct Acked {
    pub rows: Vec<Row>,
    /// The permits that may leave now.
    pub committed: Vec<Committed>,
}

#[derive(PartialEq, Debug)]
pub enum Reply {
    /// One for each batch, in the order in which they were submitted.
    Acked(Acked),
    /// Nothing can be kept until `Back`. The permits of every batch that was not acknowledged are
    /// gone; their other rows are kept in memory and will be written.
    Lost { why: String },
    /// What was kept in memory is on disk; its `Acked` follow, without permits.
    Back { rows_kept: usize },
    /// What became of a [`Task`].
    Done(Done),
}
