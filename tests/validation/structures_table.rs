//! Reads the check tables of `tests/data/hydraulics-2026` and reports the worst row.

use std::path::Path;

/// Half a unit of the ninth figure is 5e-9 of a number that starts with 1; inputs are printed to
/// the same nine figures, which can double it.
pub const PRINTED: f64 = 1e-8;

pub fn relative_error(ours: f64, theirs: f64) -> f64 {
    ((ours - theirs) / theirs).abs()
}

/// A table as rows of numbers; an empty cell is NaN.
pub struct Table {
    name: String,
    rows: Vec<Vec<f64>>,
}

impl Table {
    pub fn read(name: &str) -> Self {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("data/hydraulics-2026");
        let text = std::fs::read_to_string(folder.join(name)).expect("the table is in the tree");
        let lines = text.lines().filter(|l| !l.starts_with('#')).skip(1);
        let cell = |c: &str| match c {
            "" => f64::NAN,
            number => number.parse().expect("cells are numbers"),
        };
        let rows = lines.map(|l| l.split(',').map(cell).collect()).collect();
        Self { name: name.to_owned(), rows }
    }
    /// The greatest error over all rows, which must be as many as expected; printed for the record.
    pub fn worst(&self, rows: usize, error: impl Fn(&[f64]) -> f64) -> f64 {
        assert_eq!(self.rows.len(), rows, "rows of {}", self.name);
        let each: Vec<f64> = self.rows.iter().map(|r| error(r)).collect();
        assert!(each.iter().all(|e| e.is_finite()), "an error of {} is no number", self.name);
        let worst = each.iter().copied().fold(0.0, f64::max);
        println!("{}: {rows} rows, worst error {worst:.2e}", self.name);
        worst
    }
}
