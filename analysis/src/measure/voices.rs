//! Detuned voices: further fundamentals whose partials lie beside those of the first one, as in a unison or a chorus. Each is
//! told by the same offset, in cents, beside several partials; its aliases and its own partials are then explained like the
//! first one's.

use super::lines::Line;
use crate::convert::nearest_index;
use crate::stiff::{CENTS_PER_NEPER, partial_hz, partial_number};
use crate::strays::aliases::Own;

/// Most voices beside the first one.
pub(crate) const VOICES_MAX: usize = 7;
/// Amplitude under that of the first voice's partial from which a line is another voice's, as a ratio: 26 dB.
pub(crate) const VOICE: f64 = 0.05;
/// Farthest from the partial at which a voice is looked for, in cents, and as a share of the fundamental.
const REACH_CENTS: f64 = 50.0;
const REACH_OF_F0: f64 = 0.3;
/// Highest partial beside which voices are looked for.
const HIGHEST: usize = 20;
/// Distance within which a line belongs to a voice, and from which two voices have lines of their own, in resolutions.
const MATCH: f64 = 0.4;
const APART: f64 = 1.5;
/// Fewest partials beside which a voice must be seen, and their least share of those where it could be.
const SEEN: usize = 4;
const SEEN_SHARE: f64 = 0.6;
/// Deviation of a line's frequency, in resolutions.
pub(crate) const LINE_SD: f64 = 0.03;

/// One of the voices.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(crate) struct Voice {
    /// Fundamental in Hz.
    pub(crate) f0: f64,
    /// Its deviation in Hz.
    pub(crate) f0_sd: f64,
}

/// What voices are looked for in.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Search<'a> {
    /// All lines, by rising frequency.
    pub(crate) lines: &'a [Line],
    /// The first voice's partials, by rising number.
    pub(crate) own: &'a [Own],
    /// The first voice's fundamental, in Hz, and the inharmonicity of all.
    pub(crate) f0: f64,
    pub(crate) b: f64,
    /// Resolution of the lines in Hz.
    pub(crate) resolution_hz: f64,
}

/// How well a fundamental is seen.
#[derive(Debug, Clone, Copy, Default)]
struct Seen {
    lines: usize,
    /// Partials at which it would have a line of its own.
    possible: usize,
    /// Sums for the fundamental by least squares: orders times frequencies, squared orders, and squared differences.
    sums: (f64, f64),
    squares: f64,
}

impl Search<'_> {
    /// The voice that is seen best among the lines that are not `taken`; `known` are the voices found so far.
    pub(crate) fn next(&self, known: &[Voice], taken: impl Fn(&Line) -> bool) -> Option<Voice> {
        let rows = || self.own.iter().filter(|own| own.n <= HIGHEST);
        let mut best: Option<(f64, Seen)> = None;
        for own in rows() {
            let reach = reach_hz(own.hz, self.f0);
            for line in
                self.around(own.hz, reach).iter().filter(|l| l.amplitude >= VOICE * own.amplitude)
            {
                if taken(line) {
                    continue;
                }
                let f0 = line.hz / self.order(own.n);
                let seen = self.seen(f0, known, &taken);
                let enough =
                    seen.lines >= SEEN && seen.lines as f64 >= SEEN_SHARE * seen.possible as f64;
                let better = best.is_none_or(|(_, most)| {
                    seen.lines > most.lines
                        || (seen.lines == most.lines && seen.squares < most.squares)
                });
                if enough && better {
                    best = Some((f0, seen));
                }
            }
        }
        best.map(|(_, seen)| Voice {
            f0: seen.sums.0 / seen.sums.1,
            f0_sd: LINE_SD * self.resolution_hz / seen.sums.1.sqrt(),
        })
    }

    /// The line that a voice has as its partial `n`, if it has one.
    pub(crate) fn line(&self, voice: Voice, n: usize) -> Option<&Line> {
        let hz = self.order(n) * voice.f0;
        let near = self.around(hz, MATCH * self.resolution_hz);
        near.iter().max_by(|a, b| a.amplitude.total_cmp(&b.amplitude))
    }

    /// Whether a line lies where a voice has a partial, within so many resolutions.
    pub(crate) fn is_partial_of(&self, voice: Voice, hz: f64, resolutions: f64) -> bool {
        let n = nearest_index(partial_number(voice.f0, self.b.max(0.0), hz)).max(1);
        (hz - self.order(n) * voice.f0).abs() < resolutions * self.resolution_hz
    }

    fn seen(&self, f0: f64, known: &[Voice], taken: &impl Fn(&Line) -> bool) -> Seen {
        let mut seen = Seen::default();
        for own in self.own.iter().filter(|own| own.n <= HIGHEST) {
            let order = self.order(own.n);
            let hz = order * f0;
            let others = known.iter().map(|voice| order * voice.f0).chain([own.hz]);
            let nearest = others.map(|other| (other - hz).abs()).fold(f64::INFINITY, f64::min);
            if nearest < APART * self.resolution_hz {
                continue;
            }
            seen.possible += 1;
            let lines = self.around(hz, MATCH * self.resolution_hz);
            let strong = |l: &&Line| l.amplitude >= VOICE * own.amplitude && !taken(l);
            let found =
                lines.iter().filter(strong).max_by(|a, b| a.amplitude.total_cmp(&b.amplitude));
            if let Some(line) = found {
                seen.lines += 1;
                seen.sums.0 += order * line.hz;
                seen.sums.1 += order * order;
                seen.squares += (line.hz - hz).powi(2);
            }
        }
        seen
    }

    fn order(&self, n: usize) -> f64 {
        partial_hz(1.0, self.b, n as f64)
    }

    fn around(&self, hz: f64, reach: f64) -> &[Line] {
        let from = self.lines.partition_point(|l| l.hz < hz - reach);
        let count = self.lines[from..].partition_point(|l| l.hz <= hz + reach);
        &self.lines[from..from + count]
    }
}

