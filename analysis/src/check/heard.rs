//! The pitch that a listener hears: the trend of the readings around each, without vibrato, and sharp at steps and bends.
//!
//! Long windows (0.6 s) slide over a piece of pitch, each fitted with a line and, where there is one, a vibrato. A reading
//! is heard as the mean of the trends of those long windows around it that fit best, so that a window which straddles a
//! step does not count. Where no long window fits, short ones (0.15 s) on its left, on its right or around it serve, the
//! best of them.
//!
//! A listener hears a vibrato at the mean of its cents (J. Sundberg, The Science of the Singing Voice, 1987, ch. 8).

use std::collections::VecDeque;

use super::CheckSettings;
use super::ORIGIN_HZ;
use super::fit::{Fit, Wave, mean_variance};
use crate::convert::nearest_index;
use crate::tuning::ratio;

/// Length of long and of short windows, in seconds, and the distance of long ones.
const LONG_S: f64 = 0.6;
const SHORT_S: f64 = 0.15;
const STRIDE_S: f64 = 0.05;
/// How much more a window may leave than the best around the same reading, as a ratio of mean squares, to be averaged in.
const AS_GOOD: f64 = 1.5;
/// How much more a long window may leave than the best short one.
const WORTH_SHORT: f64 = 4.0;
/// Readings of a step at once that end a piece, in cents: more than any vibrato moves from one reading to the next.
const JUMP_CENTS: f64 = 60.0;
/// Frames that the engine refines in, in periods and seconds; overlapping frames say half of a frame's length once.
const FRAME_PERIODS: f64 = 6.5;
const FRAME_S: (f64, f64) = (0.021, 0.171);

/// A reading with a pitch.
#[derive(Debug, Clone, Copy)]
pub(super) struct Point {
    pub(super) position: u64,
    pub(super) time_s: f64,
    /// Pitch in absolute cents.
    pub(super) cents: f64,
    pub(super) sd: f64,
    pub(super) given_hz: Option<f64>,
}

/// What a reading was judged to be heard as.
#[derive(Debug, Clone, Copy)]
pub(super) struct Judged {
    pub(super) point: Point,
    /// Heard pitch in absolute cents, and its deviation.
    pub(super) cents: f64,
    pub(super) sd: f64,
    /// Cents per second.
    pub(super) slope: f64,
    /// The reading less its vibrato, in absolute cents.
    pub(super) without_vibrato: f64,
    /// Rate in Hz and extent in cents.
    pub(super) vibrato: Option<(f64, f64)>,
}

/// The readings of the piece at hand, and the long windows over them.
#[derive(Debug)]
pub(super) struct Hearing {
    hop_s: f64,
    long: usize,
    short: usize,
    stride: usize,
    points: VecDeque<Point>,
    /// Number of the first point kept, within the piece.
    base: usize,
    windows: VecDeque<Window>,
    /// Where the next window starts, and the next point to be judged, within the piece.
    next_window: usize,
    next_point: usize,
    ended: bool,
}

/// A fitted window over the points `start` to `end` of the piece.
#[derive(Debug)]
struct Window {
    start: usize,
    end: usize,
    fit: Fit,
}

impl Hearing {
    pub(super) fn new(settings: &CheckSettings) -> Self {
        let readings = |seconds: f64| nearest_index(seconds / settings.hop_s()).max(2);
        let (long, stride) = (readings(LONG_S), readings(STRIDE_S));
        Self {
            hop_s: settings.hop_s(),
            long,
            short: readings(SHORT_S),
            stride,
            points: VecDeque::with_capacity(2 * long + 2 * stride),
            base: 0,
            windows: VecDeque::with_capacity(2 * long / stride + 4),
            next_window: 0,
            next_point: 0,
            ended: false,
        }
    }

    pub(super) fn last_position(&self) -> Option<u64> {
        self.points.back().map(|point| point.position)
    }

    /// Whether a point is another note than the last.
    pub(super) fn is_jump(&self, point: &Point) -> bool {
        self.points.back().is_some_and(|last| (point.cents - last.cents).abs() > JUMP_CENTS)
    }

    /// Takes in the next point of the piece, or the first of a new one.
    pub(super) fn push(&mut self, point: Point) {
        self.points.push_back(point);
        if self.count() == self.next_window + self.long {
            self.fit(self.next_window);
            self.next_window += self.stride;
        }
    }

    /// Ends the piece; its points are judged with what there is.
    pub(super) fn end_piece(&mut self) {
        let count = self.count();
        if self.ended || count == 0 {
            return;
        }
        self.ended = true;
        let last = self.windows.back().map_or(0, |window| window.end);
        if last < count {
            self.fit(count.saturating_sub(self.long).max(self.base));
        }
    }

