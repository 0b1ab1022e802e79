//! The heard pitch over one check, in few enough columns to be kept and drawn.
//!
//! Columns are as wide as they have to be: whenever there are too many, two become one. Their places follow from the check's
//! length alone, so equal readings give equal columns.

use plumbtone_analysis::check::Heard;
use serde::{Deserialize, Serialize};

/// Most columns of one curve.
pub(crate) const COLUMNS_MAX: usize = 480;
/// Most columns of all curves of a session together, about a quarter of a megabyte: the oldest results lose theirs first.
pub(super) const COLUMNS_IN_ALL_MAX: usize = 16_384;
/// Most bars that a curve tells.
pub(super) const BARS_MAX: usize = 16;

/// The heard pitch over a check.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Curve {
    /// How long a column lasts, in seconds.
    pub step_s: f64,
    /// From the start of the check on: mean of the heard pitch above its reference, its standard deviation, lowest and
    /// highest of it, in cents to the hundredth; none where nothing was heard.
    pub columns: Vec<Option<[f64; 4]>>,
    /// Bars that begin within the check, where the transport told them: number, and seconds as the check's own.
    pub bars: Vec<(i64, f64)>,
}

impl Curve {
    /// Whether a curve that was read back can be one.
    pub(super) fn is_sound(&self) -> bool {
        let columns = self.columns.iter().flatten().flatten();
        self.step_s > 0.0
            && self.step_s.is_finite()
            && self.columns.len() <= COLUMNS_MAX
            && self.bars.len() <= BARS_MAX
            && columns.chain(self.bars.iter().map(|(_, at)| at)).all(|x| x.is_finite())
    }
}

/// A curve that grows.
#[derive(Debug)]
pub(super) struct Tracing {
    start: u64,
    /// Samples in a column.
    width: u64,
    columns: Vec<Sums>,
}

#[derive(Debug, Clone, Copy, Default)]
struct Sums {
    count: f64,
    cents: f64,
    sd: f64,
    low: f64,
    high: f64,
}

impl Tracing {
    /// A curve from a position on, of what is heard every `hop` samples.
    pub(super) fn new(start: u64, hop: usize) -> Self {
        Self { start, width: hop.max(1) as u64, columns: Vec::new() }
    }

    pub(super) fn push(&mut self, heard: &Heard) {
        let distance = heard.position.saturating_sub(self.start);
        while distance / self.width >= COLUMNS_MAX as u64 {
            self.halve();
        }
        let index = crate::convert::index(distance / self.width);
        if index >= self.columns.len() {
            self.columns.resize(index + 1, Sums::default());
        }
        self.columns[index].add(Sums {
            count: 1.0,
            cents: heard.cents,
            sd: heard.sd_cents,
            low: heard.cents,
            high: heard.cents,
        });
    }

    /// The curve so far; none where nothing was heard.
    pub(super) fn curve(&self, sample_rate_hz: f64, bars: Vec<(i64, f64)>) -> Option<Curve> {
        let columns: Vec<_> = self.columns.iter().map(Sums::column).collect();
        let step_s = self.width as f64 / sample_rate_hz;
        (!columns.is_empty()).then_some(Curve { step_s, columns, bars })
    }

    fn halve(&mut self) {
        self.width *= 2;
        let pair = |pair: &[Sums]| {
            let mut one = pair[0];
            pair[1..].iter().for_each(|other| one.add(*other));
            one
        };
        self.columns = self.columns.chunks(2).map(pair).collect();
    }
}

impl Sums {
    fn add(&mut self, other: Self) {
        if other.count > 0.0 {
            let none = self.count <= 0.0;
            self.low = if none { other.low } else { self.low.min(other.low) };
            self.high = if none { other.high } else { self.high.max(other.high) };
            self.count += other.count;
            self.cents += other.cents;
            self.sd += other.sd;
        }
    }

    fn column(&self) -> Option<[f64; 4]> {
        // The negative zero is none to be told.
        let hundredth = |cents: f64| (100.0 * cents).round() / 100.0 + 0.0;
        let Self { count, cents, sd, low, high } = *self;
        (count > 0.0).then(|| [cents / count, sd / count, low, high].map(hundredth))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const HOP: u64 = 480;

    fn heard(index: u64, cents: f64) -> Heard {
        Heard {
            position: 1_000 + index * HOP,
            reference_hz: 440.0,
            cents,
            sd_cents: 0.25,
            raw_cents: cents,
        }
    }

    fn traced(count: u64, cents: impl Fn(u64) -> Option<f64>) -> Curve {
        let mut tracing = Tracing::new(1_000, 480);
        for index in 0..count {
            cents(index).into_iter().for_each(|cents| tracing.push(&heard(index, cents)));
        }
        tracing.curve(48_000.0, Vec::new()).unwrap()
    }

    #[test]
    fn a_short_check_keeps_each_reading() {
        let curve = traced(300, |index| (index != 7).then_some(index as f64 / 8.0));
        assert_eq!(curve.columns.len(), 300, "columns");
        assert!((curve.step_s - 0.01).abs() < 1e-12, "{}", curve.step_s);
        assert_eq!(curve.columns[7], None, "a gap stays one");
        assert_eq!(curve.columns[8], Some([1.0, 0.25, 1.0, 1.0]), "a column is its reading");
    }

    #[test]
    fn a_long_check_keeps_its_shape_in_as_few_columns() {
        // A quarter of an hour, with one reading that stands out and a silent minute.
        let count = 90_000;
        let cents = |index: u64| match index {
            30_000..36_000 => None,
            70_001 => Some(40.0),
            _ => Some(index as f64 / 10_000.0),
        };
        let curve = traced(count, cents);
        assert!((240..=COLUMNS_MAX).contains(&curve.columns.len()), "{}", curve.columns.len());
        let at = |index: f64| {
            curve.columns
                [crate::convert::index(crate::convert::nearest(index * 0.01 / curve.step_s))]
        };
        assert_eq!(at(33_000.0), None, "silence");
        let [mean, sd, ..] = at(50_000.0).unwrap();
        assert!((mean - 5.0).abs() < 0.02 && (sd - 0.25).abs() < 0.01, "{mean} ± {sd}");
        let highest = curve.columns.iter().flatten().map(|column| column[3]).fold(0.0, f64::max);
        assert!((highest - 40.0).abs() < 1e-9, "the one that stands out is still there: {highest}");
        assert!(curve.is_sound(), "it can be read back");
    }

    #[test]
    fn what_is_no_curve_is_told_apart() {
        let sound = traced(10, |_| Some(1.0));
        for bad in [
            Curve { step_s: 0.0, ..sound.clone() },
            Curve { step_s: f64::NAN, ..sound.clone() },
            Curve { columns: vec![None; COLUMNS_MAX + 1], ..sound.clone() },
            Curve { columns: vec![Some([0.0, f64::INFINITY, 0.0, 0.0])], ..sound.clone() },
            Curve { bars: vec![(1, f64::NAN)], ..sound },
        ] {
            assert!(!bad.is_sound(), "{bad:?}");
        }
    }
}
