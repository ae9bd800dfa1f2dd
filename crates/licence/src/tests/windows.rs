//! Windows: what splits them, what names their edges.

use super::*;
use crate::fixture::PUMP;

fn low_water_window() -> Clause {
    let (from, to) = (Span::minutes(-60), Span::minutes(60));
    let (place, anchor) = (PlaceId(0), TideAnchor::LowWater);
    clause(0, "1", ClauseKind::TideWindow { place, anchor, from, to })
}

/// Low water that ends tide 0 of the fixture, and its place is the port.
fn low() -> Utc {
    forecast(&[6.0]).tides[0].window.end()
}

#[test]
fn a_release_across_low_water_is_split_where_a_clause_counts_by_tides() {
    let s = site(vec![low_water_window(), clause(1, "2", bands())]);
    let l = lawful(&s, &forecast(&[6.0, 3.0]), GATE);
    let first: Vec<_> = l.windows[..2].iter().map(|w| (w.tide, w.window)).collect();
    let hour = Span::hours(1);
    let whole = Window::new(low() - hour, low() + hour).unwrap();
    assert_eq!(first[0], (0, Window::new(whole.start(), low()).unwrap()));
    assert_eq!(first[1], (1, Window::new(low(), whole.end()).unwrap()));
    let edge = l.windows[0].shuts;
    assert_eq!((edge.clause, edge.anchor), (Some(ClauseId(1)), EdgeAnchor::Predicted));
    assert_eq!(l.windows[1].opens.clause, Some(ClauseId(1)));
    assert_eq!(l.windows[1].volume_max.map(|c| c.max.get()), Some(4800.0));
}

#[test]
fn nothing_is_split_where_no_clause_counts_by_tides() {
    let l = lawful(&site(vec![low_water_window()]), &forecast(&[6.0, 6.0]), GATE);
    let hour = Span::hours(1);
    assert_eq!(l.windows[0].window, Window::new(low() - hour, low() + hour).unwrap());
    assert_eq!(l.windows[0].tide, 0);
    assert_eq!(l.windows[0].shuts.clause, Some(ClauseId(0)));
}

#[test]
fn half_a_window_is_left_beside_a_nil_tide() {
    let s = site(vec![low_water_window(), clause(1, "2", bands())]);
    let l = lawful(&s, &forecast(&[2.0, 6.0]), GATE);
    assert_eq!(l.nil.len(), 1);
    assert_eq!(l.windows[0].window.start(), low());
}

#[test]
fn where_no_tide_lies_nothing_is_lawful() {
    let mut f = forecast(&[6.0, 6.0, 6.0]);
    f.tides.remove(1);
    for clauses in [permit(), vec![low_water_window()], vec![]] {
        let l = lawful(&site(clauses), &f, GATE);
        assert!(!l.windows.is_empty());
        assert!(l.windows.iter().all(|w| w.window.start() >= f.tides[0].window.start()));
        let covered: Windows = f.tides.iter().map(|t| t.window).collect();
        assert!(l.windows.iter().all(|w| covered.contains(w.window.start())
            && covered.contains(w.window.end() - Span::micros(1))));
    }
}

#[test]
fn a_current_that_is_not_modelled_is_never_lawful() {
    let mut f = forecast(&[6.0]);
    f.places[0].current = None;
    assert!(lawful(&site(permit()), &f, GATE).windows.is_empty());
}

#[test]
fn each_asset_has_windows_by_the_clauses_that_govern_it() {
    let (s, f) = (crate::fixture::tarrow(), forecast(&[2.0, 6.0]));
    let (gate, pump) = (lawful(&s, &f, GATE), lawful(&s, &f, PUMP));
    // The pump is under the current clause alone: no tide window, no nil tide, no caps.
    assert!(pump.nil.is_empty() && pump.windows.len() == 2 && gate.windows.len() == 1);
    let w = &pump.windows[0];
    assert_eq!((w.opens.clause, w.shuts.clause), (Some(ClauseId(1)), Some(ClauseId(1))));
    assert_eq!((w.flow_max, w.ramp_max_per_min, w.volume_max), (None, None, None));
    assert!(pump.windows[1].window.length() > gate.windows[0].window.length());
}

#[test]
fn an_edge_has_the_spread_of_the_turn_next_to_it() {
    let mut f = forecast(&[6.0, 6.0]);
    f.places[0].current_turns[0].time_sd = Span::minutes(11);
    let l = lawful(&site(permit()), &f, GATE);
    let sd: Vec<_> = l.windows.iter().map(|w| w.opens.time_sd).collect();
    assert_eq!(sd, [Span::minutes(11), Span::minutes(5)]);
}

#[test]
fn of_two_clauses_that_make_one_edge_the_first_is_named() {
    let mut clauses = permit();
    let same = clauses[0].kind.clone();
    clauses.push(clause(7, "9", same));
    let l = lawful(&site(clauses), &forecast(&[6.0]), GATE);
    assert_eq!(l.windows[0].shuts.clause, Some(ClauseId(0)));
    // A tide that counts and a window that ends at the same low water: the first again.
    let mut by_tide_first = vec![clause(0, "1", bands()), low_water_window()];
    by_tide_first[1].id = ClauseId(1);
    if let ClauseKind::TideWindow { to, .. } = &mut by_tide_first[1].kind {
        *to = Span::ZERO;
    }
    let l = lawful(&site(by_tide_first), &forecast(&[6.0]), GATE);
    assert_eq!(l.windows[0].shuts.clause, Some(ClauseId(0)));
}

#[test]
fn the_end_of_the_forecast_is_no_clause() {
    let mut f = forecast(&[6.0]);
    f.span = window(4.0, 5.0);
    let l = lawful(&site(permit()), &f, GATE);
    let edge = |e: Edge| (e.at, e.clause, e.anchor, e.time_sd);
    let end = |at| (at, None, EdgeAnchor::SpanEnd, Span::ZERO);
    assert_eq!(edge(l.windows[0].opens), end(t(4.0)));
    assert_eq!(edge(l.windows[0].shuts), end(t(5.0)));
}

#[test]
fn a_residual_in_the_level_moves_no_window() {
    let f = forecast(&[6.0, 3.0]);
    let mut surge = f.clone();
    let level = &f.places[0].level;
    surge.places[0].level =
        Series::new(level.start(), level.step(), level.values().iter().map(|v| v + 1.1).collect())
            .unwrap();
    surge.port_level = surge.places[0].level.clone();
    let s = site(permit());
    assert_eq!(lawful(&s, &surge, GATE), lawful(&s, &f, GATE));
}

#[test]
fn a_range_is_shown_in_steps_of_any_size() {
    let shown = |range: f64, step: f64| {
        let rounding = Rounding { step: Metres::of(step) };
        crate::caps::rounded_m(Metres::of(range), &rounding).get()
    };
    // 2.1 and not 2.0999999999999996 or 2.1000000000000001 by luck: the very same number.
    assert_eq!(shown(2.128, 0.1), 2.1);
    assert_eq!(shown(2.148, 0.1), 2.1);
    assert_eq!(shown(2.15, 0.1), 2.2);
    assert_eq!(shown(3.934, 0.1), 3.9);
    assert_eq!(shown(3.95, 0.1), 4.0);
    assert_eq!(shown(3.9, 0.25), 4.0);
    assert_eq!(shown(3.126, 0.25), 3.25);
    // A metre has no whole number of these.
    assert!((shown(1.5, 0.3) - 1.5).abs() < 1e-12);
    assert_eq!(shown(5.2, 2.0), 6.0);
}
