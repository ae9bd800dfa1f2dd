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
//! let seen = journal::Seen::default();
//! handle.submit(Batch { term, utc, boot, drafts, intents: Vec::new(), seen })?;
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
mod thread;

mod journal;
mod opening;
mod planned;

mod task;

mod anchor;
mod backup;
mod retain;
mod seal;

mod file;
mod forms;
mod rows;

mod pack;
mod packs;
mod segment;
mod varint;

mod lost;
mod reserve;

mod inspect;
mod salvage;
mod verify;

mod durable;
mod error;

mod export;
mod view;

pub use anchor::{Anchor, is_signed, public_key};
pub use backup::restore;
pub use batch::{Acked, Batch, Minute, MinuteReading, Reply, Seen};
pub use committed::Committed;
pub use error::JournalError;
pub use file::FILE_NAME;
/// The form of the evidence file that this version writes.
pub const FORM: u32 = forms::FORM as u32;
pub use export::{EXPORTED, Export, ExportForm, Exported, csv_line, export, guarded};
pub use inspect::{Filter, each_row, events, minutes, rows};
pub use journal::Journal;
pub use opening::Opening;
pub use salvage::{Salvaged, salvage};
pub use task::{Done, Stamp, Task};
pub use thread::Handle;
pub use verify::{Checks, Verified, verify, verify_with};
pub use view::{
    Asked, AskedFor, Cell, Entries, Entry, Rest, VIEW_FORMAT, VIEW_NAME, View, ViewError, ViewHead,
    ViewPace, ViewReader, ViewSays, ViewState, ViewThread, Visit, Wanted, ask, evidence_ahead,
    rebuild_view,
};
