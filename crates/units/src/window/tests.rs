//! The algebra against minute-by-minute brute force, across midnight and both clock changes.

use proptest::prelude::*;

use super::*;

const MINUTES: i64 = 3 * 1440;

/// Three days that hold midnight, and the start days of both clock changes of 2027 in London.
const STARTS: [(u32, u32); 3] = [(5, 4), (3, 27), (10, 30)];

fn base(which: usize) -> Utc {
    let (month, day) = STARTS[which];
    Utc::from_civil(2027, month, day, 0, 0, 0).unwrap()
}

fn minute_set(w: &Windows, base: Utc) -> Vec<bool> {
    (0..MINUTES).map(|m| w.contains(base + Span::minutes(m))).collect()
}

fn windows() -> impl Strategy<Value = Vec<(i64, i64)>> {
    prop::collection::vec((0..MINUTES, 1..600_i64), 0..9)
}

fn build(base: Utc, pairs: &[(i64, i64)]) -> Windows {
    pairs
        .iter()
        .map(|(a, n)| {
            Window::new(base + Span::minutes(*a), base + Span::minutes((a + n).min(MINUTES)))
                .unwrap()
        })
        .collect()
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
    #[test]
    fn prop_algebra_equals_minute_by_minute(a in windows(), b in windows(), which in 0..3_usize) {
        let base = base(which);
        let span = Window::new(base, base + Span::minutes(MINUTES)).unwrap();
        let (wa, wb) = (build(base, &a), build(base, &b));
        let (ma, mb) = (minute_set(&wa, base), minute_set(&wb, base));
        let each = |f: fn(bool, bool) -> bool| -> Vec<bool> {
            ma.iter().zip(&mb).map(|(x, y)| f(*x, *y)).collect()
        };
        prop_assert_eq!(minute_set(&wa.union(&wb), base), each(|x, y| x || y));
        prop_assert_eq!(minute_set(&wa.intersect(&wb), base), each(|x, y| x && y));
        prop_assert_eq!(minute_set(&wa.minus(&wb), base), each(|x, y| x && !y));
        prop_assert_eq!(minute_set(&wa.complement_in(&span), base), each(|x, _| !x));
        let minutes = ma.iter().filter(|x| **x).count() as i64;
        prop_assert_eq!(wa.total(), Span::minutes(minutes));
    }

    #[test]
    fn prop_sets_are_disjoint_ordered_and_never_touch(a in windows()) {
        let w = build(base(0), &a);
        for pair in w.as_slice().windows(2) {
            prop_assert!(pair[0].end() < pair[1].start());
        }
    }
}

#[test]
fn the_start_belongs_to_a_window_and_the_end_does_not() {
    let t = base(0);
    let w = Windows::from(Window::new(t, t + Span::minutes(1)).unwrap());
    assert!(w.contains(t));
    assert!(!w.contains(t + Span::minutes(1)));
    assert!(Window::new(t, t).is_err());
}
