//! The binary `tidereeve`: the thin shell round the engine. It reads the clock, talks to adapters,
//! keeps the journal, answers people, and decides nothing.

/// Prints a line (or, with `part`, a piece of one). Whoever reads may have gone away, `head` for one:
/// that is no reason to fall over.
macro_rules! say {
    (part $($text:tt)*) => {{
        use std::io::Write as _;
        let _ = write!(std::io::stdout(), $($text)*);
    }};
    ($($text:tt)*) => {{
        use std::io::Write as _;
        let _ = writeln!(std::io::stdout(), $($text)*);
    }};
}

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
