//! The real journal under load, for the sweeps in `tests/faults/journal_sweeps`: it says on standard
//! output what it was told, so that another process can hold the files to it after any fault.
//!
//! ```text
//! hammer prepare MODE DIR     what a mode begins with, where that is not an empty folder
//! hammer run MODE DIR [--seed N] [--batches N] [--patience-ms N] [--durability D]
//! hammer check DIR [--acked N] [--heard FILE] [--full]
//! hammer check --batch        lines on standard input: DIR, ACKED, HEARD, LINES (tabs between)
//! ```
//! Lines of a run, each written at once: `ACK seq hash8` after the acknowledgement of a row,
//! `SEEN hash8` for an event of its batch, `COMMAND id seq` for a permit that may leave, `LOST why`,
//! `BACK`, `TASK` or `FAILED` name, `CLOSED`, `DONE term`.
//!
//! Ends with 0 done or good, 1 the check found it bad, 2 usage, 3 still lost when patience ran out,
//! 4 refused to open, 5 no answer at all, 6 the close failed.

mod check;
mod control;
mod heard;
mod load;
mod prepare;
mod site;

use std::io::{BufRead, Write};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::time::Duration;

use control::Durability;

const USAGE: u8 = 2;

/// What to do to the journal, and how.
struct Orders {
    mode: String,
    dir: PathBuf,
    seed: u64,
    batches: u64,
    patience: Duration,
    durability: Durability,
}

fn main() -> ExitCode {
    let args: Vec<String> = std::env::args().skip(1).collect();
    let code = match args.first().map(String::as_str) {
        Some("run") => run(&args[1..]),
        Some("prepare") => prepared(&args[1..]),
        Some("check") => checked(&args[1..]),
        _ => Err("hammer run MODE DIR ... or hammer check DIR ...".to_owned()),
    };
    ExitCode::from(code.unwrap_or_else(|why| {
        eprintln!("{why}");
        USAGE
    }))
}

/// The value after `--name`.
fn value<'a>(args: &'a [String], name: &str) -> Option<&'a str> {
    args.iter().position(|a| a == name).and_then(|at| args.get(at + 1)).map(String::as_str)
}

fn number(args: &[String], name: &str, otherwise: u64) -> Result<u64, String> {
    match value(args, name) {
        None => Ok(otherwise),
        Some(text) => text.parse().map_err(|e| format!("{name} {text}: {e}")),
    }
}

fn run(args: &[String]) -> Result<u8, String> {
    let [mode, dir, ..] = args else { return Err("a mode and a folder are needed".to_owned()) };
    let durability = value(args, "--durability").unwrap_or("full");
    let orders = Orders {
        mode: mode.clone(),
        dir: PathBuf::from(dir),
        seed: number(args, "--seed", 1)?,
        batches: number(args, "--batches", 6)?,
        patience: Duration::from_millis(number(args, "--patience-ms", 10_000)?),
        durability: Durability::named(durability).ok_or("no such durability")?,
    };
    match orders.durability {
        Durability::Full => load::run(&orders),
        _ => control::run(&orders),
    }
}

fn prepared(args: &[String]) -> Result<u8, String> {
    let [mode, dir] = args else { return Err("a mode and a folder are needed".to_owned()) };
    prepare::prepare(mode, Path::new(dir))
}

fn checked(args: &[String]) -> Result<u8, String> {
    if args.first().map(String::as_str) == Some("--batch") {
        return batch();
    }
    let dir = args.first().ok_or("a folder is needed")?;
    let acked = number(args, "--acked", 0)?;
    let heard = match value(args, "--heard") {
        Some(file) => heard::Heard::read(Path::new(file), usize::MAX)?,
        None => heard::Heard::default(),
    };
    let full = args.iter().any(|a| a == "--full");
    let how = if full { check::opens_full } else { check::check };
    match how(Path::new(dir), acked, &heard) {
        Ok(good) => {
            say(&good);
            Ok(0)
        }
        Err(bad) => {
            say(&bad);
            Ok(1)
        }
    }
}

/// Many folders in one process: an answer a line, `OK ...` or `BAD ...`.
fn batch() -> Result<u8, String> {
    let mut bad = 0;
    for line in std::io::stdin().lock().lines() {
        let line = line.map_err(|e| e.to_string())?;
        let fields: Vec<&str> = line.split('\t').collect();
        let [dir, acked, heard, lines] = fields[..] else {
            return Err(format!("not four fields: {line}"));
        };
        let acked = acked.parse().map_err(|e| format!("{acked}: {e}"))?;
        let lines = lines.parse().map_err(|e| format!("{lines}: {e}"))?;
        let heard = heard::Heard::read(Path::new(heard), lines)?;
        match check::check(Path::new(dir), acked, &heard) {
            Ok(good) => say(&format!("OK {good}")),
            Err(why) => {
                bad += 1;
                say(&format!("BAD {}", why.replace('\n', " ")));
            }
        }
    }
    Ok(u8::from(bad > 0))
}

/// One line, written at once: what has been said can be held against the files.
fn say(line: &str) {
    let mut out = std::io::stdout().lock();
    // Nobody who listens is no reason to stop: the files are what counts.
    let _unheard = out.write_all(format!("{line}\n").as_bytes()).and_then(|()| out.flush());
}
