//! What older versions wrote is still read: one file a kind of thing, golden bytes in `v1/`.

mod day;
mod evidence;
mod golden;
mod samples;
