//! The pitch of a note from instant to instant: whether it moves, and where it is in between.

use crate::stiff::CENTS_PER_NEPER;

/// Scatter of the pitch over the note, against its own deviations and in cents, that makes it move.
const MOVES_CHI: f64 = 4.0;
const MOVES_CENTS: f64 = 0.3;

/// The pitch of one instant of the note.
#[derive(Debug, Clone, Copy)]
pub(crate) struct PathPoint {
    /// Centre of the instant, in samples.
    pub(crate) centre: u64,
    /// Natural logarithm of the fundamental.
    pub(crate) log_f0: f64,
    /// Its deviation.
    pub(crate) sd: f64,
}

/// A path by which the pitch moves.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Movement {
    /// Mean of `ln f0`.
    pub(crate) mean_log: f64,
    /// Half the range of `ln f0`.
    pub(crate) sweep: f64,
}

/// Decides whether the pitch moves. If so, fills `bend` with the ratio of the fundamental to its (geometric) mean, for
/// blocks of `block` samples from `start` on.
pub(crate) fn follow(
    path: &[PathPoint],
    (start, block, blocks): (u64, usize, usize),
    bend: &mut Vec<f64>,
) -> Option<Movement> {
    bend.clear();
    let edge = (path.len() / 6).min(4);
    let inner = &path[edge..path.len() - edge];
    let count = inner.len() as f64;
    let mean = inner.iter().map(|p| p.log_f0).sum::<f64>() / count;
    let square = inner.iter().map(|p| (p.log_f0 - mean).powi(2)).sum::<f64>() / count;
    let own = inner.iter().map(|p| p.sd * p.sd).sum::<f64>() / count;
    let moves = square > MOVES_CHI * own && square.sqrt() * CENTS_PER_NEPER > MOVES_CENTS;
    if !moves || inner.len() < 8 {
        return None;
    }
    let (mut low, mut high, mut sum) = (f64::INFINITY, f64::NEG_INFINITY, 0.0);
    let hop = (inner[1].centre - inner[0].centre) as f64;
    for m in 0..blocks {
        let at = start as f64 + (m as f64 + 0.5) * block as f64;
        let log = smooth_at(inner, (at - inner[0].centre as f64) / hop);
        (low, high) = (low.min(log), high.max(log));
        sum += log;
        bend.push(log);
    }
    let mean_log = sum / blocks as f64;
    for bend in bend {
        *bend = (*bend - mean_log).exp();
    }
    Some(Movement { mean_log, sweep: 0.5 * (high - low) })
}

/// The path at a fractional index: each point smoothed over five by a parabola (A. Savitzky & M. Golay, 1964), then a
/// cubic through four.
fn smooth_at(path: &[PathPoint], at: f64) -> f64 {
    let last = path.len() - 1;
    let at = at.clamp(0.0, last as f64);
    let base = crate::convert::floor_index(at).min(last - 1);
    let x = at - base as f64;
    let value = |i: usize| -> f64 {
        let p = |j: usize| path[j].log_f0;
        if i < 2 || i + 2 > last {
            return p(i);
        }
        (-3.0 * (p(i - 2) + p(i + 2)) + 12.0 * (p(i - 1) + p(i + 1)) + 17.0 * p(i)) / 35.0
    };
    let (b, c) = (value(base), value(base + 1));
    let a = if base > 0 { value(base - 1) } else { 2.0 * b - c };
    let d = if base + 2 <= last { value(base + 2) } else { 2.0 * c - b };
    let slope_b = 0.5 * (c - a);
    let slope_c = 0.5 * (d - b);
    let (x2, x3) = (x * x, x * x * x);
    b * (2.0 * x3 - 3.0 * x2 + 1.0)
        + slope_b * (x3 - 2.0 * x2 + x)
        + c * (3.0 * x2 - 2.0 * x3)
        + slope_c * (x3 - x2)
}
