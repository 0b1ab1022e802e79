//! The outcome of a check as it is written down, with the names, units and order that the JSON promises.

use crate::measure::{FileFacts, Timebase};
use crate::output::records::GapRecord;
use plumbtone_analysis::check::{CheckSettings, Outcome, Span, Stability, Verdict};
use serde::Serialize;

/// How a reference is called.
#[derive(Debug, Clone)]
pub(crate) struct ReferenceWords {
    /// In the JSON.
    pub(crate) kind: &'static str,
    /// For people.
    pub(crate) name: String,
}

/// A verdict in a word.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub(crate) enum VerdictWord {
    Within,
    Outside,
    Unmeasured,
}

/// The check of one file.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct DriftRecord {
    pub(crate) file: String,
    pub(crate) reference_hz: Option<f64>,
    pub(crate) reference_kind: &'static str,
    pub(crate) tolerance_cents: f64,
    pub(crate) verdict: VerdictWord,
    pub(crate) worst_cents: Option<f64>,
    pub(crate) mean_cents: Option<f64>,
    pub(crate) drift_cents_per_s: Option<f64>,
    pub(crate) drift_sd: Option<f64>,
    pub(crate) vibrato_hz: Option<f64>,
    pub(crate) vibrato_extent_cents: Option<f64>,
    pub(crate) measured_share: Option<f64>,
    pub(crate) spans: Vec<SpanRecord>,
    pub(crate) spans_left_out: u64,
    /// Why there is no verdict.
    pub(crate) reason: Option<String>,
    pub(crate) reference: String,
    pub(crate) drift_cents_per_min: Option<f64>,
    pub(crate) drift_per_min_sd: Option<f64>,
    pub(crate) vibrato_share: Option<f64>,
    pub(crate) raw_lowest_cents: Option<f64>,
    pub(crate) raw_highest_cents: Option<f64>,
    pub(crate) measured_s: f64,
    pub(crate) outside_s: f64,
    pub(crate) min_span_s: f64,
    pub(crate) min_share: f64,
    pub(crate) stability: Vec<StabilityRecord>,
    pub(crate) gaps: Vec<GapRecord>,
    pub(crate) gaps_left_out: u64,
    pub(crate) sample_rate_hz: u32,
    pub(crate) channels: usize,
    pub(crate) duration_s: f64,
    pub(crate) concert_pitch_hz: f64,
    pub(crate) engine_version: &'static str,
}

/// Where it is outside.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct SpanRecord {
    pub(crate) start_s: f64,
    pub(crate) end_s: f64,
    pub(crate) worst_cents: f64,
    pub(crate) mean_cents: f64,
}

/// Stability over an averaging time.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct StabilityRecord {
    pub(crate) averaging_s: f64,
    pub(crate) allan_deviation_cents: f64,
    pub(crate) terms: u64,
}

impl SpanRecord {
    pub(crate) fn new(span: &Span, timebase: Timebase) -> Self {
        Self {
            start_s: timebase.seconds(span.start),
            end_s: timebase.seconds(span.end),
            worst_cents: span.worst_cents,
            mean_cents: span.mean_cents,
        }
    }

    pub(crate) fn length_s(&self) -> f64 {
        self.end_s - self.start_s
    }
}

impl DriftRecord {
    pub(crate) fn new(
        outcome: &Outcome,
        settings: &CheckSettings,
        words: &ReferenceWords,
        facts: &FileFacts,
        timebase: Timebase,
    ) -> Self {
        let (verdict, reason) = match outcome.verdict {
            Verdict::Within => (VerdictWord::Within, None),
            Verdict::Outside => (VerdictWord::Outside, None),
            Verdict::Unmeasured(why) => (VerdictWord::Unmeasured, Some(why.to_string())),
        };
        let spans: Vec<_> =
            outcome.spans.iter().map(|span| SpanRecord::new(span, timebase)).collect();
        Self {
            file: facts.path.to_string_lossy().into_owned(),
            reference_hz: outcome.reference_hz,
            reference_kind: words.kind,
            tolerance_cents: settings.tolerance_cents,
            verdict,
            worst_cents: outcome.worst_cents,
            mean_cents: outcome.mean_cents,
            drift_cents_per_s: outcome.drift.map(|drift| drift.cents_per_s),
            drift_sd: outcome.drift.map(|drift| drift.sd),
            vibrato_hz: outcome.vibrato.map(|vibrato| vibrato.rate_hz),
            vibrato_extent_cents: outcome.vibrato.map(|vibrato| vibrato.extent_cents),
            measured_share: outcome.measured_share,
            // A sum of nothing would be the negative zero.
            outside_s: spans.iter().map(SpanRecord::length_s).fold(0.0, |sum, s| sum + s),
            spans,
            spans_left_out: outcome.spans_left_out,
            reason,
            reference: words.name.clone(),
            drift_cents_per_min: outcome.drift.map(|drift| 60.0 * drift.cents_per_s),
            drift_per_min_sd: outcome.drift.map(|drift| 60.0 * drift.sd),
            vibrato_share: outcome.vibrato.map(|vibrato| vibrato.share),
            raw_lowest_cents: outcome.raw_cents.map(|raw| raw.0),
            raw_highest_cents: outcome.raw_cents.map(|raw| raw.1),
            measured_s: outcome.measured_s,
            min_span_s: settings.min_span_s,
            min_share: settings.min_share,
            stability: outcome.stability.iter().map(StabilityRecord::new).collect(),
            gaps: Vec::new(),
            gaps_left_out: 0,
            sample_rate_hz: facts.sample_rate_hz,
            channels: facts.channels,
            duration_s: facts.duration_s,
            concert_pitch_hz: facts.concert_pitch_hz,
            engine_version: plumbtone_analysis::VERSION,
        }
    }
}

impl StabilityRecord {
    fn new(stability: &Stability) -> Self {
        Self {
            averaging_s: stability.averaging_s,
            allan_deviation_cents: stability.deviation_cents,
            terms: stability.terms,
        }
    }
}
