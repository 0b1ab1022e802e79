//! From partial numbers, cents and levels to points, and back; scales that change in steps and seldom.

use egui::{Rangef, lerp};

/// Steps of the scale of cents, and of the number of rows.
pub(crate) const CENTS: [f64; 14] =
    [2.0, 5.0, 10.0, 20.0, 30.0, 50.0, 70.0, 100.0, 150.0, 200.0, 300.0, 500.0, 1_000.0, 2_400.0];
const FLOORS: [f64; 5] = [40.0, 60.0, 80.0, 100.0, 120.0];
const ROWS: [f64; 11] = [8.0, 12.0, 16.0, 20.0, 24.0, 32.0, 40.0, 48.0, 64.0, 96.0, 128.0];
/// A scale shrinks only when less than this share of the next smaller step has been needed for so many seconds.
const SHRINK_SHARE: f64 = 0.9;
const SHRINK_S: f64 = 3.0;
/// The emptier side of the scale of cents is at least this share of the fuller one.
const EMPTY_SHARE: f64 = 0.25;
/// Room below the lowest row and above the highest, in rows.
const BELOW: f32 = 0.75;
const ABOVE: f32 = 0.5;

/// A scale's end, which grows at once and shrinks after a while.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Calm {
    step: usize,
    set: bool,
    small_since_s: Option<f64>,
}

impl Calm {
    /// Takes what is needed now; says what is shown.
    pub(crate) fn update(&mut self, need: f64, now_s: f64, ladder: &[f64]) -> f64 {
        let wanted = ladder.iter().position(|&step| step >= need).unwrap_or(ladder.len() - 1);
        if !self.set || wanted > self.step {
            *self = Self { step: wanted, set: true, small_since_s: None };
        } else if wanted < self.step && need <= SHRINK_SHARE * ladder[self.step - 1] {
            let since = *self.small_since_s.get_or_insert(now_s);
            if now_s - since >= SHRINK_S {
                *self = Self { step: wanted, set: true, small_since_s: None };
            }
        } else {
            self.small_since_s = None;
        }
        ladder[self.step]
    }
}

/// Both ends of a scale, in whole steps.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct CalmRange {
    shown: Option<(f64, f64)>,
    small_since_s: Option<f64>,
}

impl CalmRange {
    /// Takes the ends of what is to be seen; gives the scale's, multiples of a step and at least so far apart.
    pub(crate) fn update(
        &mut self,
        (low, high): (f64, f64),
        (step, least): (f64, f64),
        now_s: f64,
    ) -> (f64, f64) {
        let mut wanted = ((low / step).floor() * step, (high / step).ceil() * step);
        while wanted.1 - wanted.0 < least {
            wanted = if wanted.1 - high > low - wanted.0 {
                (wanted.0 - step, wanted.1)
            } else {
                (wanted.0, wanted.1 + step)
            };
        }
        let shown = self.shown.unwrap_or(wanted);
        if wanted.0 < shown.0 || wanted.1 > shown.1 || self.shown.is_none() {
            self.small_since_s = None;
            self.shown = Some((wanted.0.min(shown.0), wanted.1.max(shown.1)));
        } else if wanted != shown {
            let since = *self.small_since_s.get_or_insert(now_s);
            if now_s - since >= SHRINK_S {
                *self = Self { shown: Some(wanted), small_since_s: None };
            }
        } else {
            self.small_since_s = None;
        }
        self.shown.unwrap_or(wanted)
    }
}

/// The scale of cents, as left and right end.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct CalmCents {
    low: Calm,
    high: Calm,
}

impl CalmCents {
    /// Takes the ends of what is to be seen (as distances from zero); gives the scale's ends, lower first.
    pub(crate) fn update(&mut self, (low, high): (f64, f64), now_s: f64) -> (f64, f64) {
        let low = low.max(EMPTY_SHARE * high);
        let high = high.max(EMPTY_SHARE * low);
        (-self.low.update(low, now_s, &CENTS), self.high.update(high, now_s, &CENTS))
    }
}

/// The number of rows.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct CalmRows(Calm);

impl CalmRows {
    /// Takes the highest partial; gives the number of rows.
    pub(crate) fn update(&mut self, highest: u32, now_s: f64) -> f32 {
        crate::convert::single(self.0.update(f64::from(highest), now_s, &ROWS))
    }
}

/// The lower end of the scale of levels.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct CalmFloor(Calm);

impl CalmFloor {
    /// Takes how far below 0 dB the weakest level lies; gives the scale's lower end.
    pub(crate) fn update(&mut self, below_db: f64, now_s: f64) -> f64 {
        -self.0.update(below_db, now_s, &FLOORS)
    }
}

/// Partial numbers against height.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct RowAxis {
    pub(crate) y: Rangef,
    /// Number of the lowest row, and how many rows there are.
    pub(crate) first: f32,
    pub(crate) count: f32,
}

impl RowAxis {
    /// Height of a row, in points.
    pub(crate) fn row(&self) -> f32 {
        self.y.span() / (self.count - 1.0 + BELOW + ABOVE)
    }

    /// Where a partial lies; a number between two lies between them.
    pub(crate) fn at(&self, number: f32) -> f32 {
        self.y.max - (number - self.first + BELOW) * self.row()
    }

