//! How much of the sounding time has a pitch, and what the rest is.

use crate::convert::nearest_index;
use crate::reading::State;

/// Levels are counted in steps of 1 dB below 0 dBFS.
const LEVELS: usize = 128;
/// What lies so many dB below the loud parts of what has a pitch is background, not sound.
const BACKGROUND_DB: usize = 40;
/// Share of the pitched readings that are louder than the "loud parts" begin.
const LOUD: f64 = 0.1;

/// Counts of readings.
#[derive(Debug)]
pub(super) struct Sounding {
    pitched: [f64; LEVELS],
    unpitched: [f64; LEVELS],
    several: f64,
    noise: f64,
    lost: f64,
    readings: f64,
}

impl Default for Sounding {
    fn default() -> Self {
        let none = [0.0; LEVELS];
        Self { pitched: none, unpitched: none, several: 0.0, noise: 0.0, lost: 0.0, readings: 0.0 }
    }
}

impl Sounding {
    /// Takes in a reading where a pitch is due; `measured` when it has one that counts.
    pub(super) fn push(&mut self, state: State, level_dbfs: f64, measured: bool) {
        self.readings += 1.0;
        let at = nearest_index(-level_dbfs).min(LEVELS - 1);
        match state {
            _ if measured => self.pitched[at] += 1.0,
            State::Silent => {}
            State::Several => {
                self.several += 1.0;
                self.unpitched[at] += 1.0;
            }
            State::Unpitched | State::Gliding | State::Steady => {
                self.noise += 1.0;
                self.unpitched[at] += 1.0;
            }
        }
    }

    /// Takes in so many readings that are missing: what they held is not known, so they count as sounding.
    pub(super) fn lose(&mut self, readings: f64) {
        self.lost += readings;
    }

    /// Whether anything came at all.
    pub(super) fn is_empty(&self) -> bool {
        self.readings == 0.0
    }

    /// Whether most of what has no pitch has several.
    pub(super) fn is_mostly_several(&self) -> bool {
        self.several > self.noise
    }

    /// Readings that sound, and those of them that are measured.
    pub(super) fn counts(&self) -> (f64, f64) {
        let measured: f64 = self.pitched.iter().sum();
        let mut louder = 0.0;
        let loud = self.pitched.iter().position(|count| {
            louder += count;
            louder > LOUD * measured
        });
        let quietest = loud.map_or(LEVELS, |level| (level + BACKGROUND_DB).min(LEVELS));
        let unmeasured: f64 = self.unpitched[..quietest].iter().sum();
        (measured + unmeasured + self.lost, measured)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn background_between_notes_is_no_sound() {
        for (level_dbfs, sounds) in [(-70.0, false), (-25.0, true), (f64::NEG_INFINITY, false)] {
            let mut sounding = Sounding::default();
            for _ in 0..50 {
                sounding.push(State::Steady, -20.0, true);
                sounding.push(State::Unpitched, level_dbfs, false);
                sounding.push(State::Silent, -95.0, false);
            }
            let all = if sounds { 100.0 } else { 50.0 };
            let (found, measured) = sounding.counts();
            let close = (found - all).abs() < 0.5 && (measured - 50.0).abs() < 0.5;
            assert!(close, "noise at {level_dbfs} dBFS: {found}, {measured}");
        }
    }

    #[test]
    fn without_any_pitch_all_noise_is_sound() {
        let mut sounding = Sounding::default();
        sounding.push(State::Unpitched, -80.0, false);
        sounding.push(State::Silent, -95.0, false);
        sounding.lose(2.0);
        assert_eq!(sounding.counts(), (3.0, 0.0), "one of noise, two lost");
    }
}
