//! The curves against their own principle.

use core::f64::consts::PI;

use model::TurnKind;
use units::{Level, Metres, Span};

use super::*;

fn turn(minutes: i64, level_m: f64, kind: TurnKind) -> Turn {
    Turn {
        number: 0,
        kind,
        at: Utc::EPOCH + Span::minutes(minutes),
        level: Level::of(level_m),
        time_sd: Span::ZERO,
        level_sd: Metres::ZERO,
    }
}

/// Source: NOAA/NOS tide tables, table 3, by its principle h = hL + (hH - hL)(1 - cos(pi t/T))/2.
/// Where in it: low water 1.0 m, high water 5.8 m, rise 6.2 h, at sixths of the rise; computed from
/// the formula, not printed values.
/// Quantity and unit: height, metres.
/// Tolerance and why: 5e-9, half the last digit of the figures.
#[test]
fn val_noaa_height_between_turns() {
    let turns = [turn(0, 1.0, TurnKind::Low), turn(372, 5.8, TurnKind::High)];
    let heights = [1.0, 1.321_539_03, 2.2, 3.4, 4.6, 5.478_460_97];
    for (sixth, expected) in heights.iter().enumerate() {
        let ours = level_m(&turns, Utc::EPOCH + Span::minutes(62 * sixth as i64));
        assert!((ours - expected).abs() < 5e-9, "{sixth}/6: {ours} {expected}");
    }
}

#[test]
fn there_is_no_level_before_the_first_turn_nor_after_the_last() {
    let turns = [turn(0, 1.0, TurnKind::Low), turn(372, 5.8, TurnKind::High)];
    assert!(level_m(&turns, Utc::EPOCH - Span::seconds(1)).is_nan());
    assert!(level_m(&turns, Utc::EPOCH + Span::minutes(372)).is_nan());
    assert!(level_m(&[], Utc::EPOCH).is_nan());
    assert!(current_m_s(&[], Utc::EPOCH).is_nan());
}

#[test]
fn a_current_is_still_at_its_turns_and_at_its_peak_between() {
    let knot = |minutes, to_seaward, peak_m_s| {
        let at = Utc::EPOCH + Span::minutes(minutes);
        let turn = CurrentTurn { number: 0, to_seaward, at, time_sd: Span::ZERO };
        CurrentKnot { turn, peak_m_s }
    };
    let knots = [knot(0, true, 1.2), knot(400, false, -1.9), knot(600, true, 1.2)];
    let at = |minutes| current_m_s(&knots, Utc::EPOCH + Span::minutes(minutes));
    assert_eq!(at(0), 0.0);
    assert!((at(200) - 1.2).abs() < 1e-12 && (at(500) + 1.9).abs() < 1e-12);
    assert!((at(100) - 1.2 * sin(PI / 4.0)).abs() < 1e-12);
    assert!(at(399) > 0.0 && at(401) < 0.0);
}
