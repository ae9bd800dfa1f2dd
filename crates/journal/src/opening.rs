//! Opening the evidence to write: whole, or from a row where somebody has kept what the rows before
//! it add up to.

use std::path::{Path, PathBuf};

use record::Row;

use crate::chain::Head;
use crate::file::Evidence;
use crate::{Journal, JournalError};

/// An evidence file that is open, and not verified yet.
#[derive(Debug)]
pub struct Opening {
    evidence: Evidence,
    dir: PathBuf,
}

impl Opening {
    /// Opens, or makes, the evidence file in the state folder, and lifts an older form.
    pub fn begin(dir: &Path) -> Result<Self, JournalError> {
        Ok(Self { evidence: Evidence::open(dir)?, dir: dir.to_owned() })
    }

    /// The last row of a kind, if there is one. It is not verified: the walk does that.
    pub fn last_of_kind(&self, kind: u16) -> Result<Option<Row>, JournalError> {
        self.evidence.last_of_kind(kind)
    }

    /// Verifies every row after `after_seq` (0: all of them) and gives each to `visit`. What is
    /// before is believed for now: [`Task::Verify`](crate::Task::Verify) verifies it in the
    /// background, up to the very hash that was believed here.
    pub fn walk(self, after_seq: u64, visit: &mut dyn FnMut(Row)) -> Result<Journal, JournalError> {
        let from = match after_seq {
            0 => Head::NONE,
            seq => Head::after(&self.evidence.row(seq)?),
        };
        Journal::walked(self.evidence, self.dir, from, visit)
    }

    /// The same from a row whose hash is known from elsewhere.
    pub(crate) fn walk_after(
        self,
        head: Head,
        visit: &mut dyn FnMut(Row),
    ) -> Result<Journal, JournalError> {
        if head != Head::NONE && Head::after(&self.evidence.row(head.seq)?) != head {
            let why = "it was acknowledged, and is another now".to_owned();
            return Err(JournalError::FirstBad { seq: head.seq, why });
        }
        Journal::walked(self.evidence, self.dir, head, visit)
    }
}
