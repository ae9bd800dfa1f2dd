//! What becomes of the record, and what recurs by the clock on the wall.

use units::Span;

/// How long what was seen is kept, and where copies and signatures come from.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Keeping {
    /// Input events and minute readings older than this are deleted, and the record says so. The
    /// rows themselves are kept for ever.
    pub segments_for: Span,
    /// The folder of backups, on another disk if there is one; no backups without it.
    pub backup_to: Option<String>,
    /// Backups that are kept; older ones are removed after a newer one has verified.
    pub backups: u32,
    /// A file with a secret key, so that anchors are signed.
    pub anchor_key: Option<String>,
    pub duties: Vec<Duty>,
}

impl Default for Keeping {
    /// Six years and a bit, no backups, no duties.
    fn default() -> Self {
        Self {
            segments_for: Span::days(2_200),
            backup_to: None,
            backups: 14,
            anchor_key: None,
            duties: Vec::new(),
        }
    }
}

/// One thing that recurs.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Duty {
    pub kind: DutyKind,
    /// A cron expression in the site's own time: second, minute, hour, day, month, weekday.
    pub when: String,
    /// In the hour that autumn has twice: done in both, or in the first only.
    pub in_both_passes: bool,
}

#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum DutyKind {
    /// Copies the write-ahead log into the evidence file.
    Checkpoint,
    /// Seals the days that are over, packs old rows, deletes what is past its time.
    Seal,
    /// Writes down where the chain ends, and tells the log and those adapters that take it.
    Anchor,
    Backup,
    /// Verifies the whole record in the background.
    Verify,
    /// Writes down what yesterday came to.
    Summary,
    /// Asks for new plans.
    Replan,
}
