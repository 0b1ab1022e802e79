//! The only place that narrows numbers.

/// Nearest index to a number of samples; 0 for a negative one.
#[must_use]
#[expect(clippy::cast_possible_truncation, reason = "rounded first, and `as` saturates")]
#[expect(clippy::cast_sign_loss, reason = "`as` saturates at 0")]
pub fn index(samples: f64) -> usize {
    samples.round() as usize
}
