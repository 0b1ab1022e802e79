//! Drift checks: the parameter Check, switched on and off by hand or by automation, marks what is checked, and each
//! stretch ends in a result.
//!
//! [`Checks`] is the worker's side. The engine is cut where a check begins and ends, so that a result rests on the samples
//! between the two and nothing else: neither block sizes, nor speed, nor an open editor change it. A jump or a stop of the
//! transport ends one check and begins the next. What a check is set to when it begins holds for all of it.

mod curve;
#[cfg(test)]
mod fixtures;
mod places;
mod report;
mod result;
mod results;
mod stored;

use std::collections::VecDeque;

use plumbtone_analysis::check::{
    Check, CheckSettings, CheckSink, Heard, Reference, Trace, Verdict,
};
use plumbtone_analysis::tuning::Tuning;
use plumbtone_analysis::{Gap, Reading, VERSION};

pub use self::curve::Curve;
pub(crate) use self::report::CAUTION;
pub use self::result::{CheckResult, Extent, InTrail, OutsideSpan, VerdictWord};
pub use self::results::{Reports, Results, RunningCheck, Snapshot, Stored};
pub(crate) use self::stored::read;

use self::curve::COLUMNS_MAX;
use self::places::Places;
use crate::controls::Controls;
use crate::convert::decimal;
use crate::parameters::Reference as Choice;
use crate::session::Anchor;
use crate::turns::{Teller, turns};

/// Readings between two words on a running check.
const READINGS_A_WORD: u64 = 25;

/// The checks of one instance.
#[derive(Debug)]
pub(crate) struct Checks {
    results: Results,
    running: Option<Running>,
    /// The newest word of the transport; what is told while a check runs is the check's too.
    anchor: Option<Anchor>,
    /// Frequency of the key that the note input holds.
    key_hz: Option<f64>,
    /// Results of this stream.
    made: Vec<u64>,
    /// Where it turns outside and back is told here.
    turns: Teller,
    /// Samples after its centre that a reading may depend on.
    look_ahead: u64,
}

/// What a check is set to.
#[derive(Debug, Clone)]
struct Setup {
    settings: CheckSettings,
    tuning: Tuning,
    reference: Reference,
    name: String,
    kind: &'static str,
}

/// A check that is on.
#[derive(Debug)]
struct Running {
    setup: Setup,
    check: Check,
    start: u64,
    places: Places,
    /// Keys held from positions on that no reading has come to yet, and the one before.
    keys: VecDeque<(u64, Option<f64>)>,
    readings: u64,
    /// The newest reading, and where it lies in the trail; and the first one.
    last: Option<(u64, u64)>,
    first: Option<(u64, u64)>,
    lost_samples: u64,
    trace: Trace,
}

/// Where a check that is on delivers.
struct Ends<'a> {
    turns: &'a mut Teller,
    trace: &'a mut Trace,
}

impl CheckSink for Ends<'_> {
    fn heard(&mut self, heard: &Heard) {
        self.trace.push(heard);
    }

    fn established(&mut self, position: u64) {
        self.turns.tell(position, true);
    }

    fn over(&mut self, position: u64) {
        self.turns.tell(position, false);
    }
}

impl Checks {
    pub(crate) fn new(results: Results) -> Self {
        // Nobody listens before there is a stream.
        let (turns, _) = turns(0.0);
        Self {
            results,
            running: None,
            anchor: None,
            key_hz: None,
            made: Vec::new(),
            turns,
            look_ahead: 0,
        }
    }

    /// Tells where a check turns outside and back to somebody else from here on.
    pub(crate) fn tell(&mut self, turns: Teller) {
        self.turns = turns;
    }

    /// An engine begins, whose readings depend on so many samples after their centre.
    pub(crate) fn look_ahead(&mut self, samples: u64) {
        self.look_ahead = samples;
    }

    /// All is told that comes of so many samples and marks.
    pub(crate) fn publish(&mut self, samples: u64, marks: u64) {
        self.turns.publish(samples, marks);
    }

