//! **Is it written down, so that it stays?**
//!
//! The evidence file: rows without a gap, each with the hash of the one before, committed with a
//! sync before anybody is told. It alone turns an intent into a [`Committed`] command. When the disk
//! fails it says so at once, keeps what was not acknowledged, and comes back by itself after it has
//! verified the file anew.
//!
//! It knows nothing of what rows mean (`record` does), reads no clock, and does not defend against
//! somebody who cuts off the end of the file: keep a copy of the head's hash elsewhere.
//!
//! ```
//! use journal::{Batch, Journal, Reply};
//! use record::{Draft, kind};
//! use units::{Mono, Utc};
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! let dir = tempfile::tempdir()?;
//! let journal = Journal::open(dir.path(), &mut |_row| {})?;
//! let term = journal.next_term();
//! let (to, replies) = std::sync::mpsc::channel::<Reply>();
//! let handle = journal.start(to);
//! let (subject, cause, body) = ("site".to_owned(), String::new(), vec![0; 4]);
//! let drafts = vec![Draft { kind: kind::STOPPING, version: 1, subject, cause, body }];
//! let (utc, boot) = (Utc::EPOCH, Mono::ZERO);
//! handle.submit(Batch { term, utc, boot, drafts, intents: Vec::new() })?;
//! let Reply::Acked(acked) = replies.recv()? else { return Err("lost".into()) };
//! assert_eq!(acked.rows[0].seq, 1);
//! handle.close()?;
//! assert_eq!(journal::verify(dir.path(), &mut |_, _| {})?.rows, 1);
//! # Ok(())
//! # }
//! ```

mod batch;
mod chain;
mod committed;
mod error;
mod file;
mod inspect;
mod journal;
mod lost;
mod planned;
mod thread;

pub use batch::{Acked, Batch, Reply};
pub use committed::Committed;
pub use error::JournalError;
pub use file::FILE_NAME;
pub use inspect::{Filter, Verified, each_row, rows, verify};
pub use journal::Journal;
pub use thread::Handle;
