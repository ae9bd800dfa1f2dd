//! The table of constituents against the published list, and against itself.

use super::*;

#[test]
fn the_table_is_whole_and_every_name_means_one_row() {
    let lines = TEXT.lines().filter(|l| !l.starts_with('#')).skip(1).count();
    assert_eq!((lines, rows().len()), (158, 158));
    let mut names: Vec<String> = rows()
        .iter()
        .flat_map(|r| core::iter::once(&r.name).chain(&r.aliases))
        .map(|n| n.to_ascii_uppercase())
        .collect();
    names.sort();
    let all = names.len();
    names.dedup();
    assert_eq!(names.len(), all, "two rows share a name");
    for r in rows() {
        assert_eq!(find(r.name).map(|f| f.name), Some(r.name));
        assert!(r.speed_deg_h() > 0.0 && (-3..=3).contains(&r.quarter_turns), "{}", r.name);
    }
}

/// Rows whose quarter turns the list gives otherwise; ours follow from their parts.
const OTHER_QUARTERS: [&str; 2] = ["2MN2", "3ML8"];
/// Rows that the list has not.
const NOT_LISTED: [&str; 2] = ["3MO7", "2MSK7"];

/// Source: IHO standard list of tidal constituents.
/// Where in it: 156 of its 418 rows, all of our 158 that it names.
/// Quantity and unit: Doodson numbers and quarter turns, whole numbers; speed, degrees per hour.
/// Tolerance and why: numbers exact, but for the quarter turns of two compounds; speed 1e-6, twice
/// the rounding of the list's seven decimals and of its rates.
#[test]
fn val_iho_doodson_numbers_and_speeds() {
    let list = include_str!("../../../../tests/data/iho-2026/constituents.csv");
    let listed: Vec<Vec<&str>> = list.lines().skip(1).map(|l| l.split(',').collect()).collect();
    let whole = |text: &str| text.parse::<i32>().unwrap();
    let (mut seen, mut worst) = (0, 0.0_f64);
    for row in rows() {
        let is_ours = |name: &str| {
            name.eq_ignore_ascii_case(row.name)
                || row.aliases.iter().any(|a| a.eq_ignore_ascii_case(name))
        };
        let named: Vec<&Vec<&str>> = listed
            .iter()
            .filter(|l| is_ours(l[0]) || l[0].split([' ', '(', ')']).any(is_ours))
            .collect();
        assert_eq!(named.is_empty(), NOT_LISTED.contains(&row.name), "{}", row.name);
        if named.is_empty() {
            continue;
        }
        // Some names stand for more than one row, e.g. S1 with two phases.
        let numbers =
            |l: &&Vec<&str>| row.doodson.iter().zip(&l[2..8]).all(|(a, b)| *a == whole(b));
        let same: Vec<&Vec<&str>> = named.into_iter().filter(numbers).collect();
        assert!(!same.is_empty(), "numbers of {}", row.name);
        let turns_agree = same.iter().any(|l| (whole(l[8]) - row.quarter_turns) % 4 == 0);
        assert_eq!(!turns_agree, OTHER_QUARTERS.contains(&row.name), "{}", row.name);
        let found = same[0];
        let off = (row.speed_deg_h() - found[1].parse::<f64>().unwrap()).abs();
        assert!(off <= 1e-6, "{}: off by {off}", row.name);
        worst = worst.max(off);
        seen += 1;
    }
    println!("{seen} speeds, worst {worst:.1e} degrees per hour");
    assert_eq!(seen, 156);
}
