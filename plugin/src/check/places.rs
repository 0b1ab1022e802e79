//! Positions of the stream as places in the session.

use std::collections::VecDeque;

use super::curve::BARS_MAX;
use super::result::Extent;
use crate::convert::signed_distance;
use crate::session::{Anchor, BarBeat, SessionPosition};

/// Most words of the transport that one check remembers: a tempo that never stands still gives one with every block.
const ANCHORS_MAX: usize = 4096;

/// What lies this much below the middle between two thousandths of a beat is rounded up with it: the middle itself is a
/// common place, and hosts tell it a little more or less.
const MIDDLE: f64 = 1e-4;
/// Beats before a bar that are the bar.
const ALMOST: f64 = 1e-6;

/// Where the transport was over one check: it never jumped, but its tempo may have changed.
#[derive(Debug)]
pub(super) struct Places {
    anchors: VecDeque<Anchor>,
    /// Whether the oldest words are forgotten.
    forgotten: bool,
    sample_rate_hz: f64,
}

impl Places {
    pub(super) fn new(anchor: Option<Anchor>, sample_rate_hz: f64) -> Self {
        Self { anchors: anchor.into_iter().collect(), forgotten: false, sample_rate_hz }
    }

    pub(super) fn add(&mut self, anchor: Anchor) {
        if self.anchors.len() == ANCHORS_MAX {
            // The first one stays: seconds follow from it alone.
            self.anchors.remove(1);
            self.forgotten = true;
        }
        self.anchors.push_back(anchor);
    }

    /// Whether a position has a place in the session: the transport runs there and tells its time.
    pub(super) fn in_session(&self, at: u64) -> bool {
        let SessionPosition { playing, samples, .. } = self.of(at);
        playing && samples.is_some()
    }

    /// A stretch, in the session's time if it begins there.
    pub(super) fn extent(&self, start: u64, end: u64) -> Extent {
        let sample = |at: u64| {
            let first = self.anchors.front().filter(|anchor| anchor.transport.playing);
            let told = first.and_then(|anchor| {
                Some(anchor.transport.samples?.saturating_add(signed_distance(anchor.at, at)))
            });
            told.unwrap_or_else(|| signed_distance(0, at))
        };
        let (start_sample, end_sample) = (sample(start), sample(end));
        let (from, to) = (self.bar_beat(start), self.bar_beat(end));
        Extent {
            start_s: start_sample as f64 / self.sample_rate_hz,
            end_s: end_sample as f64 / self.sample_rate_hz,
            start_sample,
            end_sample,
            start_bar: from.map(|at| at.bar),
            start_beat: from.map(|at| at.beat),
            end_bar: to.map(|at| at.bar),
            end_beat: to.map(|at| at.beat),
        }
    }

    /// Bars that begin within a stretch, as many as are told of one: number, and seconds as in its extent.
    pub(super) fn bars(&self, start: u64, end: u64) -> Vec<(i64, f64)> {
        let (Some(first), Some(last)) = (self.bar(start), self.bar(end)) else { return Vec::new() };
        let most = BARS_MAX as u64;
        let stride = last.saturating_sub(first).unsigned_abs().div_ceil(most).next_power_of_two();
        let stride = i64::try_from(stride).unwrap_or(i64::MAX);
        (first.saturating_add(1)..=last)
            .filter(|bar| (bar - 1).rem_euclid(stride) == 0)
            .take(BARS_MAX)
            .map(|bar| (bar, self.start_s(bar, start, end)))
            .collect()
    }

    /// When a bar begins within a stretch, to the millisecond: hosts tell it a little earlier or later.
    fn start_s(&self, bar: i64, mut start: u64, mut end: u64) -> f64 {
        while start < end {
            let middle = start + (end - start) / 2;
            if self.bar(middle).is_some_and(|found| found >= bar) {
                end = middle;
            } else {
                start = middle + 1;
            }
        }
        (1000.0 * self.extent(start, start).start_s).round() / 1000.0
    }

    /// The bar at a position; what is almost the next one is.
    fn bar(&self, at: u64) -> Option<i64> {
        let (beats, _) = self.anchor(at)?.transport.signature?;
        let BarBeat { bar, beat } = self.known(at)?;
        Some(if beat + ALMOST >= f64::from(beats) + 1.0 { bar + 1 } else { bar })
    }

    /// Bar and beat, where they are not forgotten.
    fn known(&self, at: u64) -> Option<BarBeat> {
        let oldest = self.anchors.get(1).map_or(u64::MAX, |anchor| anchor.at);
        if self.forgotten && at < oldest {
            return None;
        }
        self.of(at).bar_beat.filter(|found| found.beat.is_finite())
    }

