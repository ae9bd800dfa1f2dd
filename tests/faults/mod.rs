//! What breaks: wrong files, bad adapters, dead processes, full disks, clocks that step.

mod site;
mod site_good;
mod site_rows;
mod tampering;
mod thirty_days;
