//! The heard pitch over one check as it is kept with its result, for reports to draw.

use plumbtone_analysis::check::{Column, Trace};
use serde::{Deserialize, Serialize};

/// Most columns of one curve.
pub(super) const COLUMNS_MAX: usize = 480;
/// Most columns of all curves of a session together, about a quarter of a megabyte: the oldest results lose theirs first.
pub(super) const COLUMNS_IN_ALL_MAX: usize = 8_192;
/// Most bars that a curve tells.
pub(super) const BARS_MAX: usize = 16;

/// The heard pitch over a check.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Curve {
    /// Stretches over which it was heard without a gap and without another note: columns of seconds (as the check's own),
    /// mean of the heard pitch above its reference, its standard deviation, lowest and highest of it in cents.
    pub pieces: Vec<Vec<[f64; 5]>>,
    /// Bars that begin within the check, where the transport told them: number, and seconds.
    pub bars: Vec<(i64, f64)>,
}

impl Curve {
    /// What a trace drew, none where nothing was heard; `seconds` tells the time of a stream position.
    pub(super) fn of(
        trace: &Trace,
        bars: Vec<(i64, f64)>,
        seconds: impl Fn(u64) -> f64,
    ) -> Option<Self> {
        let column = |column: &Column| {
            let ((first, last), (low, high)) = (column.positions, column.extremes);
            let at_s = rounded(seconds(first + (last - first) / 2), 1000.0);
            let cents = [column.cents(), column.sd_cents(), low, high].map(|x| rounded(x, 100.0));
            [at_s, cents[0], cents[1], cents[2], cents[3]]
        };
        let pieces: Vec<Vec<_>> =
            trace.pieces().map(|piece| piece.iter().map(column).collect()).collect();
        (!pieces.is_empty()).then_some(Self { pieces, bars })
    }

    /// How many columns it has.
    pub(super) fn columns(&self) -> usize {
        self.pieces.iter().map(Vec::len).sum()
    }

    /// Whether a curve that was read back can be one.
    pub(super) fn is_sound(&self) -> bool {
        let numbers = self.pieces.iter().flatten().flatten();
        self.columns() <= COLUMNS_MAX
            && self.pieces.iter().all(|piece| !piece.is_empty())
            && self.bars.len() <= BARS_MAX
            && numbers.chain(self.bars.iter().map(|(_, at)| at)).all(|x| x.is_finite())
    }
}

/// A number to a part of one; never the negative zero.
fn rounded(x: f64, parts: f64) -> f64 {
    (parts * x).round() / parts + 0.0
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::check::Heard;

    use super::*;

    fn traced(cents: impl Fn(u64) -> Option<f64>) -> Curve {
        let mut trace = Trace::new(COLUMNS_MAX);
        for index in 0..300 {
            if let Some(cents) = cents(index) {
                trace.push(&Heard {
                    position: 48_000 + 480 * index,
                    reference_hz: 440.0,
                    cents,
                    sd_cents: 0.254,
                    raw_cents: cents,
                });
            }
        }
        Curve::of(&trace, vec![(2, 2.0)], |at| at as f64 / 48_000.0).unwrap()
    }

    #[test]
    fn a_curve_says_when_and_how_high_to_the_hundredth() {
        let curve = traced(|index| (index < 100 || index >= 200).then_some(index as f64 / 7.0));
        assert_eq!(curve.pieces.iter().map(Vec::len).collect::<Vec<_>>(), [100, 100], "a gap");
        let told = serde_json::to_string(&curve.pieces[0][1]).unwrap();
        assert_eq!(told, "[1.01,0.14,0.25,0.14,0.14]", "a column");
        assert!(curve.is_sound(), "it can be read back");
    }

    #[test]
    fn what_is_no_curve_is_told_apart() {
        let sound = traced(|_| Some(1.0));
        for bad in [
            Curve { pieces: vec![vec![[0.0; 5]; COLUMNS_MAX + 1]], ..sound.clone() },
            Curve { pieces: vec![vec![[0.0, f64::INFINITY, 0.0, 0.0, 0.0]]], ..sound.clone() },
            Curve { pieces: vec![Vec::new()], ..sound.clone() },
            Curve { bars: vec![(1, f64::NAN)], ..sound.clone() },
            Curve { bars: vec![(1, 0.0); BARS_MAX + 1], ..sound },
        ] {
            assert!(!bad.is_sound(), "{bad:?}");
        }
    }
}
