//! Intervals: a frequency ratio as cents and back. An octave is 1200 cents (A. J. Ellis, 1885).

/// Cents of a frequency ratio above 0: 1200 log2(ratio).
#[must_use]
pub fn cents(ratio: f64) -> f64 {
    1200.0 * ratio.log2()
}

/// Frequency ratio of an interval in cents.
#[must_use]
pub fn ratio(cents: f64) -> f64 {
    (cents / 1200.0).exp2()
}
