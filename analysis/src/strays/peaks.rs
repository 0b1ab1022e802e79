//! The strays of one reading, from the peaks of its longest frame: coarser than a note's, and at once.
//!
//! At a frame's resolution a high alias would be named by chance, so only partials that folded once or twice are tried.

use crate::convert::{floor_index, nearest, number};
use crate::peaks::Peak;
use crate::reading::{Stray, StrayKind};
use crate::stiff::{partial_hz, partial_number};

/// Most strays of a reading.
pub(crate) const STRAYS_MAX: usize = 32;
/// Distance from a partial within which a peak is that partial's, in bins.
const OWN_BINS: f64 = 3.0;
/// The same in cents, for a partial of several strings or voices is wide; and at most, as a share of the fundamental.
const OWN_CENTS: f64 = 20.0;
const OWN_OF_F0: f64 = 0.1;
/// Widest match of an alias and of a mains multiple, in Hz.
const MATCH_HZ: f64 = 1.0;
/// Highest multiple of the mains frequency.
const MAINS_MULTIPLES: f64 = 20.0;
/// Highest frequency of a partial that is tried as an alias, in sample rates.
const FOLDED_TO: f64 = 1.5;
/// Amplitude, against the strongest peak, under which a peak may be a sidelobe.
const FAINTEST: f64 = 3e-4;

/// Lists the peaks that lie on no partial of a model `(f0, B)`, strongest first.
pub(crate) fn list(
    peaks: &[Peak],
    model: (f64, f64),
    bin_hz: f64,
    sample_rate_hz: f64,
    out: &mut Vec<Stray>,
) {
    out.clear();
    let strongest = peaks.iter().map(|p| p.amplitude).fold(0.0, f64::max);
    for peak in peaks.iter().filter(|p| p.amplitude > FAINTEST * strongest) {
        if is_partial(peak.hz, model, bin_hz) {
            continue;
        }
        // The amplitude takes the level's place until the strongest are known.
        let Peak { hz: frequency_hz, amplitude: level_dbfs, .. } = *peak;
        let at = out.partition_point(|s| s.level_dbfs >= level_dbfs);
        if at < STRAYS_MAX {
            out.truncate(STRAYS_MAX - 1);
            out.insert(at, Stray { frequency_hz, level_dbfs, kind: StrayKind::Unexplained });
        }
    }
    for stray in out {
        stray.level_dbfs = 20.0 * stray.level_dbfs.log10();
        stray.kind = explain(stray.frequency_hz, model, sample_rate_hz);
    }
}

fn is_partial(hz: f64, (f0, b): (f64, f64), bin_hz: f64) -> bool {
    let wide = hz * OWN_CENTS / crate::stiff::CENTS_PER_NEPER;
    let own = OWN_BINS * bin_hz + wide.min(OWN_OF_F0 * f0);
    let below = partial_number(f0, b, hz).floor().max(1.0);
    [below, below + 1.0].into_iter().any(|n| (partial_hz(f0, b, n) - hz).abs() < own)
}

fn explain(hz: f64, (f0, b): (f64, f64), sample_rate_hz: f64) -> StrayKind {
    for base_hz in [50.0, 60.0] {
        let multiple = nearest(hz / base_hz).max(1.0);
        if multiple <= MAINS_MULTIPLES && (hz - multiple * base_hz).abs() < MATCH_HZ {
            return StrayKind::Mains { base_hz, multiple: number(floor_index(multiple)) };
        }
    }
    for unfolded_hz in [sample_rate_hz - hz, sample_rate_hz + hz] {
        let n = nearest(partial_number(f0, b, unfolded_hz)).max(1.0);
        let partial = partial_hz(f0, b, n);
        let folded = partial > 0.5 * sample_rate_hz && partial <= FOLDED_TO * sample_rate_hz;
        if folded && (partial - unfolded_hz).abs() < MATCH_HZ {
            let folds = number(floor_index(2.0 * partial / sample_rate_hz));
            return StrayKind::Alias { partial: number(floor_index(n)), folds };
        }
    }
    StrayKind::Unexplained
}

#[cfg(test)]
mod tests {
    use super::*;

    fn peak(hz: f64, amplitude: f64) -> Peak {
        Peak { hz, amplitude, weight: 0.0 }
    }

    #[test]
    fn names_what_lies_between_the_partials() {
        // 48 kHz, 1010 Hz: partial 25 = 25 250 Hz folds to 22 750 Hz, between partials 22 and 23.
        let peaks =
            [peak(100.1, 0.01), peak(1010.0, 0.5), peak(1500.0, 0.02), peak(22_750.0, 0.03)];
        let mut out = Vec::new();
        list(&peaks, (1010.0, 0.0), 5.9, 48_000.0, &mut out);
        let kinds: Vec<_> = out.iter().map(|s| s.kind).collect();
        assert_eq!(
            kinds,
            [
                StrayKind::Alias { partial: 25, folds: 1 },
                StrayKind::Unexplained,
                StrayKind::Mains { base_hz: 50.0, multiple: 2 },
            ],
            "strongest first: alias, unexplained, mains"
        );
    }

    #[test]
    fn a_stretched_partial_is_no_stray() {
        let b = 2e-3;
        let peaks = [peak(200.0, 0.5), peak(partial_hz(200.0, b, 30.0), 0.1)];
        let mut out = Vec::new();
        list(&peaks, (200.0, b), 5.9, 48_000.0, &mut out);
        assert_eq!(out, [], "both are partials");
    }
}
