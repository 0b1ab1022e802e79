//! Candidates for the fundamental of one instant, from two independent views: a stretch-aware harmonic comb over the
//! spectral peaks ([`comb`]) and the periodicity in the lag domain ([`lag`]).
//!
//! Four frame lengths stand ready, from about 21 to 171 ms; a candidate is judged in the shortest that holds
//! [`PERIODS`] of its periods, so that high notes are followed quickly and low ones resolved.

pub(crate) mod comb;
pub(crate) mod lag;

use crate::peaks::{PEAKS_MAX, Peak};
use comb::{Comb, Weighed};
use lag::Periodicity;
use pulp::{Arch, NullaryFnOnce};

/// Periods that the frame which judges a candidate should hold; the longest frame takes what is left.
const PERIODS: f64 = 7.0;
/// Strongest peaks whose submultiples are candidates.
const SEEDS: usize = 7;
/// Highest number that a seed peak is tried as.
const SEED_NUMBER: usize = 9;
/// Most guesses of one frame.
const GUESSES_MAX: usize = SEEDS * SEED_NUMBER + lag::MAXIMA;
/// Candidates nearer than this ratio are one.
const SAME: f64 = 1.012;
/// Cost of an octave lower, and where the octaves are counted from.
const OCTAVE_COST: f64 = 0.05;
const OCTAVES_FROM_HZ: f64 = 5_000.0;
/// Periodicity below which a guess is not worth a comb.
const APERIODIC: f64 = 0.1;
/// Share of a score that no periodicity takes away.
const WITHOUT_CLARITY: f64 = 0.35;
/// Candidates handed on per instant.
pub(crate) const CANDIDATES: usize = 6;

/// A fundamental that one instant might have.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Candidate {
    /// Fundamental in Hz.
    pub(crate) hz: f64,
    /// Inharmonicity seen by the comb.
    pub(crate) b: f64,
    /// How well it explains the instant, 0 to 1.
    pub(crate) score: f64,
    /// What choosing it costs: the negative logarithm of its score, and a little for every octave it lies lower. A sound
    /// that repeats with one period repeats with twice that too; the shorter one is the pitch.
    pub(crate) cost: f64,
    /// Periodicity at its period, 0 to 1.
    pub(crate) clarity: f64,
    /// Compressed share of the peaks it explains, 0 to 1.
    pub(crate) explained: f64,
    /// Partials that its comb finds.
    pub(crate) partials: usize,
}

/// What one instant offers the search: the peaks of each frame length and the periodicity.
#[derive(Debug)]
pub(crate) struct View<'a> {
    /// Peaks by frame, shortest frame first.
    pub(crate) peaks: [&'a [Peak]; 4],
    /// Length of each frame in seconds.
    pub(crate) frame_s: [f64; 4],
    /// Periodicity of the instant, where it is known.
    pub(crate) periodicity: Option<&'a Periodicity>,
}

/// Search for candidates; owns its scratch.
#[derive(Debug)]
pub(crate) struct Search {
    range_hz: (f64, f64),
    /// Peaks of the frame at hand that count.
    heard: Vec<Peak>,
    seeds: Vec<Peak>,
    guesses: Vec<f64>,
    sums: Vec<(f64, f64)>,
    fits: Vec<Comb>,
    arch: Arch,
}

/// Fits the combs of all guesses.
struct FitAll<'a> {
    peaks: &'a Weighed<'a>,
    guesses: &'a [f64],
    bin_hz: f64,
    fits: &'a mut Vec<Comb>,
}

impl NullaryFnOnce for FitAll<'_> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        let Self { peaks, guesses, bin_hz, fits } = self;
        for &hz in guesses {
            if let Some(comb) = Comb::fit(peaks, hz, bin_hz) {
                fits.push(comb);
            }
        }
    }
}

impl Search {
    /// A search over a range of fundamentals.
    pub(crate) fn new(range_hz: (f64, f64)) -> Self {
        Self {
            range_hz,
            heard: Vec::with_capacity(PEAKS_MAX),
            seeds: Vec::with_capacity(SEEDS + 1),
            sums: Vec::with_capacity(PEAKS_MAX + 1),
            guesses: Vec::with_capacity(GUESSES_MAX),
            fits: Vec::with_capacity(GUESSES_MAX),
            arch: Arch::new(),
        }
    }

