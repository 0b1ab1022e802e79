//! What a check comes to.

use core::fmt;

use super::Heard;
use super::allan::OverlappingAllan;
use super::heard::Judged;
use super::reference::Resolver;
use super::settings::CheckSettings;
use super::slope::Slope;
use super::sounding::Sounding;
use super::spans::{Span, Spans};

/// Averaging times: 1, 2, 4... readings, up to about six hours.
const ALLAN_OCTAVES: u32 = 22;
/// Least time and share of the measured time with a vibrato for there to be one.
const VIBRATO_S: f64 = 0.4;
const VIBRATO_SHARE: f64 = 0.1;

/// Verdict of a check.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Verdict {
    /// The heard pitch stayed within the tolerance.
    Within,
    /// There are spans where it did not.
    Outside,
    /// There is no verdict.
    Unmeasured(Unmeasured),
}

/// Why there is no verdict.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Unmeasured {
    /// There was no sound where a pitch is due.
    Silent,
    /// There was sound, but no single pitch.
    NoPitch,
    /// There was more than one pitch at once.
    SeveralPitches,
    /// No pitch held still, to be the reference; or no note is expected anywhere.
    NoReference,
    /// The share of the sounding time that was measured is too small.
    Share(f64),
    /// What was measured is shorter than the shortest span that counts, in seconds.
    Short(f64),
}

impl fmt::Display for Unmeasured {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Silent => write!(f, "no sound where a pitch is due"),
            Self::NoPitch => write!(f, "no single pitch was found"),
            Self::SeveralPitches => write!(f, "more than one pitch at once"),
            Self::NoReference => write!(f, "there is no reference to compare with"),
            Self::Share(share) => {
                write!(f, "only {:.0} % of the sounding time has a single pitch", 100.0 * share)
            }
            Self::Short(seconds) => write!(f, "only {seconds:.2} s have a single pitch"),
        }
    }
}

/// Drift: the slope of a straight line through the heard pitch.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Drift {
    /// Cents per second.
    pub cents_per_s: f64,
    /// Its standard deviation.
    pub sd: f64,
}

/// Vibrato, on average where there is one.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Vibrato {
    /// Rate in Hz.
    pub rate_hz: f64,
    /// Extent as half of the whole range, in cents.
    pub extent_cents: f64,
    /// Share of the measured time that has it.
    pub share: f64,
}

/// Stability of the raw pitch over an averaging time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stability {
    /// Averaging time in seconds.
    pub averaging_s: f64,
    /// Overlapping Allan deviation in cents.
    pub deviation_cents: f64,
    /// Terms it is the mean of.
    pub terms: u64,
}

/// What a check comes to.
#[derive(Debug, Clone, PartialEq)]
pub struct Outcome {
    /// The verdict.
    pub verdict: Verdict,
    /// The reference in Hz, where it is one for the whole check.
    pub reference_hz: Option<f64>,
    /// The heard pitch farthest from the reference, with its sign, in cents; stretches too short to count aside.
    pub worst_cents: Option<f64>,
    /// Mean of the heard pitch above the reference, in cents.
    pub mean_cents: Option<f64>,
    /// Drift, when measured for long enough.
    pub drift: Option<Drift>,
    /// Vibrato, when there is one.
    pub vibrato: Option<Vibrato>,
    /// Lowest and highest reading, vibrato and all, above the reference, in cents.
    pub raw_cents: Option<(f64, f64)>,
    /// Time that was measured, in seconds.
    pub measured_s: f64,
    /// Share of the sounding time that was measured; `None` when nothing sounded.
    pub measured_share: Option<f64>,
    /// Where it was outside, in order, at most [`Outcome::SPANS_MAX`].
    pub spans: Vec<Span>,
    /// How many more spans there were.
    pub spans_left_out: u64,
    /// Stability over averaging times that double.
    pub stability: Vec<Stability>,
}

impl Outcome {
    /// Most spans that are listed.
    pub const SPANS_MAX: usize = 4096;
}

/// Sums over all that was heard.
#[derive(Debug)]
pub(super) struct Totals {
    hop_s: f64,
    hop: u64,
    min_span_s: f64,
    min_share: f64,
    count: f64,
    cents: f64,
    raw: Option<(f64, f64)>,
    slope: Slope,
    vibrato: VibratoSums,
    allan: Vec<OverlappingAllan>,
    last: Option<u64>,
}

