//! What the pitch did over the last half hour and more, kept small: the drift trace draws from it.
//!
//! One point per reading on the engine's grid for the last ten minutes, and a cell of lowest, mean and highest per eight
//! readings for longer. Both are rings, allocated once with the first reading; nothing grows after that but the list of
//! breaks and bars, which is bounded too. A point that no reading filled says so: gaps stay gaps.

mod point;

use std::collections::VecDeque;

use plumbtone_analysis::{Reading, State};

use crate::convert::{index, signed_distance};
use crate::session::SessionPosition;
pub use point::{Cell, Kind, Point};

/// Points kept: ten minutes at 10 ms, in 240 KB.
const POINTS: usize = 60_000;
/// Readings in a cell, and cells kept: 40 minutes at 10 ms, in 240 KB.
const CELL: u64 = 8;
const CELLS: usize = 30_000;
/// Most places of breaks and of bar lines that are remembered.
const BREAKS: usize = 512;
const BARS: usize = 4096;
/// Points left empty where the sound is cut, and most that one gap takes: what is missing for longer is cut short.
const CUT: u64 = 20;
const GAP_MAX: u64 = 1_000;
/// Difference from the expected session time, in seconds, above which the transport has jumped.
const JUMP_S: f64 = 0.05;
/// Confidence below which a pitch is not shown as one.
pub const CONFIDENCE_SHOWN: f64 = 0.5;

/// A history of the pitch. Indices count readings since it began.
#[derive(Debug, Clone, Default)]
pub struct Trail {
    hop: u64,
    sample_rate_hz: f64,
    next: u64,
    points: Vec<Point>,
    cells: Vec<Cell>,
    breaks: VecDeque<Break>,
    bars: VecDeque<Bar>,
    last: Option<Last>,
}

/// From here on, session time runs on from `seconds`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Break {
    /// First index after it.
    pub index: u64,
    /// Session time there, in seconds; `None` while the transport stands or says nothing.
    pub seconds: Option<f64>,
}

/// A bar line.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Bar {
    /// First index in the bar.
    pub index: u64,
    /// Its number, from 1.
    pub number: i64,
}

#[derive(Debug, Clone, Copy)]
struct Last {
    stream: u64,
    centre: u64,
    seconds: Option<f64>,
    bar: Option<i64>,
}

impl Trail {
    /// Tells the grid of the readings to come: samples between two, and the sample rate. Another grid begins a new trail.
    pub fn grid(&mut self, hop: usize, sample_rate_hz: f64) {
        let hop = hop as u64;
        let same_rate = (sample_rate_hz - self.sample_rate_hz).abs() < 1e-6;
        if hop != self.hop || !same_rate {
            *self = Self { hop, sample_rate_hz, ..Self::default() };
        }
    }

    /// Adds a reading of a stream.
    pub fn push(&mut self, stream: u64, reading: &Reading, session: &SessionPosition) {
        if self.hop == 0 || !(self.sample_rate_hz > 0.0) {
            return;
        }
        let seconds = session.seconds.filter(|seconds| session.playing && seconds.is_finite());
        self.join(stream, reading.centre, seconds);
        let bar = session.bar_beat.filter(|_| session.playing).map(|at| at.bar);
        if let Some(number) = bar
            && self.last.is_none_or(|last| last.bar != bar)
        {
            remember(&mut self.bars, Bar { index: self.next, number }, BARS);
        }
        self.append(point_of(reading));
        self.last = Some(Last { stream, centre: reading.centre, seconds, bar });
    }

    /// Index that the next reading gets.
    #[must_use]
    pub fn next(&self) -> u64 {
        self.next
    }

    /// Oldest index still known.
    #[must_use]
    pub fn first(&self) -> u64 {
        self.next.saturating_sub(CELL * (CELLS as u64 - 1))
    }

    /// Seconds between two readings.
    #[must_use]
    pub fn step_s(&self) -> f64 {
        if self.hop == 0 { 0.01 } else { self.hop as f64 / self.sample_rate_hz }
    }

    /// The point at an index, while it is among the newest ones.
    #[must_use]
    pub fn point(&self, at: u64) -> Option<Point> {
        (at < self.next && at + POINTS as u64 > self.next)
            .then(|| self.points[index(at % POINTS as u64)])
    }

    /// The cell that holds an index.
    #[must_use]
    pub fn cell(&self, at: u64) -> Option<Cell> {
        (at < self.next && at >= self.first()).then(|| self.cells[index(at / CELL % CELLS as u64)])
    }

    /// Readings in a cell.
    #[must_use]
    pub fn cell_length(&self) -> u64 {
        CELL
    }

    /// Where session time does not run on, oldest first.
    pub fn breaks(&self) -> impl Iterator<Item = Break> {
        self.breaks.iter().copied()
    }

    /// Bar lines, oldest first.
    pub fn bars(&self) -> impl Iterator<Item = Bar> {
        self.bars.iter().copied()
    }

    /// Session time at an index, where the transport told it.
    #[must_use]
    pub fn session_s(&self, at: u64) -> Option<f64> {
        let after = self.breaks.partition_point(|b| b.index <= at);
        let Break { index, seconds } = *self.breaks.get(after.checked_sub(1)?)?;
        Some(seconds? + (at - index) as f64 * self.step_s())
    }

