//! **What would the whole site have done over this span, with these faults?**
//!
//! Runs the engine against the simulated plant under one clock of its own: events in order of time,
//! jobs done at once and delivered a little later, orders carried out as the host would. Pure: the
//! same setup gives the same run, bit for bit. It judges nothing; that is for `oracle`, from the
//! plant's own record.
//!
//! What it leaves out: processes, sockets, disks and real time; those are tested with the real
//! binary.

mod run;

pub use run::{Fault, Run, Setup, World};
