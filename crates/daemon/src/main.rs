//! The binary `tidereeve`: the thin shell round the engine. It reads the clock, talks to adapters,
//! keeps the journal, answers people, and decides nothing.

mod cli;
mod clock;
mod commands;
mod control;
mod paths;
mod run;
mod show;

use std::process::ExitCode;

fn main() -> ExitCode {
    cli::main()
}
