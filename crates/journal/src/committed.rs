//! Proof that a command's intent is on disk.
//!
//! ```compile_fail,E0308
//! // A bare permit does not leave ...
//! fn send(command: journal::Committed) -> u64 {
//!     command.permit().command()
//! }
//! fn bare(permit: record::Permit) -> u64 {
//!     send(permit)
//! }
//! ```
//! ```compile_fail,E0451
//! // ... nor can one be declared committed outside this crate.
//! fn forge(intent: record::Intent) -> journal::Committed {
//!     journal::Committed { intent, seq: 1 }
//! }
//! ```
//! The same functions without the offending act compile, so the failures above are the ones meant:
//! ```
//! fn send(command: journal::Committed) -> u64 {
//!     command.permit().command()
//! }
//! fn committed(command: journal::Committed) -> u64 {
//!     send(command)
//! }
//! ```

use record::{Intent, Permit, Row};

use crate::JournalError;

/// A permit whose intent has been committed and read back. Not `Clone`: it leaves once.
#[derive(PartialEq, Debug)]
pub struct Committed {
    intent: Intent,
    seq: u64,
}

impl Committed {
    /// Only after the commit, with the row as it was read back from the file.
    pub(crate) fn new(intent: Intent, row: &Row) -> Result<Self, JournalError> {
        let seq = row.seq;
        intent.agrees(row).map_err(|source| JournalError::Permit { seq, source })?;
        Ok(Self { intent, seq })
    }

    pub fn permit(&self) -> &Permit {
        self.intent.permit()
    }

    /// The sequence of its intent's row.
    pub fn seq(&self) -> u64 {
        self.seq
    }
}