    /// The number at a height.
    pub(crate) fn number(&self, y: f32) -> f32 {
        self.first - BELOW + (self.y.max - y) / self.row()
    }

    /// Whether a whole row is to be seen.
    pub(crate) fn shows(&self, number: f32) -> bool {
        number > self.first - BELOW && number < self.first + self.count - 1.0 + ABOVE
    }
}

/// Values against width.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Axis {
    pub(crate) x: Rangef,
    pub(crate) low: f64,
    pub(crate) high: f64,
}

impl Axis {
    /// Where a value lies; beyond the ends at the ends, and at the left one for what is no number.
    pub(crate) fn at(&self, value: f64) -> f32 {
        let share = ((value - self.low) / (self.high - self.low)).clamp(0.0, 1.0);
        let share = if share.is_finite() { share } else { 0.0 };
        lerp(self.x.min..=self.x.max, crate::convert::single(share))
    }

    /// Whether a value lies within the ends.
    pub(crate) fn holds(&self, value: f64) -> bool {
        value >= self.low && value <= self.high
    }

    /// Round values at least `apart` points from each other.
    pub(crate) fn ticks(&self, apart: f32) -> Vec<f64> {
        let span = f64::from(self.x.span());
        let least = (self.high - self.low) * f64::from(apart) / span;
        if !(least > 0.0 && least.is_finite()) {
            return Vec::new();
        }
        let step = round_step(least);
        let first = (self.low / step - 1e-9).ceil();
        let count = ((self.high / step + 1e-9).floor() - first).clamp(0.0, 200.0);
        (0..=crate::convert::nearest(count)).map(|k| (first + k as f64) * step).collect()
    }
}

/// The smallest of 1, 2, 5, 10 and so on that is not below a number.
pub(crate) fn round_step(least: f64) -> f64 {
    let decade = 10f64.powf(least.log10().floor());
    let steps = [1.0, 2.0, 2.5, 5.0, 10.0];
    steps.into_iter().map(|by| by * decade).find(|&step| step >= least * 0.999).unwrap_or(least)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_scale_grows_at_once_and_shrinks_after_a_while() {
        let mut calm = Calm::default();
        let shown: Vec<f64> =
            [(0.0, 8.0), (0.1, 30.0), (0.2, 8.0), (1.0, 8.0), (3.1, 8.0), (3.3, 8.0)]
                .map(|(now, need)| calm.update(need, now, &CENTS))
                .to_vec();
        assert_eq!(shown, [10.0, 30.0, 30.0, 30.0, 30.0, 10.0]);
    }

    #[test]
    fn a_need_about_a_step_moves_nothing() {
        let mut calm = Calm::default();
        for tick in 0..2_000 {
            let need = 10.0 + 0.4 * f64::from(tick % 7 - 3);
            let shown = calm.update(need, f64::from(tick) * 0.016, &CENTS);
            assert!(tick < 5 || shown > 19.0, "{tick}: {shown}");
        }
    }

    #[test]
    fn a_range_holds_what_is_needed_in_whole_steps() {
        let mut range = CalmRange::default();
        let shown: Vec<(f64, f64)> = [
            (0.0, (-18.0, -14.0)),
            (0.1, (-31.0, -14.0)),
            (0.2, (-18.0, -14.0)),
            (3.1, (-18.0, -14.0)),
            (3.3, (-18.0, -14.0)),
        ]
        .map(|(now, need)| range.update(need, (6.0, 12.0), now))
        .to_vec();
        let (small, large) = ((-24.0, -12.0), (-36.0, -12.0));
        assert_eq!(shown, [small, large, large, large, small]);
    }

    #[test]
    fn no_need_breaks_a_scale() {
        let mut cents = CalmCents::default();
        for need in [0.0, 1e9, f64::NAN, f64::INFINITY] {
            let (low, high) = cents.update((need, need), 0.0);
            assert!(low < 0.0 && high > 0.0 && high <= 2_400.0, "{need}: {low} {high}");
        }
    }

    #[test]
    fn rows_lie_evenly_and_strays_between_them() {
        let axis = RowAxis { y: Rangef::new(100.0, 500.0), first: 1.0, count: 20.0 };
        assert!(axis.at(20.0) > 100.0 && axis.at(1.0) < 500.0, "{axis:?}");
        assert!((axis.at(1.0) - axis.at(2.0) - axis.row()).abs() < 1e-3, "{axis:?}");
        assert!(axis.at(0.45) > axis.at(1.0) && axis.at(0.45) < 500.0, "a stray below partial 1");
        assert!(axis.shows(20.0) && !axis.shows(21.0) && !axis.shows(0.1), "{axis:?}");
    }

    #[test]
    fn ticks_are_round_and_within() {
        let axis = Axis { x: Rangef::new(0.0, 400.0), low: -12.5, high: 50.0 };
        assert_eq!(axis.ticks(60.0), [-10.0, 0.0, 10.0, 20.0, 30.0, 40.0, 50.0]);
        let flat = Axis { low: 1.0, high: 1.0, ..axis };
        assert_eq!((flat.ticks(60.0), flat.at(1.0)), (vec![], 0.0));
        assert!(
            (axis.at(f64::NAN) - axis.at(-1e9)).abs() < 1e-6,
            "no number has a place at the end"
        );
    }
}