    /// A new stream begins.
    pub(crate) fn start(&mut self, stream: u64) {
        self.turns.start(stream);
        self.anchor = None;
        self.key_hz = None;
        self.made.clear();
    }

    /// Whether a check is on.
    pub(crate) fn is_on(&self) -> bool {
        self.running.is_some()
    }

    /// Whether what the transport tells next ends the check that is on.
    pub(crate) fn is_ended_by(&self, next: &Anchor) -> bool {
        self.is_on()
            && self.anchor.is_some_and(|last| last.transport.playing != next.transport.playing)
    }

    /// Begins a check at a position of the stream, whose engine gives a reading every `hop` samples.
    pub(crate) fn begin(
        &mut self,
        start: u64,
        controls: &Controls,
        sample_rate_hz: f64,
        hop: usize,
    ) {
        let setup = Setup::new(controls, sample_rate_hz, hop);
        let Ok(check) = Check::new(&setup.settings, setup.reference.clone()) else { return };
        self.running = Some(Running {
            setup,
            check,
            start,
            places: Places::new(self.anchor, sample_rate_hz),
            keys: VecDeque::from([(start, self.key_hz)]),
            readings: 0,
            last: None,
            first: None,
            lost_samples: 0,
            trace: Trace::new(COLUMNS_MAX),
        });
    }

    /// Ends the check that is on, if one is: its readings have come.
    pub(crate) fn end(&mut self, end: u64) {
        let Some(mut running) = self.running.take() else { return };
        self.turns.know(end);
        let mut ends = Ends { turns: &mut self.turns, trace: &mut running.trace };
        running.check.finish(&mut ends);
        if let Some(result) = running.result(end.max(running.start)) {
            self.made.push(self.results.add(result));
        }
        self.results.run(None);
    }

    /// The stream has ended; `bounce` when the host rendered it offline.
    pub(crate) fn close(&mut self, bounce: bool) {
        let made = core::mem::take(&mut self.made);
        if bounce {
            self.results.bounced(&made);
        }
    }

    pub(crate) fn anchor(&mut self, anchor: Anchor) {
        self.anchor = Some(anchor);
        if let Some(running) = &mut self.running {
            running.places.add(anchor);
        }
    }

    /// The note input holds a key of this frequency from a position on, or none.
    pub(crate) fn key(&mut self, at: u64, hz: Option<f64>) {
        self.key_hz = hz;
        if let Some(running) = &mut self.running {
            running.keys.push_back((at, hz));
        }
    }

    pub(crate) fn gap(&mut self, gap: &Gap) {
        if let Some(running) = &mut self.running {
            self.turns.know(gap.end);
            running.gap(gap, &mut self.turns);
        }
    }

    /// Takes a reading, and its index in the trail. `shown` when somebody looks on.
    pub(crate) fn reading(&mut self, reading: &Reading, in_trail: u64, shown: bool) {
        let Some(running) = &mut self.running else { return };
        self.turns.know(reading.centre + self.look_ahead);
        running.reading(reading, in_trail, &mut self.turns);
        if shown && running.readings % READINGS_A_WORD == 1 {
            self.results.run(Some(running.word()));
        }
    }
}

impl Setup {
    fn new(controls: &Controls, sample_rate_hz: f64, hop: usize) -> Self {
        let tuning = controls.tuning();
        let hz = decimal(controls.reference_hz);
        let (reference, kind, name) = match controls.reference {
            Choice::NearestNote => {
                (Reference::Nearest(tuning), "nearest", "nearest note".to_owned())
            }
            Choice::PlayedNotes => (Reference::Given, "played", "played notes".to_owned()),
            Choice::FirstPitch => (Reference::First, "first", "first steady pitch".to_owned()),
            Choice::Pitch => (Reference::Frequency(hz), "frequency", format!("{hz} Hz")),
        };
        let settings = CheckSettings {
            tolerance_cents: decimal(controls.tolerance_cents),
            ..CheckSettings::new(sample_rate_hz, hop)
        };
        Self { settings, tuning, reference, name, kind }
    }
}

