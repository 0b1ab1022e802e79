//! Partials that are several lines each, as the last whole note told: detuned voices, a chorus, strings in pairs. A reading is
//! too short to tell such lines apart.

use plumbtone_analysis::{Cluster, Note};

/// Pitch that counts as the note's, in cents to either side.
const SAME_CENTS: f64 = 60.0;

/// What the last note told of its partials' lines.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Voices {
    /// Fundamental of the note, in Hz; 0 before the first one.
    pub f0_hz: f64,
    /// How many partials it had.
    pub partials: usize,
    /// Those that are several lines, by rising number.
    pub clusters: Vec<(u32, Cluster)>,
}

/// Clusters of a note in a few figures.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Summary {
    /// Fewest and most lines of a partial.
    pub lines: (u32, u32),
    /// Width that half the clusters exceed, in cents.
    pub spread_cents: f64,
    /// Number of the lowest partial that is a cluster, and how fast it beats, in Hz.
    pub lowest: (u32, f64),
    /// The same of the highest one.
    pub highest: (u32, f64),
}

impl Voices {
    /// Takes a note that has ended.
    pub fn take(&mut self, note: &Note) {
        self.f0_hz = note.f0_hz;
        self.partials = note.partials.len();
        self.clusters.clear();
        let clusters = note.partials.iter().filter_map(|p| Some((p.number, p.cluster?)));
        self.clusters.extend(clusters);
    }

    /// Copies another one into this one, keeping the memory of the list.
    pub(crate) fn copy(&mut self, from: &Self) {
        self.f0_hz = from.f0_hz;
        self.partials = from.partials;
        self.clusters.clone_from(&from.clusters);
    }

    /// The lines of a partial, while the pitch is still that of the note.
    #[must_use]
    pub fn of(&self, number: u32, f0_hz: f64) -> Option<Cluster> {
        let cents = 1200.0 * (f0_hz / self.f0_hz).log2();
        let near = cents.abs() < SAME_CENTS;
        let found = self.clusters.binary_search_by_key(&number, |cluster| cluster.0).ok();
        Some(self.clusters[found.filter(|_| near)?].1)
    }

    /// The clusters in a few figures, if there are any.
    #[must_use]
    pub fn summary(&self) -> Option<Summary> {
        let (first, last) = self.clusters.first().zip(self.clusters.last())?;
        let lines = || self.clusters.iter().map(|cluster| cluster.1.lines);
        let mut spreads: Vec<f64> = self.clusters.iter().map(|c| c.1.spread_cents).collect();
        spreads.sort_by(f64::total_cmp);
        Some(Summary {
            lines: (lines().min()?, lines().max()?),
            spread_cents: spreads[spreads.len() / 2],
            lowest: (first.0, first.1.beat_hz),
            highest: (last.0, last.1.beat_hz),
        })
    }
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::signals::{narrow, sample_count};
    use plumbtone_analysis::{Analyzer, Settings, Sink};

    use super::*;

    #[derive(Default)]
    struct Heard(Voices);

    impl Sink for Heard {
        fn note(&mut self, note: &Note) {
            self.0.take(note);
        }
    }

    /// Two saws of ten partials, so many cents apart, for three seconds.
    fn unison(cents: f64) -> Voices {
        let rate = 48_000.0;
        let turn = |hz: f64, i: usize| core::f64::consts::TAU * hz * i as f64 / rate;
        let sound: Vec<f64> = (0..sample_count(3.0, rate))
            .map(|i| {
                [1.0, 2f64.powf(cents / 1200.0)]
                    .iter()
                    .flat_map(|by| (1..=10).map(move |n| (220.0 * by, f64::from(n))))
                    .map(|(hz, n)| 0.08 / n * (turn(n * hz, i) + 1.3 * n * n).cos())
                    .sum()
            })
            .collect();
        let mut heard = Heard::default();
        let mut engine = Analyzer::new(&Settings::new(rate)).unwrap();
        engine.push(&narrow(&sound), &mut heard);
        engine.finish(&mut heard);
        heard.0
    }

    #[test]
    fn detuned_voices_are_told_from_one() {
        assert_eq!(unison(0.0).summary(), None, "one voice");
        // 14 cents at 220 Hz are 1.8 Hz: more than 4 over 3 s from partial 1 on.
        let voices = unison(14.0);
        let found = voices.summary().unwrap();
        assert_eq!((found.lines, found.lowest.0, found.highest.0), ((2, 2), 1, 10), "{voices:?}");
        assert!((found.spread_cents - 14.0).abs() < 0.1, "{found:?}");
        assert!((found.lowest.1 - 1.786).abs() < 0.02, "{found:?}");
        assert!((found.highest.1 - 17.86).abs() < 0.05, "{found:?}");
        assert!(voices.of(3, 221.0).is_some_and(|cluster| cluster.lines == 2), "near the note");
        assert_eq!(voices.of(3, 240.0), None, "another note");
        assert_eq!(voices.of(11, 221.0), None, "no such partial");
    }
}
