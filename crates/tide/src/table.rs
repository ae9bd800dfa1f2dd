//! The table of constituents: a data file, read once.

use std::sync::OnceLock;

use crate::arguments::Arguments;
use crate::node::Term;

/// One constituent.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Row {
    pub name: &'static str,
    pub aliases: Vec<&'static str>,
    /// On tau, s, h, p, N', p1.
    pub doodson: [i32; 6],
    pub quarter_turns: i32,
    pub nodes: Vec<(Term, i32)>,
}

const TEXT: &str = include_str!("../data/constituents.tsv");

/// All rows, in the order of the file. The file is part of the crate; that it parses is tested.
pub(crate) fn rows() -> &'static [Row] {
    static ROWS: OnceLock<Vec<Row>> = OnceLock::new();
    ROWS.get_or_init(|| {
        let lines = TEXT.lines().filter(|l| !l.starts_with('#')).skip(1);
        lines.map(|l| parse(l).expect("the table of constituents is well formed")).collect()
    })
}

fn parse(line: &'static str) -> Option<Row> {
    let f: Vec<&'static str> = line.split('\t').collect();
    let number = |n: usize| f.get(n)?.parse::<i32>().ok();
    let mut doodson = [0; 6];
    for (n, d) in doodson.iter_mut().enumerate() {
        *d = number(n + 2)?;
    }
    let nodes = f.get(9)?.split_whitespace().map(|term| {
        let (name, coefficient) = term.split_once(':')?;
        Some((Term::named(name)?, coefficient.parse().ok()?))
    });
    Some(Row {
        name: f.first()?,
        aliases: f.get(1)?.split_whitespace().collect(),
        doodson,
        quarter_turns: number(8)?,
        nodes: nodes.collect::<Option<Vec<_>>>()?,
    })
}

/// The row of a name or alias, whatever its case.
pub(crate) fn find(name: &str) -> Option<&'static Row> {
    let is = |known: &str| known.eq_ignore_ascii_case(name);
    rows().iter().find(|r| is(r.name) || r.aliases.iter().any(|a| is(a)))
}

/// Rates of the arguments at J2000, degrees per hour.
///
/// **Source**: IERS Conventions (2010), Technical Note 36, eq. 5.43, first derivatives at J2000.0.
const RATES_DEG_H: [f64; 6] =
    [14.492_052_120, 0.549_016_520, 0.041_068_640, 0.004_641_813, 0.002_206_407, 0.000_001_962];

/// The speed of a constituent, degrees per hour; `None` if it is not in the table.
pub fn speed_deg_h(name: &str) -> Option<f64> {
    find(name).map(Row::speed_deg_h)
}

impl Row {
    pub(crate) fn speed_deg_h(&self) -> f64 {
        self.doodson.iter().zip(RATES_DEG_H).map(|(n, r)| f64::from(*n) * r).sum()
    }
    /// The equilibrium argument V, degrees, brought within a circle.
    pub(crate) fn argument_deg(&self, a: &Arguments) -> f64 {
        let values = [a.tau_deg, a.s_deg, a.h_deg, a.p_deg, -a.n_deg, a.p1_deg];
        let sum: f64 = self.doodson.iter().zip(values).map(|(n, v)| f64::from(*n) * v).sum();
        (sum + 90.0 * f64::from(self.quarter_turns)).rem_euclid(360.0)
    }
}

#[cfg(test)]
mod tests;