    /// Collects the candidates of an instant, best first, at most [`CANDIDATES`].
    pub(crate) fn run(&mut self, view: &View<'_>, out: &mut Vec<Candidate>) {
        out.clear();
        for frame in 0..4 {
            let band = self.band(view, frame);
            if band.0 >= band.1 {
                continue;
            }
            self.heard.clear();
            self.heard.extend(view.peaks[frame].iter().filter(|p| p.weight > 0.0));
            self.collect(view, band);
            let peaks = Weighed::new(&self.heard, &mut self.sums);
            let bin_hz = 1.0 / view.frame_s[frame];
            self.fits.clear();
            let (guesses, fits) = (self.guesses.as_slice(), &mut self.fits);
            self.arch.dispatch(FitAll { peaks: &peaks, guesses, bin_hz, fits });
            for fit in &self.fits {
                if fit.hz < self.range_hz.0 * 0.98 || fit.hz > self.range_hz.1 * 1.02 {
                    continue;
                }
                let clarity = view.periodicity.map_or(1.0, |p| p.at(fit.hz));
                let score =
                    fit.score * (WITHOUT_CLARITY + (1.0 - WITHOUT_CLARITY) * clarity.max(0.0));
                let (explained, partials) = (fit.explained, fit.partials);
                let octaves = (OCTAVES_FROM_HZ / fit.hz).log2();
                let cost = OCTAVE_COST * octaves - score.max(1e-6).ln();
                keep(
                    out,
                    Candidate { hz: fit.hz, b: fit.b, score, cost, clarity, explained, partials },
                );
            }
        }
    }

    /// Fundamentals judged in a frame.
    fn band(&self, view: &View<'_>, frame: usize) -> (f64, f64) {
        let low = if frame == 3 { 0.0 } else { PERIODS / view.frame_s[frame] };
        let high = if frame == 0 { f64::MAX } else { PERIODS / view.frame_s[frame - 1] };
        (low.max(self.range_hz.0), high.min(self.range_hz.1))
    }

    /// Gathers the guesses of a band: submultiples of the strongest peaks, and the maxima in the lag domain.
    fn collect(&mut self, view: &View<'_>, band: (f64, f64)) {
        self.seeds.clear();
        for peak in &self.heard {
            let at = self.seeds.partition_point(|s| s.amplitude > peak.amplitude);
            if at < SEEDS {
                self.seeds.truncate(SEEDS - 1);
                self.seeds.insert(at.min(self.seeds.len()), *peak);
            }
        }
        self.guesses.clear();
        for seed in &self.seeds {
            for n in 1..=SEED_NUMBER {
                let hz = seed.hz / n as f64;
                if hz >= band.0 && hz < band.1 {
                    self.guesses.push(hz);
                }
            }
        }
        for hz in view.periodicity.iter().flat_map(|p| p.maxima()) {
            if hz >= band.0 && hz < band.1 {
                self.guesses.push(hz);
            }
        }
        self.guesses.sort_unstable_by(f64::total_cmp);
        self.guesses.dedup_by(|next, kept| *next < *kept * SAME);
        if let Some(periodicity) = view.periodicity {
            self.guesses.retain(|&hz| periodicity.at(hz) >= APERIODIC);
        }
    }
}

/// Keeps the best candidates, one of each neighbourhood.
fn keep(out: &mut Vec<Candidate>, candidate: Candidate) {
    let near = |c: &Candidate| c.hz < candidate.hz * SAME && candidate.hz < c.hz * SAME;
    if let Some(at) = out.iter().position(near) {
        if out[at].cost <= candidate.cost {
            return;
        }
        out.remove(at);
    }
    let at = out.partition_point(|c| c.cost <= candidate.cost);
    if at < CANDIDATES {
        out.truncate(CANDIDATES - 1);
        out.insert(at, candidate);
    }
}
