//! **What do the daemon and an adapter say to each other?**
//!
//! The adapter protocol, version 1: JSON-RPC 2.0, UTF-8, one message a line, on the adapter's
//! standard input and output. Types and framing only; who says what when is in the README of this
//! crate, the author's loop in `sdk`, the daemon's side in `host`. Within version 1 only optional
//! fields and feature names are added; unknown fields are ignored.
//!
//! ```
//! use protocol::{Message, parse};
//! let line = r#"{"jsonrpc":"2.0","id":7,"method":"sense","params":{"points":["level"]}}"#;
//! assert!(matches!(parse(line.as_bytes()), Ok(Message::Request { id: 7, .. })));
//! assert!(parse(b"[]").is_err(), "batches are refused");
//! ```

mod codes;
mod framing;
mod messages;

pub use codes::{Code, RpcError};
pub use framing::{BadLine, Message, answer, failure, notification, parse, request};
pub use messages::{
    Anchor, Drive, Introduce, Introduced, LeaseHolder, Point, PointKind, Quality, Reading, Renew,
    RenewOne, Rest, RestAction, RestCause, RestOne, RestSet, Sense, Sensed, Series, Severity,
    Trouble, feature, method,
};

/// The version that this crate speaks.
pub const VERSION: u32 = 1;
/// Longest line in bytes, its end included.
pub const LINE_MAX: usize = 64 * 1024;