    /// The next point whose surroundings are known.
    pub(super) fn next(&mut self) -> Option<Judged> {
        let known = if self.ended { self.count() } else { self.next_window };
        if self.next_point >= known {
            if self.ended {
                self.restart();
            }
            return None;
        }
        let judged = self.judge(self.next_point);
        self.next_point += 1;
        self.forget();
        Some(judged)
    }

    fn count(&self) -> usize {
        self.base + self.points.len()
    }

    fn restart(&mut self) {
        self.points.clear();
        self.windows.clear();
        self.base = 0;
        self.next_window = 0;
        self.next_point = 0;
        self.ended = false;
    }

    /// Drops what no later point needs.
    fn forget(&mut self) {
        // A last window, when the piece ends, reaches back by its whole length.
        let needed = self.next_point.saturating_sub(self.long);
        while self.base < needed && self.points.pop_front().is_some() {
            self.base += 1;
        }
        while self.windows.front().is_some_and(|window| window.end <= self.next_point) {
            self.windows.pop_front();
        }
    }

    fn fit(&mut self, start: usize) {
        let independent = self.independent();
        let end = (start + self.long).min(self.count());
        let points = &self.points.make_contiguous()[start - self.base..end - self.base];
        let fit = Fit::with_vibrato(points, independent);
        self.windows.push_back(Window { start, end, fit });
    }

    /// Readings in a row that say the same thing once.
    fn independent(&self) -> f64 {
        let f0_hz = self.points.back().map_or(ORIGIN_HZ, |p| ORIGIN_HZ * ratio(p.cents));
        let frame_s = (FRAME_PERIODS / f0_hz).clamp(FRAME_S.0, FRAME_S.1);
        (0.5 * frame_s / self.hop_s).max(1.0)
    }

    fn judge(&mut self, at: usize) -> Judged {
        let independent = self.independent();
        let points = self.points.make_contiguous();
        let point = points[at - self.base];
        let around = || self.windows.iter().filter(|w| w.start <= at && w.end > at);
        let least = around().map(|w| w.fit.left).fold(f64::INFINITY, f64::min);
        let short = best_short(points, at - self.base, self.short, independent);
        let best = around().find(|w| w.fit.left <= least);
        let by_short = |short: &Fit| {
            best.is_none_or(|w| w.fit.vibrato.is_none()) && least > WORTH_SHORT * short.left
        };
        if let Some(fit) = short.filter(by_short) {
            return Judged::by(&fit, point);
        }
        let Some(best) = best else { return Judged::alone(point) };
        // Below the noise that the readings state, less is no better.
        let noise = mean_variance(&points[at - self.base..=at - self.base]);
        let as_good = around().filter(|w| w.fit.left <= AS_GOOD * least.max(noise));
        Judged::by_all(as_good.map(|w| &w.fit), &best.fit, point)
    }
}

/// The best line through the readings on the left, around, and on the right; none where readings are too few.
fn best_short(points: &[Point], at: usize, length: usize, independent: f64) -> Option<Fit> {
    let starts = [(at + 1).saturating_sub(length), at.saturating_sub(length / 2), at];
    starts
        .into_iter()
        .filter_map(|start| points.get(start..(start + length).min(points.len())))
        .filter(|window| 2 * window.len() > length)
        .map(|window| Fit::line(window, independent))
        .min_by(|a, b| a.left.total_cmp(&b.left))
}

impl Judged {
    /// Heard as it is read.
    fn alone(point: Point) -> Self {
        Self {
            point,
            cents: point.cents,
            sd: point.sd,
            slope: f64::INFINITY,
            without_vibrato: point.cents,
            vibrato: None,
        }
    }

    fn by(fit: &Fit, point: Point) -> Self {
        Self::by_all([fit].into_iter(), fit, point)
    }

    /// Heard as the mean of several fits, each weighing by its variance; the rest comes from the best.
    fn by_all<'a>(fits: impl Iterator<Item = &'a Fit>, best: &Fit, point: Point) -> Self {
        let (mut sum, mut weights, mut variance) = (0.0, 0.0, f64::INFINITY);
        for fit in fits {
            let here = fit.variance(point.time_s);
            sum += fit.trend(point.time_s) / here;
            weights += 1.0 / here;
            // They share their readings: together they are as sure as the surest.
            variance = variance.min(here);
        }
        let (cents, sd) = if weights > 0.0 {
            (sum / weights, variance.sqrt())
        } else {
            (best.trend(point.time_s), best.variance(point.time_s).sqrt())
        };
        Self {
            point,
            cents,
            sd,
            slope: best.slope,
            without_vibrato: point.cents - best.vibrato_at(point.time_s),
            vibrato: best.vibrato.map(|wave: Wave| (wave.rate_hz, wave.extent())),
        }
    }
}
