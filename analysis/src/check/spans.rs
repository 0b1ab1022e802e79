//! Where the heard pitch is outside its tolerance: stretches that last, and exceed it by more than noise explains.

use super::settings::CheckSettings;
use super::{CheckSink, Heard};
use crate::convert::nearest_position;

/// Deviations by which the pitch must be back inside before a span ends.
const BACK_SDS: f64 = 1.0;
/// Deviations of its mean by which a span must exceed the tolerance.
const SURE_SDS: f64 = 2.0;
/// Time over which one heard pitch is averaged, in seconds: spans longer than this are surer than one instant.
const AVERAGED_S: f64 = 0.6;

/// A stretch of time over which the heard pitch was outside the tolerance, on one side of it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Span {
    /// Sample position where it begins.
    pub start: u64,
    /// Sample position where it ends.
    pub end: u64,
    /// Largest deviation, with its sign, in cents.
    pub worst_cents: f64,
    /// Mean deviation, in cents.
    pub mean_cents: f64,
}

/// Finds the spans in heard pitches.
#[derive(Debug)]
pub(super) struct Spans {
    tolerance: f64,
    /// Samples.
    min_span: u64,
    half_hop: u64,
    averaged: f64,
    last: Option<(u64, f64)>,
    open: Option<Open>,
    pub(super) found: Vec<Span>,
    pub(super) left_out: u64,
    /// Deviation farthest off among those that count, in cents.
    pub(super) worst: Option<f64>,
}

/// A stretch that may become a span.
#[derive(Debug, Clone, Copy)]
struct Open {
    sign: f64,
    start: u64,
    end: u64,
    worst: f64,
    sums: Sums,
    /// Since the last reading that was outside: they count once another one is.
    doubtful: Sums,
    established: Option<u64>,
}

#[derive(Debug, Clone, Copy, Default)]
struct Sums {
    count: f64,
    cents: f64,
    sd: f64,
}

impl Sums {
    fn push(&mut self, heard: &Heard) {
        self.count += 1.0;
        self.cents += heard.cents;
        self.sd += heard.sd_cents;
    }

    fn add(&mut self, other: Self) {
        self.count += other.count;
        self.cents += other.cents;
        self.sd += other.sd;
    }
}

impl Spans {
    pub(super) fn new(settings: &CheckSettings) -> Self {
        Self {
            tolerance: settings.tolerance_cents,
            min_span: nearest_position(settings.min_span_s * settings.sample_rate_hz),
            half_hop: settings.hop as u64 / 2,
            averaged: AVERAGED_S * settings.sample_rate_hz,
            last: None,
            open: None,
            found: Vec::new(),
            left_out: 0,
            worst: None,
        }
    }

    /// Where the span now running was established.
    pub(super) fn established(&self) -> Option<u64> {
        self.open.and_then(|open| open.established)
    }

    /// Takes in the next heard pitch.
    pub(super) fn push(&mut self, heard: &Heard, sink: &mut impl CheckSink) {
        let size = heard.cents.abs();
        let outside = size > self.tolerance;
        let sign = heard.cents.signum();
        let over = self.open.is_some_and(|open| {
            let other_side = outside && sign * open.sign < 0.0;
            let back = self.tolerance - heard.cents * open.sign > BACK_SDS * heard.sd_cents;
            other_side || back
        });
        if over {
            let (start, end) = (self.crossing(heard), heard.position);
            self.close(start.min(end), sink);
        }
        if outside {
            let start = self.crossing(heard);
            let edge = heard.position + self.half_hop;
            let open = self.open.get_or_insert(Open {
                sign,
                start,
                end: edge,
                worst: heard.cents,
                sums: Sums::default(),
                doubtful: Sums::default(),
                established: None,
            });
            open.end = edge;
            if size > open.worst.abs() {
                open.worst = heard.cents;
            }
            open.sums.add(std::mem::take(&mut open.doubtful));
            open.sums.push(heard);
            if open.established.is_none()
                && open.counts(self.tolerance, self.min_span, self.averaged)
            {
                open.established = Some(heard.position);
                sink.established(heard.position);
            }
        } else if let Some(open) = &mut self.open {
            open.doubtful.push(heard);
        } else {
            self.farthest(heard.cents);
        }
        self.last = Some((heard.position, heard.cents));
    }

    /// Ends what runs: the sound was interrupted.
    pub(super) fn interrupt(&mut self, sink: &mut impl CheckSink) {
        self.close(u64::MAX, sink);
        self.last = None;
    }

    /// Where the pitch crossed the tolerance on its way to this reading, by a straight line from the last.
    fn crossing(&self, heard: &Heard) -> u64 {
        let Some((position, cents)) = self.last else {
            return heard.position.saturating_sub(self.half_hop);
        };
        let way = heard.cents - cents;
        let limit = self.tolerance.copysign(if cents.abs() > self.tolerance { cents } else { way });
        let share = if way == 0.0 { 0.5 } else { ((limit - cents) / way).clamp(0.0, 1.0) };
        position + nearest_position(share * (heard.position - position) as f64)
    }

    fn close(&mut self, at: u64, sink: &mut impl CheckSink) {
        let Some(open) = self.open.take() else { return };
        let open = Open { end: open.end.min(at).max(open.start), ..open };
        if open.established.is_some() {
            sink.over(open.end);
        }
        if !open.counts(self.tolerance, self.min_span, self.averaged) {
            return;
        }
        self.farthest(open.worst);
        let span = Span {
            start: open.start,
            end: open.end,
            worst_cents: open.worst,
            mean_cents: open.sums.cents / open.sums.count,
        };
        sink.span(&span);
        if self.found.len() < super::Outcome::SPANS_MAX {
            self.found.push(span);
        } else {
            self.left_out += 1;
        }
    }

    fn farthest(&mut self, cents: f64) {
        if self.worst.is_none_or(|worst| cents.abs() > worst.abs()) {
            self.worst = Some(cents);
        }
    }
}

impl Open {
    /// Whether it is long enough, and by its mean surely outside.
    fn counts(&self, tolerance: f64, min_span: u64, averaged: f64) -> bool {
        let length = self.end - self.start;
        let excess = (self.sums.cents / self.sums.count).abs() - tolerance;
        let independent = (length as f64 / averaged).max(1.0);
        let sd = self.sums.sd / self.sums.count / independent.sqrt();
        length >= min_span && excess > SURE_SDS * sd
    }
}
