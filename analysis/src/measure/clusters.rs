//! Partials that are several lines: voices in unison, choruses, strings in pairs. Told from the lines of the long transform.
//!
//! Two lines are told apart from about 4 resolutions on (one resolution is one over the duration measured): nearer, they
//! are one line that beats.

use super::lines::Line;
use super::voices::{VOICE, reach_hz};
use crate::note::Cluster;
use crate::stiff::CENTS_PER_NEPER;

/// The cluster that the partial at a frequency is, if it is one. `lines` rise by frequency; `strange` tells those that are
/// known to be something else.
pub(crate) fn cluster(
    lines: &[Line],
    hz: f64,
    f0: f64,
    strange: impl Fn(&Line) -> bool,
) -> Option<Cluster> {
    let reach = reach_hz(hz, f0);
    let from = lines.partition_point(|l| l.hz < hz - reach);
    let near = &lines[from..from + lines[from..].partition_point(|l| l.hz <= hz + reach)];
    let own = || near.iter().filter(|l| !strange(l));
    let strongest = own().max_by(|a, b| a.amplitude.total_cmp(&b.amplitude))?;
    let voices = || own().filter(|l| l.amplitude >= VOICE * strongest.amplitude);
    let others = || voices().filter(|l| l.hz.total_cmp(&strongest.hz).is_ne());
    let second = others().max_by(|a, b| a.amplitude.total_cmp(&b.amplitude))?;
    let (lowest, highest) = (voices().next()?, voices().next_back()?);
    Some(Cluster {
        lines: crate::convert::number(voices().count()),
        spread_cents: CENTS_PER_NEPER * (highest.hz / lowest.hz).ln(),
        beat_hz: (second.hz - strongest.hz).abs(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(hz: f64, amplitude: f64) -> Line {
        Line { hz, amplitude, snr: 1e6 }
    }

    #[test]
    fn voices_are_counted_and_what_is_far_or_faint_is_not() {
        let lines = [
            line(300.0, 1.0),
            line(438.0, 0.3),
            line(440.0, 0.5),
            line(441.0, 0.02),
            line(443.0, 0.2),
        ];
        let nothing = |_: &Line| false;
        let found = cluster(&lines, 440.0, 220.0, nothing).expect("three voices");
        assert_eq!(found.lines, 3, "{found:?}");
        assert!((found.beat_hz - 2.0).abs() < 1e-12, "{found:?}");
        assert!((found.spread_cents - 19.651).abs() < 1e-2, "{found:?}");
        let without = cluster(&lines, 440.0, 220.0, |line| line.hz > 442.0).expect("two voices");
        assert_eq!(without.lines, 2, "the third is something else: {without:?}");
        assert_eq!(cluster(&lines, 300.0, 220.0, nothing), None, "a single line");
        assert_eq!(cluster(&lines, 800.0, 220.0, nothing), None, "no line");
    }
}