impl Running {
    fn gap(&mut self, gap: &Gap, turns: &mut Teller) {
        // An engine that begins late counts what was before it as missing too.
        let known = self.last.map_or(self.start, |(centre, _)| centre);
        let start = gap.start.max(self.start).max(known);
        if start < gap.end {
            self.lost_samples += gap.end - start;
            let mut ends = Ends { turns, trace: &mut self.trace };
            self.check.gap(&Gap { start, ..*gap }, &mut ends);
        }
    }

    fn reading(&mut self, reading: &Reading, in_trail: u64, turns: &mut Teller) {
        while self.keys.get(1).is_some_and(|&(at, _)| at <= reading.centre) {
            self.keys.pop_front();
        }
        let played_hz = self.keys.front().and_then(|&(_, hz)| hz);
        let mut ends = Ends { turns, trace: &mut self.trace };
        self.check.reading_against(reading, played_hz, &mut ends);
        self.readings += 1;
        let place = (reading.centre, in_trail);
        self.first.get_or_insert(place);
        self.last = Some(place);
    }

    fn word(&self) -> RunningCheck {
        let outcome = self.check.outcome();
        RunningCheck {
            verdict: match outcome.verdict {
                Verdict::Within => VerdictWord::Within,
                Verdict::Outside => VerdictWord::Outside,
                Verdict::Unmeasured(_) => VerdictWord::Unmeasured,
            },
            worst_cents: outcome.worst_cents,
            tolerance_cents: self.setup.settings.tolerance_cents,
            reference: self.setup.name.clone(),
            from: self.first.map_or(0.0, |(_, index)| index as f64),
        }
    }

    /// The heard pitch over all of it.
    fn curve(&self, end: u64) -> Option<Curve> {
        let bars = self.places.bars(self.start, end);
        Curve::of(&self.trace, bars, |at| self.places.extent(at, at).start_s)
    }

    /// What it comes to; nothing when there was nothing to check: no reading, or silence while the transport stood.
    fn result(&self, end: u64) -> Option<CheckResult> {
        let (first, last) = self.first.zip(self.last)?;
        let outcome = self.check.outcome();
        let Setup { settings, tuning, .. } = &self.setup;
        let in_session = self.places.in_session(self.start);
        if !in_session && outcome.measured_share.is_none() {
            return None;
        }
        let mut result = CheckResult {
            number: 0,
            extent: self.places.extent(self.start, end),
            in_session,
            verdict: VerdictWord::Unmeasured,
            reason: None,
            reference: self.setup.name.clone(),
            reference_kind: self.setup.kind.to_owned(),
            reference_hz: None,
            tolerance_cents: settings.tolerance_cents,
            worst_cents: None,
            mean_cents: None,
            drift_cents_per_s: None,
            drift_sd: None,
            drift_cents_per_min: None,
            drift_per_min_sd: None,
            vibrato_hz: None,
            vibrato_extent_cents: None,
            vibrato_share: None,
            raw_lowest_cents: None,
            raw_highest_cents: None,
            measured_s: 0.0,
            measured_share: None,
            outside_s: 0.0,
            spans: Vec::new(),
            spans_left_out: 0,
            lost_samples: self.lost_samples,
            sample_rate_hz: settings.sample_rate_hz,
            concert_pitch_hz: tuning.concert_pitch_hz(),
            temperament: tuning.temperament().to_string(),
            engine_version: VERSION.to_owned(),
            comment: String::new(),
            curve: self.curve(end),
            in_trail: Some(InTrail {
                start: first.1 as f64 - (first.0 - self.start) as f64 / settings.hop as f64,
                end: last.1 as f64,
                readings_per_s: settings.sample_rate_hz / settings.hop as f64,
            }),
        };
        result.conclude(&outcome, |from, to| self.places.extent(from, to));
        Some(result)
    }
}
