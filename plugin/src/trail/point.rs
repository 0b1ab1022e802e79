//! One reading's pitch in four bytes, and eight readings' in eight.

use std::sync::LazyLock;

use crate::convert::{index, nearest};

/// The pitch scale starts here, in Hz, and has this many steps per cent of a semitone: 0.0025 cents, far below what any
/// reading can tell, up to 5.8 kHz.
const BASE_HZ: f64 = 13.75;
const STEPS_A_CENT: f64 = 400.0;
const PITCH_MAX: u32 = (1 << 22) - 1;
/// Deviations from this many cents to 10^5 times that, on a logarithmic scale of 127 steps.
const SD_LOWEST: f64 = 1e-3;
const SD_DECADES: f64 = 5.0;
const SD_MAX: u32 = 127;
/// Steps per cent of a cell's spread.
const SPREAD_STEPS: f64 = 100.0;
/// Readings further than this from a cell's newest belong to another note and are left out of its mean, in cents.
const SAME_NOTE: f64 = 80.0;

/// All deviations: looked up, since a picture needs thousands of them.
static SDS: LazyLock<[f64; 128]> = LazyLock::new(|| {
    core::array::from_fn(|step| {
        SD_LOWEST * 10f64.powf(SD_DECADES * step as f64 / f64::from(SD_MAX))
    })
});

/// What one reading said.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// There was no reading.
    Nothing,
    /// Silence.
    Silent,
    /// No pitch.
    Unpitched,
    /// More than one pitch.
    Several,
    /// A pitch on the move.
    Gliding,
    /// A pitch that holds.
    Steady,
}

/// One reading: pitch (22 bits), deviation (7 bits), kind (3 bits).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Point(u32);

/// Eight readings of one stretch of the grid.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Cell {
    /// Mean pitch, and mean deviation.
    pub mean: Point,
    below: u16,
    above: u16,
}

impl Kind {
    /// Whether there is a single pitch.
    #[must_use]
    pub fn pitched(self) -> bool {
        matches!(self, Self::Gliding | Self::Steady)
    }
}

impl Point {
    /// No reading.
    pub const NOTHING: Self = Self(0);

    /// A single pitch, in Hz, with its deviation in cents.
    #[must_use]
    pub fn pitched(f0_hz: f64, sd_cents: f64, steady: bool) -> Self {
        if !(f0_hz > 0.0 && f0_hz.is_finite()) {
            return Self::without(Kind::Unpitched);
        }
        Self::at(Self::cents_of(f0_hz), sd_cents, steady)
    }

    /// A reading without a single pitch.
    #[must_use]
    pub fn without(kind: Kind) -> Self {
        Self(match kind {
            Kind::Nothing | Kind::Gliding | Kind::Steady => 0,
            Kind::Silent => 1,
            Kind::Unpitched => 2,
            Kind::Several => 3,
        })
    }

    /// What the reading said.
    #[must_use]
    pub fn kind(self) -> Kind {
        match self.0 & 7 {
            1 => Kind::Silent,
            2 => Kind::Unpitched,
            3 => Kind::Several,
            4 => Kind::Gliding,
            5 => Kind::Steady,
            _ => Kind::Nothing,
        }
    }

    /// Pitch, in cents above 13.75 Hz (the A five octaves below A4 at 440 Hz); of no use without a single pitch.
    #[must_use]
    pub fn cents(self) -> f64 {
        f64::from(self.0 >> 10) / STEPS_A_CENT
    }

    /// A frequency in the cents that pitches are kept in.
    #[must_use]
    pub fn cents_of(hz: f64) -> f64 {
        1200.0 * (hz / BASE_HZ).log2()
    }

    /// Deviation in cents.
    #[must_use]
    pub fn sd_cents(self) -> f64 {
        SDS[index(u64::from((self.0 >> 3) & SD_MAX))]
    }

    fn at(cents: f64, sd_cents: f64, steady: bool) -> Self {
        let pitch = code(cents * STEPS_A_CENT, PITCH_MAX);
        let decades = (sd_cents.max(SD_LOWEST) / SD_LOWEST).log10() / SD_DECADES;
        let sd = if sd_cents.is_nan() { SD_MAX } else { code(decades * f64::from(SD_MAX), SD_MAX) };
        Self(pitch << 10 | sd << 3 | if steady { 5 } else { 4 })
    }
}

