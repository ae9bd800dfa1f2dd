//! Bisection: slow, sure, and the same bits everywhere.

/// Where `f`, which rises over `[low, high]`, crosses zero; an end where it does not.
///
/// Stops when the bracket can be halved no more, which for doubles is under 70 halvings here; the
/// bound of 200 only guards against a NaN from `f`.
pub(crate) fn crossing(mut low: f64, mut high: f64, f: impl Fn(f64) -> f64) -> f64 {
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        if f(middle) < 0.0 {
            low = middle;
        } else {
            high = middle;
        }
    }
    0.5 * (low + high)
}
