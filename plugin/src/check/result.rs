//! What a check came to: plain data as it is kept, shown and reported, under the names of the command line's JSON.

use plumbtone_analysis::check::{Outcome, Verdict};
use serde::{Deserialize, Serialize};

use super::curve::Curve;
use crate::convert::nearest;

/// Most spans that one result keeps.
pub(crate) const SPANS_MAX: usize = 512;
/// Most characters of a comment.
pub(crate) const COMMENT_MAX: usize = 400;

/// A verdict in a word.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum VerdictWord {
    /// The heard pitch stayed within the tolerance.
    Within,
    /// It did not.
    Outside,
    /// There is no verdict.
    Unmeasured,
}

impl VerdictWord {
    /// The word.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Within => "within",
            Self::Outside => "outside",
            Self::Unmeasured => "unmeasured",
        }
    }
}

/// A stretch of time, told three ways.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Extent {
    /// Start in seconds: of the session where its transport ran and told it, else of the stream.
    pub start_s: f64,
    /// End in seconds.
    pub end_s: f64,
    /// Start in samples.
    pub start_sample: i64,
    /// End in samples.
    pub end_sample: i64,
    /// Bar and beat of the start, from 1, where the transport told them.
    pub start_bar: Option<i64>,
    /// Beat within that bar, with its fraction.
    pub start_beat: Option<f64>,
    /// Bar of the end.
    pub end_bar: Option<i64>,
    /// Beat within that bar.
    pub end_beat: Option<f64>,
}

/// Where the pitch was outside.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct OutsideSpan {
    /// From when to when.
    #[serde(flatten)]
    pub extent: Extent,
    /// Largest deviation, with its sign, in cents.
    pub worst_cents: f64,
    /// Mean deviation, in cents.
    pub mean_cents: f64,
}

/// One finished check.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CheckResult {
    /// Which one it is, from 1.
    pub number: u64,
    /// From when to when the check was on.
    #[serde(flatten)]
    pub extent: Extent,
    /// Whether that is the session's time, not the stream's.
    pub in_session: bool,
    /// The verdict.
    pub verdict: VerdictWord,
    /// Why there is none.
    pub reason: Option<String>,
    /// What the pitch was compared with.
    pub reference: String,
    /// The same in a word for programs.
    pub reference_kind: String,
    /// The reference in Hz where it was one throughout.
    pub reference_hz: Option<f64>,
    /// Largest distance from it that is within, in cents.
    pub tolerance_cents: f64,
    /// The heard pitch farthest from the reference, with its sign, in cents.
    pub worst_cents: Option<f64>,
    /// Mean of the heard pitch above the reference, in cents.
    pub mean_cents: Option<f64>,
    /// Drift.
    pub drift_cents_per_s: Option<f64>,
    /// Its standard deviation.
    pub drift_sd: Option<f64>,
    /// Drift in cents per minute.
    pub drift_cents_per_min: Option<f64>,
    /// Its standard deviation.
    pub drift_per_min_sd: Option<f64>,
    /// Rate of the vibrato, if there is one.
    pub vibrato_hz: Option<f64>,
    /// Its extent as half of the range, in cents.
    pub vibrato_extent_cents: Option<f64>,
    /// Share of the measured time that has it.
    pub vibrato_share: Option<f64>,
    /// Lowest reading, vibrato and all, in cents.
    pub raw_lowest_cents: Option<f64>,
    /// Highest reading.
    pub raw_highest_cents: Option<f64>,
    /// Time that was measured, in seconds.
    pub measured_s: f64,
    /// Share of the sounding time that was measured.
    pub measured_share: Option<f64>,
    /// Time outside, in seconds.
    pub outside_s: f64,
    /// Where it was outside.
    pub spans: Vec<OutsideSpan>,
    /// How many more spans there were.
    pub spans_left_out: u64,
    /// Samples within the check that did not reach the engine.
    pub lost_samples: u64,
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// Frequency of A4, in Hz.
    pub concert_pitch_hz: f64,
    /// The temperament.
    pub temperament: String,
    /// Version of the engine that measured.
    pub engine_version: String,
    /// What the user wrote to it.
    pub comment: String,
    /// The heard pitch over time; only the newest results keep theirs.
    #[serde(default)]
    pub curve: Option<Curve>,
    /// Where it lies in the trail, while that still holds it.
    #[serde(skip)]
    pub in_trail: Option<InTrail>,
}

/// Where a check lies in the trail of the pitch.
#[derive(Debug, Clone, PartialEq)]
pub struct InTrail {
    /// Index of its first reading.
    pub start: f64,
    /// Index after its last one.
    pub end: f64,
    /// Readings in a second.
    pub readings_per_s: f64,
}

impl Extent {
    /// Length in seconds.
    #[must_use]
    pub fn length_s(&self) -> f64 {
        self.end_s - self.start_s
    }