#[derive(Debug, Default)]
struct VibratoSums {
    count: f64,
    rate: f64,
    extent: f64,
}

impl Totals {
    pub(super) fn new(settings: &CheckSettings) -> Self {
        Self {
            hop_s: settings.hop_s(),
            hop: settings.hop as u64,
            min_span_s: settings.min_span_s,
            min_share: settings.min_share,
            count: 0.0,
            cents: 0.0,
            raw: None,
            slope: Slope::new(),
            vibrato: VibratoSums::default(),
            allan: (0..ALLAN_OCTAVES).map(|octave| OverlappingAllan::new(1 << octave)).collect(),
            last: None,
        }
    }

    pub(super) fn push(&mut self, heard: &Heard, judged: &Judged) {
        self.count += 1.0;
        self.cents += heard.cents;
        let raw = heard.raw_cents;
        self.raw = Some(self.raw.map_or((raw, raw), |(low, high)| (low.min(raw), high.max(raw))));
        let vibrato = judged.point.cents - judged.without_vibrato;
        self.slope.push(judged.point.time_s, raw - vibrato);
        if let Some((rate, extent)) = judged.vibrato {
            self.vibrato.count += 1.0;
            self.vibrato.rate += rate;
            self.vibrato.extent += extent;
        }
        if self.last.is_some_and(|last| last + self.hop != heard.position) {
            self.end_piece();
        }
        self.last = Some(heard.position);
        self.allan.iter_mut().for_each(|allan| allan.push(raw));
    }

    /// Says that the pitch is interrupted.
    pub(super) fn end_piece(&mut self) {
        self.last = None;
        self.allan.iter_mut().for_each(OverlappingAllan::interrupt);
    }

    pub(super) fn outcome(
        &self,
        sounding: &Sounding,
        spans: &Spans,
        resolver: &Resolver,
    ) -> Outcome {
        let (sounds, measured) = sounding.counts();
        let share = (sounds > 0.0).then(|| measured / sounds);
        let some = self.count > 0.0;
        Outcome {
            verdict: self.verdict(sounding, spans),
            reference_hz: resolver.constant_hz(),
            worst_cents: spans.worst,
            mean_cents: some.then(|| self.cents / self.count),
            drift: self.slope.line().map(|(cents_per_s, sd)| Drift { cents_per_s, sd }),
            vibrato: self.vibrato(),
            raw_cents: self.raw,
            measured_s: self.count * self.hop_s,
            measured_share: share,
            spans: spans.found.clone(),
            spans_left_out: spans.left_out,
            stability: self.allan.iter().filter_map(|allan| self.stability(allan)).collect(),
        }
    }

    fn verdict(&self, sounding: &Sounding, spans: &Spans) -> Verdict {
        let (sounds, measured) = sounding.counts();
        let measured_s = self.count * self.hop_s;
        let why = if sounding.is_empty() {
            Unmeasured::NoReference
        } else if sounds == 0.0 {
            Unmeasured::Silent
        } else if measured == 0.0 && sounding.is_mostly_several() {
            Unmeasured::SeveralPitches
        } else if measured == 0.0 {
            Unmeasured::NoPitch
        } else if self.count == 0.0 {
            Unmeasured::NoReference
        } else if measured_s < self.min_span_s {
            Unmeasured::Short(measured_s)
        } else if measured < self.min_share * sounds {
            Unmeasured::Share(measured / sounds)
        } else if spans.found.is_empty() {
            return Verdict::Within;
        } else {
            return Verdict::Outside;
        };
        Verdict::Unmeasured(why)
    }

    fn vibrato(&self) -> Option<Vibrato> {
        let VibratoSums { count, rate, extent } = self.vibrato;
        let enough = count * self.hop_s >= VIBRATO_S && count >= VIBRATO_SHARE * self.count;
        enough.then(|| Vibrato {
            rate_hz: rate / count,
            extent_cents: extent / count,
            share: count / self.count,
        })
    }

    fn stability(&self, allan: &OverlappingAllan) -> Option<Stability> {
        Some(Stability {
            averaging_s: allan.m() as f64 * self.hop_s,
            deviation_cents: allan.deviation()?,
            terms: allan.terms(),
        })
    }
}
