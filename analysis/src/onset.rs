//! Where in the samples a note begins or ends: the change of level that best splits a stretch in two.
//!
//! The curve is the squared peak of each block, held for a period of the note so that it does not ripple with the wave:
//! backwards in time for an end and forwards for an onset, so that neither moves. Both sides are taken for Gaussian of two
//! variances; the split of greatest likelihood is the change (D. Hinkley, Biometrika 57(1):1-17, 1970).

use crate::convert::{index, nearest_index};
use crate::history::History;

/// Block of the power curve, in seconds.
const BLOCK_S: f64 = 0.001;
/// Change of power that counts, as a ratio: 6 dB.
const CHANGE: f64 = 4.0;
/// Longest stretch searched, in seconds.
const LONGEST_S: f64 = 0.4;

/// Which way the level goes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Direction {
    /// A note begins.
    Rise,
    /// A note ends.
    Fall,
}

/// The search; owns its scratch.
#[derive(Debug)]
pub(crate) struct ChangePoint {
    block: usize,
    samples: Vec<f32>,
    peaks: Vec<f64>,
    powers: Vec<f64>,
}

impl ChangePoint {
    /// For a sample rate.
    pub(crate) fn new(sample_rate_hz: f64) -> Self {
        let block = nearest_index(BLOCK_S * sample_rate_hz).max(1);
        let longest = nearest_index(LONGEST_S * sample_rate_hz);
        Self {
            block,
            samples: Vec::with_capacity(longest),
            peaks: Vec::with_capacity(longest / block + 1),
            powers: Vec::with_capacity(longest / block + 1),
        }
    }

    /// The sample at which the level changes between two positions, if it does.
    pub(crate) fn find(
        &mut self,
        history: &History,
        (from, to): (u64, u64),
        period: usize,
        way: Direction,
    ) -> Option<u64> {
        let from = from.max(history.oldest());
        let to = to.min(history.end());
        if to <= from + 4 * self.block as u64 {
            return None;
        }
        self.samples.clear();
        self.samples.resize(index(to - from).min(self.samples.capacity()), 0.0);
        history.read(i64::try_from(from).unwrap_or(0), &mut self.samples);
        self.curve(period.div_ceil(self.block), way);
        let total: f64 = self.powers.iter().sum();
        let floor = 1e-9 * total / self.powers.len() as f64 + 1e-14;
        let count = self.powers.len();
        let (mut before, mut best) = (0.0, None);
        let mut least = f64::INFINITY;
        for k in 1..count {
            before += self.powers[k - 1];
            let (a, b) = (k as f64, (count - k) as f64);
            let (u, v) = (before / a + floor, (total - before).max(0.0) / b + floor);
            let ratio = if way == Direction::Rise { v / u } else { u / v };
            let cost = a * u.ln() + b * v.ln();
            if cost < least && ratio > CHANGE {
                least = cost;
                best = Some(k);
            }
        }
        best.map(|k| from + (self.locate(k, way)) as u64)
    }

    /// Squared peaks of the blocks, each held over `hold` more blocks.
    fn curve(&mut self, hold: usize, way: Direction) {
        self.peaks.clear();
        self.peaks.extend(self.samples.chunks_exact(self.block).map(|block| {
            let peak = block.iter().fold(0.0f32, |m, x| m.max(x.abs()));
            f64::from(peak) * f64::from(peak)
        }));
        self.powers.clear();
        let count = self.peaks.len();
        for k in 0..count {
            let held = match way {
                Direction::Rise => &self.peaks[k.saturating_sub(hold)..=k],
                Direction::Fall => &self.peaks[k..(k + hold + 1).min(count)],
            };
            self.powers.push(held.iter().fold(0.0, |m, &p| m.max(p)));
        }
    }

    /// The sample within the block before or at the split where the sound first (last) reaches a fair share of its level.
    fn locate(&self, split: usize, way: Direction) -> usize {
        let reach = 2 * self.block;
        let middle = split * self.block;
        let low = middle.saturating_sub(reach);
        let high = (middle + reach).min(self.samples.len());
        let peak = self.samples[low..high].iter().fold(0.0f32, |m, x| m.max(x.abs()));
        let loud = |x: &f32| x.abs() > 0.1 * peak;
        match way {
            Direction::Rise => low + self.samples[low..high].iter().position(loud).unwrap_or(0),
            Direction::Fall => {
                low + self.samples[low..high].iter().rposition(loud).map_or(0, |p| p + 1)
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::convert::single;

    /// Silence, a tone of five partials, silence.
    fn struck(f0: f64, rate: f64, (from, to): (usize, usize), length: usize) -> History {
        let mut history = History::new(length);
        let samples: Vec<f32> = (0..length)
            .map(|n| {
                let turns = f0 * (n as f64 - from as f64) / rate;
                let wave = |k: f64| (core::f64::consts::TAU * k * turns + k * k).cos() / k;
                let tone = [1.0, 2.0, 3.0, 4.0, 5.0].map(wave).iter().sum::<f64>();
                if (from..to).contains(&n) { single(0.1 * tone) } else { 0.0 }
            })
            .collect();
        history.push(&samples);
        history
    }

    #[test]
    fn hard_edges_are_found_to_a_fraction_of_a_millisecond() {
        let rate = 48_000.0;
        for f0 in [41.2, 110.0, 440.0, 1760.0] {
            let (from, to) = (9_731, 28_345);
            let history = struck(f0, rate, (from, to), 38_000);
            let period = nearest_index(rate / f0);
            let mut change = ChangePoint::new(rate);
            for (edge, span, way) in
                [(from, (2_000, 16_000), Direction::Rise), (to, (22_000, 36_000), Direction::Fall)]
            {
                let found = change.find(&history, span, period, way).expect("an edge");
                let off = index(found.abs_diff(edge as u64));
                assert!(off < 60, "{f0} Hz, {way:?}: {found}, {edge} is right");
            }
        }
    }

    #[test]
    fn where_nothing_changes_nothing_is_found() {
        let history = struck(220.0, 48_000.0, (0, 38_000), 38_000);
        let found =
            ChangePoint::new(48_000.0).find(&history, (8_000, 24_000), 218, Direction::Rise);
        assert_eq!(found, None, "a tone that holds");
    }
}
