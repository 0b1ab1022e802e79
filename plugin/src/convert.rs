//! The only place where numbers are narrowed; each helper says what happens outside its range.

/// A count of samples as a stream position.
pub(crate) fn position(samples: usize) -> u64 {
    samples as u64
}

/// A distance of stream positions as an index; saturates.
pub(crate) fn index(distance: u64) -> usize {
    usize::try_from(distance).unwrap_or(usize::MAX)
}

/// Whole number nearest to a non-negative one; 0 below zero or for NaN.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "saturates by definition of `as`"
)]
pub(crate) fn nearest(x: f64) -> u64 {
    x.round() as u64
}

/// Whole number not above a number; saturates, 0 for NaN.
#[expect(clippy::cast_possible_truncation, reason = "saturates by definition of `as`")]
pub(crate) fn floor(x: f64) -> i64 {
    x.floor() as i64
}

/// Single precision, rounded.
#[expect(
    clippy::cast_possible_truncation,
    reason = "rounding to the shorter mantissa is the purpose"
)]
pub(crate) fn single(x: f64) -> f32 {
    x as f32
}

/// The decimal number that a single-precision one stands for, such as 7.3, in double precision.
pub(crate) fn decimal(x: f32) -> f64 {
    x.to_string().parse().unwrap_or_else(|_| f64::from(x))
}

/// How far one stream position lies after another (negative: before), in samples; saturates.
pub(crate) fn signed_distance(from: u64, to: u64) -> i64 {
    if to >= from {
        i64::try_from(to - from).unwrap_or(i64::MAX)
    } else {
        i64::try_from(from - to).map_or(i64::MIN, |distance| -distance)
    }
}

/// A small whole number from an integer parameter; 0 below zero.
pub(crate) fn count(x: i32) -> usize {
    usize::try_from(x).unwrap_or(0)
}