    /// Bar and beat, rounded to a thousandth: hosts' own rounding differs from block to block.
    fn bar_beat(&self, at: u64) -> Option<BarBeat> {
        let BarBeat { bar, beat } = self.known(at)?;
        let beat = (1000.0 * beat + 0.5 + MIDDLE).floor() / 1000.0;
        let (beats, _) = self.anchor(at)?.transport.signature?;
        let next = beat >= f64::from(beats) + 1.0;
        Some(if next { BarBeat { bar: bar + 1, beat: 1.0 } } else { BarBeat { bar, beat } })
    }

    fn of(&self, at: u64) -> SessionPosition {
        let anchor = self.anchor(at);
        anchor.map_or_else(SessionPosition::default, |a| a.position(at, self.sample_rate_hz))
    }

    /// The newest word of the transport at a position; the first one before that.
    fn anchor(&self, at: u64) -> Option<&Anchor> {
        let after = self.anchors.partition_point(|anchor| anchor.at <= at);
        self.anchors.get(after.saturating_sub(1))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::session::Transport;

    const RATE_HZ: f64 = 48_000.0;

    fn anchor(at: u64, samples: i64, tempo: f64, beats: f64) -> Anchor {
        let transport = Transport {
            playing: true,
            samples: Some(samples),
            beats: Some(beats),
            tempo: Some(tempo),
            signature: Some((4, 4)),
            bar: Some((0.0, 0)),
        };
        Anchor { at, transport }
    }

    #[test]
    fn bars_follow_every_change_of_tempo() {
        // A bar lasts two seconds, from the fourth second on half a second.
        let mut places = Places::new(Some(anchor(1_000, 0, 120.0, 0.0)), RATE_HZ);
        places.add(anchor(193_000, 192_000, 480.0, 8.0));
        let extent = places.extent(97_000, 241_000);
        // Just before a bar is the bar, by rounding.
        assert_eq!(places.extent(96_998, 97_000).start_bar, Some(2), "two samples early");
        assert_eq!((extent.start_sample, extent.end_sample), (96_000, 240_000), "{extent:?}");
        assert_eq!((extent.start_bar, extent.end_bar), (Some(2), Some(5)), "{extent:?}");
        assert_eq!((extent.start_beat, extent.end_beat), (Some(1.0), Some(1.0)), "{extent:?}");
    }

    #[test]
    fn bars_are_found_where_they_begin_and_thinned_out() {
        let mut places = Places::new(Some(anchor(1_000, 0, 120.0, 0.0)), RATE_HZ);
        places.add(anchor(193_000, 192_000, 480.0, 8.0));
        let bars = places.bars(1_000, 241_000);
        assert_eq!(bars, [(2, 2.0), (3, 4.0), (4, 4.5), (5, 5.0)], "two tempos");
        let bars = places.bars(1_000, 193_000 + 97 * 24_000);
        assert!(bars.len() <= BARS_MAX && bars.len() > BARS_MAX / 2, "{bars:?}");
        assert!(bars.iter().all(|(bar, _)| (bar - 1) % 8 == 0), "a round number each: {bars:?}");
        assert_eq!(bars[1], (17, 11.0), "{bars:?}");
    }

    #[test]
    fn without_a_transport_the_stream_counts() {
        let places = Places::new(None, RATE_HZ);
        let extent = places.extent(24_000, 48_000);
        assert_eq!((extent.start_sample, extent.end_sample), (24_000, 48_000), "{extent:?}");
        assert!(!places.in_session(24_000) && extent.start_bar.is_none(), "{extent:?}");
    }

    #[test]
    fn a_tempo_that_never_stands_still_is_forgotten_from_its_beginning() {
        let mut places = Places::new(Some(anchor(0, 0, 120.0, 0.0)), RATE_HZ);
        for block in 1..10_000_u32 {
            let at = u64::from(block) * 512;
            places.add(anchor(
                at,
                i64::from(block) * 512,
                120.0,
                f64::from(block) * 512.0 / 24_000.0,
            ));
        }
        assert!(places.anchors.len() <= ANCHORS_MAX, "{}", places.anchors.len());
        let extent = places.extent(48_000, 9_999 * 512);
        assert_eq!((extent.start_sample, extent.start_bar), (48_000, None), "{extent:?}");
        assert!(extent.end_bar.is_some(), "{extent:?}");
    }
}
