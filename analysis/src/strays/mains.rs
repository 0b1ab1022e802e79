//! Mains hum: lines at multiples of one frequency close to 50 or 60 Hz.

use super::Candidate;
use crate::convert::{floor_index, number};
use crate::reading::StrayKind;

/// Highest multiple of the mains frequency.
const MULTIPLES: f64 = 40.0;
/// Highest multiple of a line that may tell the mains frequency, and stand alone.
const LOW_MULTIPLES: f64 = 5.0;
/// Deviation of the mains frequency from 50 or 60 Hz that is accepted, in Hz (EN 50160 allows 0.5 Hz for most of the time;
/// large grids keep within 0.2 Hz).
const OFF_HZ: f64 = 0.25;
/// Half-width of the match, in resolutions.
const MATCH: f64 = 0.5;

/// Names mains hum among the unexplained lines: the mains frequency that explains most of them.
pub(crate) fn name_mains(candidates: &mut [Candidate], resolution_hz: f64) {
    let mut best = (0.0, 0.0, 0.0);
    for nominal in [50.0, 60.0] {
        for told in candidates.iter() {
            let multiple = (told.line.hz / nominal).round();
            let hz = told.line.hz / multiple;
            if multiple < 1.0 || multiple > LOW_MULTIPLES || (hz - nominal).abs() > OFF_HZ {
                continue;
            }
            let score = candidates
                .iter()
                .filter_map(|c| multiple_of(c, hz, resolution_hz).map(|m| (c, m)))
                .map(|(c, m)| c.line.amplitude.sqrt() / m)
                .sum::<f64>();
            if score > best.0 {
                best = (score, nominal, hz);
            }
        }
    }
    let (score, base_hz, hz) = best;
    if score <= 0.0 {
        return;
    }
    for c in candidates {
        if let Some(multiple) = multiple_of(c, hz, resolution_hz) {
            c.kind = StrayKind::Mains { base_hz, multiple: number(floor_index(multiple)) };
        }
    }
}

/// Which multiple of a mains frequency an unexplained line is.
fn multiple_of(c: &Candidate, hz: f64, resolution_hz: f64) -> Option<f64> {
    let multiple = (c.line.hz / hz).round();
    let off = (c.line.hz - multiple * hz).abs();
    let matches = multiple >= 1.0 && multiple <= MULTIPLES && off < MATCH * resolution_hz;
    (matches && c.kind == StrayKind::Unexplained).then_some(multiple)
}
