//! **What does a decision look like for ever?**
//!
//! The one persisted form of what the engine decides: rows with a kind, a version, a subject, a
//! cause in plain words and a body of fixed-order bytes; the way there and back; one line of text
//! for people; and the fold from rows to what the next term is told. Names of assets and numbers of
//! clauses are written out, so that a row explains itself when the site file has long changed.
//!
//! It does not write files and knows no hash: `journal` does.
//!
//! ```
//! use record::{Row, canonical_bytes, describe, kind};
//! use units::{Mono, Utc};
//! let body = [9, 0, 0, 0].iter().chain(b"plant-bus").copied().collect();
//! let row = Row {
//!     seq: 1, term: 1, utc: Utc::EPOCH, boot: Mono::ZERO, kind: kind::ADAPTER_UP, version: 1,
//!     subject: "plant-bus".to_owned(), cause: String::new(), body, hash: [0; 32],
//! };
//! assert_eq!(describe(&row), "adapter plant-bus is up");
//! assert_eq!(canonical_bytes(&row).len(), 47 + 9 + 13);
//! ```

pub mod kind;
mod row;

mod act;
mod carried;
mod cause;
mod decode;
mod describe;
mod encode;
mod error;
mod event;
mod fields;
mod fold;
mod frame;
mod intent;
mod names;
mod note;
mod product;
mod reader;
mod snapshot;
mod summary;
mod writer;

#[cfg(test)]
mod tests;

pub use decode::decode;
pub use describe::describe;
pub use encode::{SITE, encode};
pub use error::RecordError;
pub use event::{ProductSeen, Recorded, decode_event, encode_event, event_kinds};
pub use fields::{Field, Fields, Objection, fields};
pub use fold::{Fold, RELEASED_KEPT, fold};
pub use intent::Intent;
pub use interlock::{Permit, Renewal};
pub use note::{AnchorSignature, Note, Summary, decode_note, encode_note};
pub use row::{Draft, Row, VERSION, canonical_bytes};
