//! **Are the adapters alive, and did each command that left have leave to?**
//!
//! Starts adapters as processes of their own, greets them, watches them, starts them again with
//! back-off, and carries orders, renewals and rests to them. It takes a command only as a
//! [`journal::Committed`]: a permit whose intent is on the disk. Going to rest needs no permit.
//!
//! ```compile_fail,E0308
//! // A permit that the journal has not committed is not accepted ...
//! fn send(host: &host::Host, permit: interlock::Permit) {
//!     let _ = host.drive(0, "gate", permit);
//! }
//! ```
//! ```
//! // ... where a committed one is.
//! fn send(host: &host::Host, committed: journal::Committed) {
//!     let _ = host.drive(0, "gate", committed);
//! }
//! ```
//!
//! What is not covered yet: limits on an adapter's memory, files and network. If the host's process
//! is killed, adapters see the end of their input and rest; their own children are theirs to end.

mod backoff;
mod child;
mod host_;
mod pending;
mod supervisor;

pub use backoff::Backoff;
pub use host_::{AdapterSpec, Events, Host, HostError, HostEvent, Now, Outcome, RestPoint};
