//! A harmonic comb over spectral peaks that stretches as it climbs: each partial found moves the expectation for the next
//! one (the idea of the moving search window of A. Klapuri, IEEE TSAP 11(6):804-816, 2003).
//!
//! Two questions make the score. How much of the peaks, in compressed amplitude, does the comb explain? And how much of
//! the comb is there, each tooth weighted by what its neighbours let expect? The first is lost by a candidate an octave
//! too high, the second by one an octave too low.

use crate::peaks::Peak;

/// Highest partial of the comb.
const TEETH: usize = 24;
/// Exponent that compresses amplitudes: between loudness and mere presence.
/// Distance from the expectation within which a peak is a partial, as a share of the expectation.
const REACH: f64 = 0.022;
/// The same as a share of the fundamental, where that is nearer.
const REACH_OF_F0: f64 = 0.14;
/// Smallest reach, in bins.
const REACH_BINS: f64 = 0.6;
/// Largest inharmonicity that the comb follows.
const B_MAX: f64 = 0.02;
/// Exponent of the share of teeth found.
const PRESENCE: f64 = 0.7;

/// A comb fitted to peaks.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Comb {
    /// Fundamental, refined, in Hz.
    pub(crate) hz: f64,
    /// Inharmonicity followed.
    pub(crate) b: f64,
    /// Explained share times presence, 0 to 1.
    pub(crate) score: f64,
    /// Compressed share of the peaks in reach that the comb explains.
    pub(crate) explained: f64,
}

/// Running least squares of `(f_n / n)^2` on `n^2`.
#[derive(Default)]
struct Line {
    w: f64,
    wx: f64,
    wxx: f64,
    wy: f64,
    wxy: f64,
    count: usize,
}

impl Line {
    fn add(&mut self, n: f64, hz: f64, weight: f64) {
        let (x, y) = (n * n, (hz / n) * (hz / n));
        // A partial's frequency error counts 1/n in f_n / n.
        let w = weight * x;
        self.w += w;
        self.wx += w * x;
        self.wxx += w * x * x;
        self.wy += w * y;
        self.wxy += w * x * y;
        self.count += 1;
    }

    /// Squared fundamental and inharmonicity; harmonic until enough partials are in.
    fn solve(&self, fallback: f64) -> (f64, f64) {
        if self.count == 0 {
            return (fallback * fallback, 0.0);
        }
        let det = self.w * self.wxx - self.wx * self.wx;
        if self.count >= 4 && det > 1e-9 * self.w * self.wxx {
            let slope = (self.w * self.wxy - self.wx * self.wy) / det;
            let base = (self.wy - slope * self.wx) / self.w;
            if base > 0.0 && slope >= 0.0 && slope <= B_MAX * base {
                return (base, slope / base);
            }
        }
        (self.wy / self.w, 0.0)
    }
}

impl Comb {
    /// Fits the comb of a fundamental to peaks sorted by frequency; `None` when no peak is on it.
    pub(crate) fn fit(peaks: &[Peak], guess_hz: f64, bin_hz: f64) -> Option<Self> {
        let mut line = Line::default();
        let mut teeth = [0.0f64; TEETH];
        let (mut explained, mut last, mut next) = (0.0, 0, 0);
        let (mut base, mut b) = (guess_hz * guess_hz, 0.0);
        let mut limit = 0.0;
        for (i, tooth) in teeth.iter_mut().enumerate() {
            let n = (i + 1) as f64;
            let expected = n * (base * (1.0 + b * n * n)).sqrt();
            let reach = (REACH * expected).min(REACH_OF_F0 * guess_hz).max(REACH_BINS * bin_hz);
            limit = expected + 0.5 * guess_hz;
            let Some(peak) = strongest_within(peaks, &mut next, expected, reach) else { continue };
            let off = (peak.hz - expected) / reach;
            let v = peak.weight * (1.0 - 0.5 * off * off);
            *tooth = v;
            explained += v;
            last = i + 1;
            line.add(n, peak.hz, v);
            (base, b) = line.solve(guess_hz);
        }
        if last == 0 {
            return None;
        }
        let (mut total, mut chance) = (f64::MIN_POSITIVE, 0.0);
        for p in peaks.iter().take_while(|p| p.hz < limit) {
            total += p.weight;
            chance += p.weight * (2.0 * REACH * p.hz / guess_hz).min(2.0 * REACH_OF_F0);
        }
        let (explained, chance) = (explained / total, chance / total);
        // What a comb of such reach explains of peaks anywhere at all is no merit.
        let explained = ((explained - chance) / (1.0 - chance)).clamp(0.0, 1.0);
        let score = explained * presence(&teeth[..last]).powf(PRESENCE);
        Some(Self { hz: base.sqrt(), b, score, explained })
    }
}

/// The strongest peak within reach of an expectation; `next` is where the last search began.
fn strongest_within(peaks: &[Peak], next: &mut usize, expected: f64, reach: f64) -> Option<Peak> {
    while *next < peaks.len() && peaks[*next].hz < expected - reach {
        *next += 1;
    }
    peaks[*next..]
        .iter()
        .take_while(|p| p.hz <= expected + reach)
        .filter(|p| p.weight > 0.0)
        .copied()
        .max_by(|a, b| a.amplitude.total_cmp(&b.amplitude))
}

/// Share of the teeth up to the last one that is there, the low ones counting most.
fn presence(teeth: &[f64]) -> f64 {
    let (mut there, mut expected) = (0.0, 0.0);
    for (i, &tooth) in teeth.iter().enumerate() {
        let weight = 1.0 / (i + 1) as f64;
        expected += weight;
        if tooth > 0.0 {
            there += weight;
        }
    }
    there / expected
}
