//! The only place where this program narrows numbers.

/// Samples in a time: rounded to the nearest, 0 for a negative time, saturating.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "saturates, as wanted")]
pub(crate) fn samples_in(seconds: f64, sample_rate_hz: f64) -> u64 {
    (seconds * sample_rate_hz).round() as u64
}

/// A count that indexes memory. A count too large for it saturates, and the allocation or slice that follows is bounded
/// by what is there.
pub(crate) fn index(count: u64) -> usize {
    usize::try_from(count).unwrap_or(usize::MAX)
}

/// A picture coordinate: the nearest whole drawing unit, saturating; NaN becomes 0.
#[expect(clippy::cast_possible_truncation, reason = "saturates, as wanted")]
pub(crate) fn drawing_unit(value: f64) -> i32 {
    value.round() as i32
}

/// A level or sample kept in single precision.
#[expect(
    clippy::cast_possible_truncation,
    reason = "24 bits of mantissa are enough for what is drawn"
)]
pub(crate) fn single(value: f64) -> f32 {
    value as f32
}

/// Decimals that show a deviation with two significant digits, within 0 to `most`.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "clamped to 0..=most before the cast"
)]
pub(crate) fn decimals_for(deviation: f64, most: usize) -> usize {
    if deviation > 0.0 && deviation.is_finite() {
        (1.0 - deviation.log10().floor()).clamp(0.0, most as f64) as usize
    } else {
        most
    }
}