/// How far from a partial its voices are looked for, in Hz.
pub(crate) fn reach_hz(hz: f64, f0: f64) -> f64 {
    (hz * REACH_CENTS / CENTS_PER_NEPER).min(REACH_OF_F0 * f0)
}

#[cfg(test)]
mod tests {
    use super::*;

    const RESOLUTION_HZ: f64 = 0.35;

    /// Lines of voices of ten partials, and the first voice's own.
    fn voices(fundamentals: &[f64]) -> (Vec<Line>, Vec<Own>) {
        let mut lines: Vec<Line> = fundamentals
            .iter()
            .flat_map(|f0| (1..=10).map(move |n| (f0 * f64::from(n), 0.5 / f64::from(n))))
            .map(|(hz, amplitude)| Line { hz, amplitude, snr: 1e5 })
            .collect();
        lines.sort_by(|a, b| a.hz.total_cmp(&b.hz));
        let own = (1..=10).map(|n| Own {
            n,
            hz: fundamentals[0] * n as f64,
            sd_hz: 1e-4,
            amplitude: 0.5 / n as f64,
        });
        (lines, own.collect())
    }

    fn found(fundamentals: &[f64]) -> Vec<f64> {
        let (lines, own) = voices(fundamentals);
        let search = Search {
            lines: &lines,
            own: &own,
            f0: fundamentals[0],
            b: 0.0,
            resolution_hz: RESOLUTION_HZ,
        };
        let mut known = vec![Voice { f0: fundamentals[0], f0_sd: 0.0 }];
        while let Some(voice) = {
            let taken = |line: &Line| known.iter().any(|&v| search.is_partial_of(v, line.hz, 0.5));
            search.next(&known, taken)
        } {
            known.push(voice);
        }
        known.into_iter().map(|voice| voice.f0).collect()
    }

    #[test]
    fn each_voice_is_found_once() {
        for fundamentals in [&[220.0][..], &[220.0, 221.1], &[220.0, 219.2, 221.3, 222.0]] {
            let mut sorted = fundamentals.to_vec();
            sorted.sort_by(f64::total_cmp);
            let mut found = found(fundamentals);
            found.sort_by(f64::total_cmp);
            assert_eq!(found.len(), sorted.len(), "{fundamentals:?}: {found:?}");
            for (found, made) in found.iter().zip(&sorted) {
                assert!((found - made).abs() < 1e-6, "{fundamentals:?}: {found:?}");
            }
        }
    }

    #[test]
    fn lines_without_order_are_no_voice() {
        let (mut lines, own) = voices(&[220.0]);
        for n in 1..=10 {
            let off = 1.3 + 2.1 * (f64::from(n) * 1.7).sin();
            let amplitude = 0.1 / f64::from(n);
            lines.push(Line { hz: 220.0 * f64::from(n) + off, amplitude, snr: 1e4 });
        }
        lines.sort_by(|a, b| a.hz.total_cmp(&b.hz));
        let search =
            Search { lines: &lines, own: &own, f0: 220.0, b: 0.0, resolution_hz: RESOLUTION_HZ };
        let first = Voice { f0: 220.0, f0_sd: 0.0 };
        let taken = |line: &Line| search.is_partial_of(first, line.hz, 0.5);
        assert_eq!(search.next(&[first], taken), None);
    }
}
