//! Where in the session a sample lies: the host's transport, carried on from where it was last told.

use nice_plug::prelude::Transport as HostTransport;

use crate::convert::{floor, signed_distance};

/// Largest difference between the host's beat position and the one carried on that says nothing new, in quarter notes:
/// half a millisecond at 120 quarter notes a minute.
const BEATS_EPSILON: f64 = 1e-3;
/// The same for samples: positions told in seconds round to a neighbouring one.
const SAMPLES_EPSILON: u64 = 1;

/// The host's transport at one sample.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(crate) struct Transport {
    pub(crate) playing: bool,
    pub(crate) samples: Option<i64>,
    /// Quarter notes from the start of the session.
    pub(crate) beats: Option<f64>,
    /// Quarter notes a minute.
    pub(crate) tempo: Option<f64>,
    /// Time signature.
    pub(crate) signature: Option<(i32, i32)>,
    /// Quarter note at which a bar starts, and that bar's number from 0.
    pub(crate) bar: Option<(f64, i32)>,
}

/// A position in the session.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct SessionPosition {
    /// Whether the transport was running.
    pub playing: bool,
    /// Samples from the start of the session.
    pub samples: Option<i64>,
    /// Seconds from the start of the session.
    pub seconds: Option<f64>,
    /// Bar and beat.
    pub bar_beat: Option<BarBeat>,
}

/// A musical position: bars and beats count from 1, a beat being the time signature's note value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BarBeat {
    /// Bar, from 1.
    pub bar: i64,
    /// Beat within the bar, from 1, with its fraction.
    pub beat: f64,
}

impl Transport {
    pub(crate) fn of(host: &HostTransport) -> Self {
        Self {
            playing: host.playing,
            samples: host.pos_samples(),
            beats: host.pos_beats,
            tempo: host.tempo,
            signature: host.time_sig_numerator.zip(host.time_sig_denominator),
            bar: host.bar_start_pos_beats.zip(host.bar_number),
        }
    }

    /// Where the transport stands `samples` samples later, if nothing else happens.
    fn carried_on(&self, samples: i64, sample_rate_hz: f64) -> Self {
        if !self.playing {
            return *self;
        }
        let beats = self.tempo.map_or(0.0, |tempo| samples as f64 / sample_rate_hz * tempo / 60.0);
        Self {
            samples: self.samples.map(|at| at.saturating_add(samples)),
            beats: self.beats.map(|at| at + beats),
            ..*self
        }
    }

    fn position(&self, sample_rate_hz: f64) -> SessionPosition {
        SessionPosition {
            playing: self.playing,
            samples: self.samples,
            seconds: self.samples.map(|samples| samples as f64 / sample_rate_hz),
            bar_beat: self.bar_beat(),
        }
    }

    fn bar_beat(&self) -> Option<BarBeat> {
        let (beats, (numerator, denominator)) = (self.beats?, self.signature?);
        let (start, number) = self.bar.unwrap_or((0.0, 0));
        if numerator < 1 || denominator < 1 {
            return None;
        }
        let quarters_a_beat = 4.0 / f64::from(denominator);
        let quarters_a_bar = f64::from(numerator) * quarters_a_beat;
        let bars = ((beats - start) / quarters_a_bar).floor();
        let within = beats - start - bars * quarters_a_bar;
        Some(BarBeat {
            bar: i64::from(number) + floor(bars) + 1,
            beat: within / quarters_a_beat + 1.0,
        })
    }
}

/// What is new about a transport.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum News {
    /// Nothing: it went on as it was.
    None,
    /// Something changed, but the sound goes on.
    Changed,
    /// It jumped while playing (a loop, a locate): the sound is cut.
    Jumped,
}

/// A transport told at a stream position.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Anchor {
    /// Stream position.
    pub(crate) at: u64,
    pub(crate) transport: Transport,
}

impl Anchor {
    /// Compares what the host says at a later stream position with what follows from this anchor.
    pub(crate) fn news(&self, at: u64, told: &Transport, sample_rate_hz: f64) -> News {
        let elapsed = signed_distance(self.at, at);
        let expected = self.transport.carried_on(elapsed, sample_rate_hz);
        let same_place = match (expected.samples, told.samples) {
            (Some(a), Some(b)) => a.abs_diff(b) <= SAMPLES_EPSILON,
            (None, None) => true,
            _ => false,
        };
        let same_beat = match (expected.beats, told.beats) {
            (Some(a), Some(b)) => (a - b).abs() <= BEATS_EPSILON,
            (None, None) => true,
            _ => false,
        };
        if told.playing && expected.playing && !same_place {
            return News::Jumped;
        }
        let as_before = told.playing == expected.playing
            && told.tempo == expected.tempo
            && told.signature == expected.signature;
        if same_place && same_beat && as_before { News::None } else { News::Changed }
    }

    /// The session's position at a stream position (before the anchor: carried back).
    pub(crate) fn position(&self, at: u64, sample_rate_hz: f64) -> SessionPosition {
        let elapsed = signed_distance(self.at, at);
        self.transport.carried_on(elapsed, sample_rate_hz).position(sample_rate_hz)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE: f64 = 48_000.0;

    fn playing(samples: i64) -> Transport {
        Transport {
            playing: true,
            samples: Some(samples),
            beats: Some(samples as f64 / RATE * 2.0),
            tempo: Some(120.0),
            signature: Some((3, 4)),
            bar: Some((0.0, 0)),
        }
    }

    #[test]
    fn a_transport_that_goes_on_is_no_news() {
        let anchor = Anchor { at: 100, transport: playing(0) };
        for later in [0, 1, 480, 1_000_000] {
            let told = playing(later);
            let at = 100 + later.unsigned_abs();
            assert_eq!(anchor.news(at, &told, RATE), News::None, "{later} samples later");
        }
    }

    #[test]
    fn loops_jump_and_changes_are_told() {
        let anchor = Anchor { at: 0, transport: playing(96_000) };
        assert_eq!(anchor.news(48_000, &playing(0), RATE), News::Jumped, "back to the start");
        let stopped = Transport { playing: false, ..playing(144_000) };
        assert_eq!(anchor.news(48_000, &stopped, RATE), News::Changed, "stopped");
        let faster = Transport { tempo: Some(140.0), ..playing(144_000) };
        assert_eq!(anchor.news(48_000, &faster, RATE), News::Changed, "another tempo");
    }

    #[test]
    fn bars_and_beats_count_from_one_in_the_signatures_note_value() {
        // At 120 quarter notes a minute, 3/4: a bar lasts 72 000 samples, a beat 24 000.
        let anchor = Anchor { at: 0, transport: playing(0) };
        for (at, bar, beat) in [(0, 1, 1.0), (24_000, 1, 2.0), (72_000, 2, 1.0), (84_000, 2, 1.5)] {
            let found = anchor.position(at, RATE).bar_beat;
            assert_eq!(found, Some(BarBeat { bar, beat }), "at {at}");
        }
        let eighths = Transport { signature: Some((6, 8)), ..playing(0) };
        let anchor = Anchor { at: 0, transport: eighths };
        let found = anchor.position(12_000, RATE).bar_beat;
        assert_eq!(found, Some(BarBeat { bar: 1, beat: 2.0 }), "an eighth later in 6/8");
    }

    #[test]
    fn a_stopped_transport_stands_still() {
        let anchor = Anchor { at: 0, transport: Transport { playing: false, ..playing(500) } };
        assert_eq!(anchor.position(48_000, RATE).samples, Some(500), "a second later");
    }
}
