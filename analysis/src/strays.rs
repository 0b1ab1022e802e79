//! Explanations for lines that belong to no partial: alias of a partial, mains hum, or none.
//!
//! An alias of partial `n` lies at `|f - fs round(f / fs)|` of its frequency `f` above the Nyquist frequency. Lines are so
//! sharp, and the fundamental so well known, that the match is tested within a fraction of a resolution; the fundamental
//! is refined on the way, since partial 500 shows an error of the fundamental 500 times.

use crate::convert::{floor_index, number};
use crate::measure::lines::Line;
use crate::reading::{Stray, StrayKind};
use crate::stiff::partial_hz;

/// Highest partial that an alias is traced to.
const FOLDED_MAX: usize = 4096;
/// Half-width of the match, in resolutions of the long transform.
const MATCH: f64 = 0.5;
/// The same at most, when the fundamental is not known well enough.
const MATCH_MAX: f64 = 1.5;
/// Highest multiple of the mains frequency.
const MAINS_MULTIPLES: usize = 40;
/// Deviation of the mains frequency from 50 or 60 Hz that is accepted, relative (EN 50160: 1 % most of the time).
const MAINS_OFF: f64 = 0.002;

/// A line with what is known of it.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Candidate {
    /// The line.
    pub(crate) line: Line,
    /// Its explanation so far.
    pub(crate) kind: StrayKind,
}

/// Frequency at which a partial above the Nyquist frequency appears.
pub(crate) fn folded_hz(hz: f64, sample_rate_hz: f64) -> f64 {
    (hz - sample_rate_hz * (hz / sample_rate_hz).round()).abs()
}

/// How often it folded about a multiple of half the sample rate.
fn folds(hz: f64, sample_rate_hz: f64) -> u32 {
    number(floor_index(2.0 * hz / sample_rate_hz))
}

/// The model whose partials may have folded.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Source {
    /// Fundamental in Hz.
    pub(crate) f0: f64,
    /// Its deviation in Hz.
    pub(crate) f0_sd: f64,
    /// Inharmonicity; 0 where it is not significant.
    pub(crate) b: f64,
    /// Sample rate in Hz.
    pub(crate) sample_rate_hz: f64,
    /// Resolution of the lines in Hz.
    pub(crate) resolution_hz: f64,
}

/// Names the aliases among lines sorted by frequency.
pub(crate) fn name_aliases(candidates: &mut [Candidate], source: Source) {
    if candidates.is_empty() {
        return;
    }
    let Source { mut f0, f0_sd, b, sample_rate_hz, resolution_hz } = source;
    let mut weight = 1.0 / (f0_sd * f0_sd).max(1e-24);
    let first = (1..FOLDED_MAX).find(|&n| partial_hz(f0, b, n as f64) > 0.5 * sample_rate_hz);
    for n in first.unwrap_or(FOLDED_MAX)..FOLDED_MAX {
        let order = n as f64;
        let hz = partial_hz(f0, b, order);
        let lies = folded_hz(hz, sample_rate_hz);
        let slack = hz / f0 / weight.sqrt();
        let tolerance = (MATCH * resolution_hz).max(3.0 * slack).min(MATCH_MAX * resolution_hz);
        let from = candidates.partition_point(|c| c.line.hz < lies - tolerance);
        let near = candidates[from..]
            .iter_mut()
            .take_while(|c| c.line.hz <= lies + tolerance)
            .min_by(|a, b| (a.line.hz - lies).abs().total_cmp(&(b.line.hz - lies).abs()));
        let Some(found) = near.filter(|c| c.kind == StrayKind::Unexplained) else { continue };
        found.kind = StrayKind::Alias { partial: number(n), folds: folds(hz, sample_rate_hz) };
        // Where it lies says where the unfolded partial is, and that says the fundamental.
        let sign = (hz - sample_rate_hz * (hz / sample_rate_hz).round()).signum();
        let sd = 0.1 * resolution_hz / (hz / f0);
        let w = 1.0 / (sd * sd);
        f0 += sign * (found.line.hz - lies) / (hz / f0) * w / (weight + w);
        weight += w;
    }
}

/// Names mains hum among the lines: the family, of 50 or of 60 Hz, that explains more of them.
pub(crate) fn name_mains(candidates: &mut [Candidate], resolution_hz: f64) {
    let matches = |c: &Candidate, base: f64| {
        let multiple = (c.line.hz / base).round().max(1.0);
        let off = (c.line.hz - multiple * base).abs();
        (multiple <= MAINS_MULTIPLES as f64 && off < MAINS_OFF * c.line.hz + 0.5 * resolution_hz)
            .then_some(multiple)
    };
    let weight = |base: f64| -> f64 {
        candidates
            .iter()
            .filter_map(|c| matches(c, base).map(|m| c.line.amplitude.sqrt() / m))
            .sum()
    };
    let (fifty, sixty) = (weight(50.0), weight(60.0));
    let base_hz = if fifty >= sixty { 50.0 } else { 60.0 };
    for c in candidates {
        if let Some(multiple) = matches(c, base_hz) {
            c.kind = StrayKind::Mains { base_hz, multiple: number(floor_index(multiple)) };
        }
    }
}

/// A candidate as a stray.
pub(crate) fn stray(candidate: &Candidate) -> Stray {
    Stray {
        frequency_hz: candidate.line.hz,
        level_dbfs: 20.0 * candidate.line.amplitude.log10(),
        kind: candidate.kind,
    }
}
