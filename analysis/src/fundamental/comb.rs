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
/// Teeth among which the first partial must be found: a comb without them would not pass for a pitch.
const FIRST: usize = 6;
/// Distance from the expectation within which a peak is a partial, as a share of the expectation.
const REACH: f64 = 0.022;
/// The same as a share of the fundamental, where that is nearer.
const REACH_OF_F0: f64 = 0.14;
/// Smallest reach, in bins.
const REACH_BINS: f64 = 0.6;
/// Largest inharmonicity that the comb follows.
const B_MAX: f64 = 0.02;
/// Share of the peaks that a comb must explain: with less it never wins.
const LEAST: f64 = 0.04;
/// Exponent of the share of teeth found.
const PRESENCE: f64 = 0.7;

/// Peaks that count, sorted by frequency, with their weights added up from the lowest on.
#[derive(Debug)]
pub(crate) struct Weighed<'a> {
    peaks: &'a [Peak],
    /// Sums of weights, and of weights times frequencies, of the peaks before each.
    sums: &'a [(f64, f64)],
}

impl<'a> Weighed<'a> {
    /// Adds up the weights of peaks in `sums`.
    pub(crate) fn new(peaks: &'a [Peak], sums: &'a mut Vec<(f64, f64)>) -> Self {
        sums.clear();
        let mut sum = (f64::MIN_POSITIVE, 0.0);
        sums.push(sum);
        for p in peaks {
            sum = (sum.0 + p.weight, sum.1 + p.weight * p.hz);
            sums.push(sum);
        }
        Self { peaks, sums }
    }

    /// Weight of all peaks below a limit, and what of it lies in reach of the comb of a fundamental by chance: weight times
    /// the share of the axis that the reach covers there.
    #[inline(always)]
    fn below(&self, limit_hz: f64, f0: f64) -> (f64, f64) {
        let end = self.peaks.partition_point(|p| p.hz < limit_hz);
        let turn = self.peaks.partition_point(|p| p.hz < f0 * REACH_OF_F0 / REACH).min(end);
        let chance = 2.0 * REACH / f0 * self.sums[turn].1
            + 2.0 * REACH_OF_F0 * (self.sums[end].0 - self.sums[turn].0);
        (self.sums[end].0, chance)
    }
}

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
    /// Partials found.
    pub(crate) partials: usize,
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
    #[inline(always)]
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
    #[inline(always)]
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
    #[inline(always)]
    pub(crate) fn fit(peaks: &Weighed<'_>, guess_hz: f64, bin_hz: f64) -> Option<Self> {
        let mut line = Line::default();
        let mut teeth = [0.0f64; TEETH];
        let (mut explained, mut last, mut next) = (0.0, 0, 0);
        let (mut base, mut b) = (guess_hz * guess_hz, 0.0);
        let mut limit = 0.0;
        let highest = peaks.peaks.last()?.hz;
        for (i, tooth) in teeth.iter_mut().enumerate() {
            let n = (i + 1) as f64;
            if last == 0 && i == FIRST {
                return None;
            }
            let expected = n * (base * (1.0 + b * n * n)).sqrt();
            let reach = (REACH * expected).min(REACH_OF_F0 * guess_hz).max(REACH_BINS * bin_hz);
            limit = expected + 0.5 * guess_hz;
            if expected - reach > highest {
                break;
            }
            let Some(peak) = strongest_within(peaks.peaks, &mut next, expected, reach) else {
                continue;
            };
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
        let (total, chance) = peaks.below(limit, guess_hz);
        let (explained, chance) = (explained / total, chance / total);
        // What a comb of such reach explains of peaks anywhere at all is no merit.
        let explained = ((explained - chance) / (1.0 - chance)).clamp(0.0, 1.0);
        if explained < LEAST {
            return None;
        }
        let score = explained * presence(&teeth[..last]).powf(PRESENCE);
        Some(Self { hz: base.sqrt(), b, score, explained, partials: line.count })
    }
}

/// The strongest peak within reach of an expectation; `next` is where the last search began.
#[inline(always)]
fn strongest_within(peaks: &[Peak], next: &mut usize, expected: f64, reach: f64) -> Option<Peak> {
    while *next < peaks.len() && peaks[*next].hz < expected - reach {
        *next += 1;
    }
    let mut found: Option<Peak> = None;
    for peak in peaks[*next..].iter().take_while(|p| p.hz <= expected + reach) {
        if found.is_none_or(|best| peak.amplitude >= best.amplitude) {
            found = Some(*peak);
        }
    }
    found
}

/// Share of the comb that is there: teeth count by their strength, low ones most, and one that is missing as much as the
/// weaker of its nearest neighbours that are there.
#[inline(always)]
fn presence(teeth: &[f64]) -> f64 {
    let (mut there, mut missing) = (0.0, 0.0);
    let (mut below, mut hole) = (f64::INFINITY, 0.0);
    for (i, &tooth) in teeth.iter().enumerate() {
        let weight = 1.0 / (i + 1) as f64;
        if tooth > 0.0 {
            there += weight * tooth;
            missing += hole * tooth.min(below);
            (below, hole) = (tooth, 0.0);
        } else {
            hole += weight;
        }
    }
    there / (there + missing)
}