impl Cell {
    /// Sums readings up, oldest first.
    #[must_use]
    pub fn of(points: &[Point]) -> Self {
        let Some(newest) = points.iter().rev().find(|point| point.kind().pitched()) else {
            let kind = points.iter().map(|point| point.kind()).find(|&kind| kind != Kind::Nothing);
            return Self { mean: kind.map_or(Point::NOTHING, Point::without), below: 0, above: 0 };
        };
        let (mut count, mut sum, mut sd) = (0.0, 0.0, 0.0);
        let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
        let mut steady = 0.0;
        for point in points.iter().filter(|point| point.kind().pitched()) {
            let cents = point.cents();
            if (cents - newest.cents()).abs() > SAME_NOTE {
                continue;
            }
            count += 1.0;
            sum += cents;
            sd += point.sd_cents();
            low = low.min(cents);
            high = high.max(cents);
            steady += if point.kind() == Kind::Steady { 1.0 } else { 0.0 };
        }
        let mean = sum / count;
        Self {
            mean: Point::at(mean, sd / count, steady > 0.5 * count),
            below: spread(mean - low),
            above: spread(high - mean),
        }
    }

    /// Lowest and highest pitch, in cents as those of [`Point::cents`].
    #[must_use]
    pub fn range_cents(&self) -> (f64, f64) {
        let mean = self.mean.cents();
        (mean - f64::from(self.below) / SPREAD_STEPS, mean + f64::from(self.above) / SPREAD_STEPS)
    }
}

impl Default for Cell {
    fn default() -> Self {
        Self { mean: Point::NOTHING, below: 0, above: 0 }
    }
}

fn code(x: f64, most: u32) -> u32 {
    u32::try_from(nearest(x)).unwrap_or(most).min(most)
}

fn spread(cents: f64) -> u16 {
    u16::try_from(nearest(cents * SPREAD_STEPS)).unwrap_or(u16::MAX)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_point_reads_back_what_was_put_in() {
        for hz in [20.0, 27.5, 220.123, 440.0, 4186.0, 5000.0] {
            for sd in [0.001, 0.05, 1.3, 40.0] {
                let point = Point::pitched(hz, sd, true);
                let cents = 1200.0 * (hz / BASE_HZ).log2();
                assert!((point.cents() - cents).abs() <= 0.00126, "{hz} {sd}: {point:?}");
                assert!((point.sd_cents() / sd - 1.0).abs() < 0.05, "{hz} {sd}: {point:?}");
                assert_eq!(point.kind(), Kind::Steady, "{hz} {sd}");
            }
        }
    }

    #[test]
    fn hostile_figures_make_no_pitch_or_a_bounded_one() {
        for hz in [f64::NAN, 0.0, -3.0, f64::INFINITY] {
            assert_eq!(Point::pitched(hz, 1.0, true).kind(), Kind::Unpitched, "{hz}");
        }
        for (hz, sd) in [(1e-300, 1.0), (1e300, f64::INFINITY), (440.0, f64::NAN)] {
            let point = Point::pitched(hz, sd, false);
            assert!(point.cents() <= 10_486.0 && point.sd_cents() <= 101.0, "{hz} {sd}: {point:?}");
        }
    }

    #[test]
    fn a_cell_holds_lowest_mean_and_highest_of_one_note() {
        let cents = [900.0, 3_000.0, 3_010.0, 2_990.0, 3_000.0];
        let points = cents.map(|cents| Point::at(cents, 0.1, true));
        let cell = Cell::of(&points);
        let (low, high) = cell.range_cents();
        assert!((cell.mean.cents() - 3_000.0).abs() < 0.01, "another note is left out: {cell:?}");
        assert!((low - 2_990.0).abs() < 0.02 && (high - 3_010.0).abs() < 0.02, "{low} {high}");
        assert_eq!(Cell::of(&[Point::NOTHING]).mean.kind(), Kind::Nothing);
        assert_eq!(
            Cell::of(&[Point::NOTHING, Point::without(Kind::Silent)]).mean.kind(),
            Kind::Silent
        );
    }
}
