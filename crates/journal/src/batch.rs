//! What is handed over to be committed, and the answers.

use record::{Draft, Intent, Row};
use units::{Mono, Utc};

use crate::Committed;

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
    Back,
}
