//! Figures that hold still: smoothed while a sound holds, rounded by their own deviation, changed only when they must.

/// Time constant of the smoothing, in seconds.
const SMOOTHING_S: f64 = 0.25;
/// Distance from what is shown, in steps of its last digit, that a value must cover before the figure changes.
const HOLD_STEPS: f64 = 0.7;
/// A value this many deviations (and last digits) away from the smoothed one is another one and is taken at once.
const LEAP: f64 = 8.0;
/// A figure is given to the digit that is at most this many deviations.
const DEVIATIONS_A_DIGIT: f64 = 3.0;
/// How far beyond that limit the deviation must be before a digit comes or goes.
const DIGIT_HOLD: f64 = 1.6;

/// What stands for a figure that there is none of.
pub(crate) const NONE: &str = "\u{2013}";

/// A figure on display.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(crate) struct Steady {
    smooth: Option<f64>,
    shown: f64,
    decimals: usize,
}

impl Steady {
    /// Takes the newest value with its deviation, `elapsed_s` after the one before; at most `most` decimals are shown.
    pub(crate) fn update(&mut self, value: f64, sd: f64, elapsed_s: f64, most: usize) {
        if !value.is_finite() {
            *self = Self::default();
            return;
        }
        let fits = decimals(sd, most);
        let Some(smooth) = self.smooth else {
            *self = Self { smooth: Some(value), shown: value, decimals: fits };
            return;
        };
        let holds = decimals(sd * DIGIT_HOLD, most).min(decimals(sd / DIGIT_HOLD, most));
        let gives = decimals(sd / DIGIT_HOLD, most).max(holds);
        self.decimals = self.decimals.clamp(holds, gives);
        let step = 0.1f64.powi(exponent(self.decimals));
        let leaps = !((value - smooth).abs() <= LEAP * sd.max(step));
        let share = if leaps { 1.0 } else { 1.0 - (-elapsed_s.max(0.0) / SMOOTHING_S).exp() };
        let smooth = smooth + share * (value - smooth);
        self.smooth = Some(smooth);
        if leaps || (smooth - self.shown).abs() > HOLD_STEPS * step {
            self.shown = smooth;
        }
    }

    /// Forgets what was shown: another sound begins.
    pub(crate) fn clear(&mut self) {
        *self = Self::default();
    }

    /// The figure.
    pub(crate) fn text(&self, signed: bool) -> String {
        if signed {
            self::signed(self.shown, self.decimals)
        } else {
            format!("{:.*}", self.decimals, self.shown)
        }
    }
}

/// Decimals worth showing of a figure with this deviation.
pub(crate) fn decimals(sd: f64, most: usize) -> usize {
    (0..most).find(|&count| sd * DEVIATIONS_A_DIGIT >= 0.1f64.powi(exponent(count))).unwrap_or(most)
}

/// A figure with its sign, as print has it; zero has none, and what is no number is a dash.
pub(crate) fn signed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return NONE.to_owned();
    }
    let text = format!("{:.*}", decimals, value.abs());
    let zero = text.bytes().all(|byte| matches!(byte, b'0' | b'.'));
    match value {
        _ if zero => text,
        value if value < 0.0 => format!("\u{2212}{text}"),
        _ => format!("+{text}"),
    }
}

fn exponent(decimals: usize) -> i32 {
    i32::try_from(decimals).unwrap_or(i32::MAX)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_follow_the_deviation() {
        for (sd, expected) in [(30.0, 0), (0.5, 0), (0.2, 1), (0.03, 2), (0.001, 2), (f64::NAN, 2)]
        {
            assert_eq!(decimals(sd, 2), expected, "{sd}");
        }
    }

    #[test]
    fn noise_of_its_own_deviation_moves_no_figure() {
        let mut steady = Steady::default();
        let mut texts = std::collections::BTreeSet::new();
        let mut seed = 1u32;
        for _ in 0..2_000 {
            seed = seed.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            let noise = 2.0 * f64::from(seed >> 8) / f64::from(1 << 24) - 1.0;
            steady.update(1.8 + 0.1 * noise, 0.06, 1.0 / 60.0, 2);
            texts.insert(steady.text(true));
        }
        assert!(texts.len() <= 2, "{texts:?}");
    }

    #[test]
    fn another_pitch_is_shown_at_once_and_a_slow_change_is_followed() {
        let mut steady = Steady::default();
        steady.update(1.8, 0.05, 0.016, 2);
        steady.update(-37.0, 0.05, 0.016, 2);
        assert_eq!(steady.text(true), "\u{2212}37.0");
        for step in 0..600 {
            steady.update(-37.0 + f64::from(step) * 0.01, 0.05, 0.016, 2);
        }
        let shown: f64 = steady.text(true).replace('\u{2212}', "-").parse().unwrap();
        assert!((shown + 31.1).abs() < 0.3, "{shown}");
    }

    #[test]
    fn what_is_no_number_is_not_kept() {
        let mut steady = Steady::default();
        steady.update(f64::NAN, 1.0, 0.1, 2);
        steady.update(3.0, f64::INFINITY, 0.1, 2);
        steady.update(3.2, f64::NAN, f64::NAN, 2);
        assert!(steady.text(true).starts_with("+3"), "{steady:?}");
    }
}
