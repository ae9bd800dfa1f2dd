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
