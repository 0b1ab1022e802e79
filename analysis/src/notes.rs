//! From settled instants to notes: segmentation, exact onset and end, measurement.

use crate::analyzer::Sink;
use crate::convert::nearest_index;
use crate::history::History;
use crate::measure::assemble::Assembler;
use crate::onset::{ChangePoint, Direction};
use crate::refine::Tone;
use crate::segment::{Event, Segmenter, Step};
use crate::settings::Settings;
use crate::spectrum::TransformRuns;

/// Instants around the first and the last of a note among which its onset and end are searched.
const SEARCH_INSTANTS: u64 = 5;

/// Follows the stream from note to note.
#[derive(Debug)]
pub(crate) struct Notes {
    hop: u64,
    sample_rate_hz: f64,
    segmenter: Segmenter,
    change: ChangePoint,
    assembler: Assembler,
    /// Position of the note's onset, while one sounds.
    start: Option<u64>,
    f0: f64,
}

impl Notes {
    /// How often each transform has run.
    pub(crate) fn transforms(&self) -> [TransformRuns; 2] {
        self.assembler.transforms()
    }

    /// Takes all memory needed.
    pub(crate) fn new(settings: &Settings, hop: usize) -> Self {
        let rate = settings.sample_rate_hz;
        Self {
            hop: hop as u64,
            sample_rate_hz: rate,
            segmenter: Segmenter::default(),
            change: ChangePoint::new(rate),
            assembler: Assembler::new(rate, settings.partials, hop),
            start: None,
            f0: settings.highest_hz,
        }
    }

    /// Forgets the note under way.
    pub(crate) fn restart(&mut self) {
        self.segmenter.restart();
        self.start = None;
    }

    /// Takes in a settled instant; `pitch` is the fundamental and its deviation in cents.
    pub(crate) fn step(
        &mut self,
        history: &History,
        step: Step,
        pitch_sd_cents: f64,
        tones: &[Tone],
        sink: &mut impl Sink,
    ) {
        let (ended, begun) = self.segmenter.step(step);
        if let Some(event) = ended {
            self.event(history, event, sink);
        }
        if let Some(f0) = step.f0 {
            self.f0 = f0;
        }
        if let Some(event) = begun {
            self.event(history, event, sink);
        }
        if let (Some(f0), Some(_)) = (step.f0, self.start)
            && self.segmenter.holds(step.centre)
        {
            self.assembler.add(history, step.centre, (f0, pitch_sd_cents), tones);
        }
    }

    /// Ends the stream.
    pub(crate) fn finish(&mut self, history: &History, sink: &mut impl Sink) {
        if let Some(event) = self.segmenter.finish() {
            self.event(history, event, sink);
        }
    }

    fn event(&mut self, history: &History, event: Event, sink: &mut impl Sink) {
        let reach = SEARCH_INSTANTS * self.hop;
        let period = nearest_index(self.sample_rate_hz / self.f0);
        let around = |at: u64| (at.saturating_sub(reach), at + reach);
        match event {
            Event::Begin { first } => {
                let found = self.change.find(history, around(first), period, Direction::Rise);
                let early = first.saturating_sub(self.hop / 2).max(history.start());
                let start = found.unwrap_or(early);
                self.start = Some(start);
                self.assembler.begin(start);
            }
            Event::End { last } => {
                let Some(start) = self.start.take() else { return };
                let found = self.change.find(history, around(last), period, Direction::Fall);
                let stream_end = history.end();
                let end = if last + self.hop >= stream_end {
                    stream_end
                } else {
                    found.unwrap_or(last + self.hop / 2).min(stream_end)
                };
                if end > start
                    && let Some(note) = self.assembler.end(history, end)
                {
                    sink.note(note);
                }
            }
        }
    }
}