    /// Leaves empty what is missing before a reading, and marks where session time jumps.
    fn join(&mut self, stream: u64, centre: u64, seconds: Option<f64>) {
        let Some(last) = self.last else {
            self.mark(seconds);
            return;
        };
        let elapsed = signed_distance(last.centre, centre);
        let hop = i64::try_from(self.hop).unwrap_or(i64::MAX);
        let cut = last.stream != stream || elapsed <= 0;
        let missing = if cut { CUT } else { u64::try_from(elapsed / hop - 1).unwrap_or(0) };
        for _ in 0..missing.min(GAP_MAX) {
            self.append(Point::NOTHING);
        }
        let elapsed_s = elapsed as f64 / self.sample_rate_hz;
        let runs_on = match (last.seconds, seconds) {
            (Some(before), Some(now)) => (now - before - elapsed_s).abs() < JUMP_S,
            (None, None) => true,
            _ => false,
        };
        if cut || !runs_on || missing > GAP_MAX {
            self.mark(seconds);
        }
    }

    fn mark(&mut self, seconds: Option<f64>) {
        remember(&mut self.breaks, Break { index: self.next, seconds }, BREAKS);
    }

    fn append(&mut self, point: Point) {
        if self.points.is_empty() {
            self.points = vec![Point::NOTHING; POINTS];
            self.cells = vec![Cell::default(); CELLS];
        }
        self.points[index(self.next % POINTS as u64)] = point;
        let first = self.next - self.next % CELL;
        let points: [Point; 8] = core::array::from_fn(|k| {
            let at = first + k as u64;
            if at <= self.next { self.points[index(at % POINTS as u64)] } else { Point::NOTHING }
        });
        let filled = index(self.next - first) + 1;
        self.cells[index(self.next / CELL % CELLS as u64)] = Cell::of(&points[..filled]);
        self.next += 1;
    }
}

fn remember<T>(list: &mut VecDeque<T>, item: T, most: usize) {
    if list.len() == most {
        list.pop_front();
    }
    list.push_back(item);
}

fn point_of(reading: &Reading) -> Point {
    let sure = reading.pitch.filter(|pitch| pitch.confidence >= CONFIDENCE_SHOWN);
    match (reading.state, sure) {
        (State::Steady, Some(pitch)) => Point::pitched(pitch.f0_hz, pitch.f0_sd_cents, true),
        (State::Gliding, Some(pitch)) => Point::pitched(pitch.f0_hz, pitch.f0_sd_cents, false),
        (State::Silent, _) => Point::without(Kind::Silent),
        (State::Several, _) => Point::without(Kind::Several),
        (State::Unpitched | State::Gliding | State::Steady, _) => Point::without(Kind::Unpitched),
    }
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::Pitch;

    use super::*;

    fn reading(number: u64) -> Reading {
        let pitch = Pitch { f0_hz: 220.0, f0_sd_cents: 0.1, confidence: 1.0 };
        Reading {
            centre: number * 480,
            state: State::Steady,
            pitch: Some(pitch),
            ..Reading::default()
        }
    }

    fn trail() -> Trail {
        let mut trail = Trail::default();
        trail.grid(480, 48_000.0);
        trail
    }

    #[test]
    fn what_is_missing_stays_empty() {
        let mut trail = trail();
        for number in [0, 1, 2, 6, 7] {
            trail.push(1, &reading(number), &SessionPosition::default());
        }
        let kinds: Vec<Kind> =
            (0..trail.next()).filter_map(|at| trail.point(at)).map(|p| p.kind()).collect();
        let (steady, nothing) = (Kind::Steady, Kind::Nothing);
        assert_eq!(kinds, [steady, steady, steady, nothing, nothing, nothing, steady, steady]);
    }

    #[test]
    fn session_time_runs_on_until_it_jumps() {
        let mut trail = trail();
        let at = |seconds| SessionPosition {
            playing: true,
            seconds: Some(seconds),
            ..SessionPosition::default()
        };
        for number in 0..100 {
            trail.push(1, &reading(number), &at(10.0 + number as f64 * 0.01));
        }
        for number in 100..200 {
            trail.push(1, &reading(number), &at(4.0 + (number - 100) as f64 * 0.01));
        }
        assert_eq!(trail.breaks().count(), 2, "{:?}", trail.breaks);
        for (index, expected) in [(50, 10.5), (99, 10.99), (100, 4.0), (150, 4.5)] {
            let seconds = trail.session_s(index).unwrap();
            assert!((seconds - expected).abs() < 1e-9, "{index}: {seconds}");
        }
    }

    #[test]
    fn it_forgets_the_oldest_and_grows_no_more() {
        let mut trail = trail();
        let most = CELL * CELLS as u64 + 5_000;
        for number in 0..most {
            trail.push(1, &reading(number), &SessionPosition::default());
        }
        assert_eq!((trail.points.capacity(), trail.cells.capacity()), (POINTS, CELLS));
        assert!(trail.point(0).is_none() && trail.cell(0).is_none(), "the first are gone");
        let half_an_hour_ago = trail.next() - 180_000;
        assert_eq!(trail.cell(half_an_hour_ago).map(|cell| cell.mean.kind()), Some(Kind::Steady));
        assert!(trail.point(trail.next() - 1).is_some() && trail.point(trail.next()).is_none());
    }
}
