//! The view: the record for people, their programs and their SQL.
//!
//! `view.sqlite` is a projection of the evidence into tables with plain names, readable while the
//! daemon runs. It holds nothing that the evidence does not, and may be thrown away at any time; its
//! troubles touch neither the evidence nor the plant. The crate's README says table by table what
//! is in it.
//!
//! ```text
//!   journal's thread --committed rows--> loop --rows, never waiting--> view's thread --> view.sqlite
//!          ^                              |                                |
//!          +---------- reads ------------ + <---- rows that it missed -----+
//! ```

mod error;
mod file;
mod rebuild;
mod write;

mod thread;

mod ask;
mod entries;
mod read;

pub use ask::{Asked, AskedFor, Cell, Visit, ask};
pub use entries::{Entries, Entry, Rest};
pub use error::ViewError;
pub use file::{VIEW_FORMAT, VIEW_NAME, ViewHead};
pub use read::{ViewReader, Wanted, evidence_ahead};
pub use rebuild::rebuild_view;
pub use thread::{ViewPace, ViewSays, ViewState, ViewThread};
pub use write::View;

pub(crate) use file::{beside, create};

pub(crate) fn hex(bytes: &[u8]) -> String {
    const DIGITS: &[u8; 16] = b"0123456789abcdef";
    let digit = |n: u8| char::from(DIGITS[usize::from(n)]);
    bytes.iter().flat_map(|b| [digit(b >> 4), digit(b & 15)]).collect()
}