    /// Start and end as `bar|beat`, where the transport told them, otherwise in seconds.
    #[must_use]
    pub fn ends(&self) -> (String, String) {
        let musical = |bar: Option<i64>, beat: Option<f64>| {
            // Rounded down: a beat that has not come is not told.
            bar.zip(beat)
                .map(|(bar, beat)| format!("{bar}|{:.2}", (beat * 100.0 + 1e-6).floor() / 100.0))
        };
        let start = musical(self.start_bar, self.start_beat);
        let end = musical(self.end_bar, self.end_beat);
        start.zip(end).unwrap_or_else(|| (clock(self.start_s), clock(self.end_s)))
    }

    fn is_sound(&self) -> bool {
        let finite = |x: Option<f64>| x.is_none_or(f64::is_finite);
        self.start_s.is_finite()
            && self.end_s.is_finite()
            && self.end_s >= self.start_s
            && self.end_sample >= self.start_sample
            && finite(self.start_beat)
            && finite(self.end_beat)
    }
}

/// Seconds as minutes and seconds.
pub(crate) fn clock(seconds: f64) -> String {
    let sign = if seconds < 0.0 { "-" } else { "" };
    let hundredths = nearest(100.0 * seconds.abs());
    let (minutes, rest) = (hundredths / 6000, hundredths % 6000);
    format!("{sign}{minutes}:{:02}.{:02}", rest / 100, rest % 100)
}

impl InTrail {
    /// Where a stretch of the check lies in the trail.
    #[must_use]
    pub fn of(&self, whole: &Extent, part: &Extent) -> (f64, f64) {
        let at = |seconds: f64| {
            (self.start + (seconds - whole.start_s) * self.readings_per_s)
                .clamp(self.start, self.end)
        };
        (at(part.start_s), at(part.end_s))
    }
}

impl CheckResult {
    /// Takes over what an outcome says; what it was set to and where it lies is already there.
    pub(crate) fn conclude(&mut self, outcome: &Outcome, place: impl Fn(u64, u64) -> Extent) {
        (self.verdict, self.reason) = match outcome.verdict {
            Verdict::Within => (VerdictWord::Within, None),
            Verdict::Outside => (VerdictWord::Outside, None),
            Verdict::Unmeasured(why) => (VerdictWord::Unmeasured, Some(why.to_string())),
        };
        self.reference_hz = outcome.reference_hz;
        self.worst_cents = outcome.worst_cents;
        self.mean_cents = outcome.mean_cents;
        self.drift_cents_per_s = outcome.drift.map(|drift| drift.cents_per_s);
        self.drift_sd = outcome.drift.map(|drift| drift.sd);
        self.drift_cents_per_min = outcome.drift.map(|drift| 60.0 * drift.cents_per_s);
        self.drift_per_min_sd = outcome.drift.map(|drift| 60.0 * drift.sd);
        self.vibrato_hz = outcome.vibrato.map(|vibrato| vibrato.rate_hz);
        self.vibrato_extent_cents = outcome.vibrato.map(|vibrato| vibrato.extent_cents);
        self.vibrato_share = outcome.vibrato.map(|vibrato| vibrato.share);
        self.raw_lowest_cents = outcome.raw_cents.map(|raw| raw.0);
        self.raw_highest_cents = outcome.raw_cents.map(|raw| raw.1);
        self.measured_s = outcome.measured_s;
        self.measured_share = outcome.measured_share;
        self.spans = outcome
            .spans
            .iter()
            .take(SPANS_MAX)
            .map(|span| OutsideSpan {
                extent: place(span.start, span.end),
                worst_cents: span.worst_cents,
                mean_cents: span.mean_cents,
            })
            .collect();
        let listed = self.spans.len() as u64;
        self.spans_left_out = outcome.spans_left_out + (outcome.spans.len() as u64 - listed);
        // A sum of nothing would be the negative zero.
        self.outside_s =
            self.spans.iter().map(|span| span.extent.length_s()).fold(0.0, |a, b| a + b);
    }

    /// Whether another pass covers the same stretch of the session.
    pub(crate) fn is_covered_by(&self, pass: &Self) -> bool {
        self.in_session
            && pass.in_session
            && self.extent.start_s >= pass.extent.start_s - SAME_S
            && self.extent.end_s <= pass.extent.end_s + SAME_S
    }

    /// Whether a result that was read back can be one.
    pub(crate) fn is_sound(&self) -> bool {
        let finite = |x: Option<f64>| x.is_none_or(f64::is_finite);
        self.extent.is_sound()
            && self.spans.len() <= SPANS_MAX
            && self.spans.iter().all(|span| span.extent.is_sound())
            && (self.verdict != VerdictWord::Outside || !self.spans.is_empty())
            && self.tolerance_cents > 0.0
            && self.sample_rate_hz > 0.0
            && [self.worst_cents, self.mean_cents, self.drift_cents_per_s].into_iter().all(finite)
            && self.comment.chars().count() <= COMMENT_MAX
            && self.curve.as_ref().is_none_or(Curve::is_sound)
    }
}

/// Where two passes begin and end so close to each other, in seconds, they are of the same stretch.
const SAME_S: f64 = 0.05;
