//! The only place where numbers are narrowed; each helper says what happens outside its range.

/// Nearest index to a non-negative number; 0 below zero or for NaN.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "saturates by definition of `as`"
)]
#[inline(always)]
pub(crate) fn nearest_index(x: f64) -> usize {
    (x + 0.5) as usize
}

/// Nearest whole number, the even one of two, to a number below `2^51`: without a call into the mathematical library.
#[inline(always)]
pub(crate) fn nearest(x: f64) -> f64 {
    /// `1.5 * 2^52`: added, it leaves no room for a fraction.
    const WHOLE: f64 = 6_755_399_441_055_744.0;
    x + WHOLE - WHOLE
}

/// Largest index not above a number; 0 below zero or for NaN.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "saturates by definition of `as`"
)]
pub(crate) fn floor_index(x: f64) -> usize {
    x as usize
}

/// Nearest whole number; saturates, 0 for NaN.
#[expect(clippy::cast_possible_truncation, reason = "saturates by definition of `as`")]
pub(crate) fn nearest_short(x: f64) -> i16 {
    x.round() as i16
}

/// Single precision, rounded.
#[expect(
    clippy::cast_possible_truncation,
    reason = "rounding to the shorter mantissa is the purpose"
)]
pub(crate) fn single(x: f64) -> f32 {
    x as f32
}

/// A partial number as the public types carry it; saturates.
pub(crate) fn number(n: usize) -> u32 {
    u32::try_from(n).unwrap_or(u32::MAX)
}

/// A distance of sample positions as an index; saturates.
pub(crate) fn index(position: u64) -> usize {
    usize::try_from(position).unwrap_or(usize::MAX)
}

/// Nearest sample position to a non-negative number; saturates, 0 for NaN.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "saturates by definition of `as`"
)]
pub(crate) fn nearest_position(x: f64) -> u64 {
    x.round() as u64
}
