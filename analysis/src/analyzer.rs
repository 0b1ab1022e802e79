//! The streaming engine: samples in, readings and notes out.

use crate::convert::{nearest_index, number};
use crate::fundamental::Candidate;
use crate::history::History;
use crate::instant::Evidence;
use crate::measure::assemble::Assembler;
use crate::measure::note::STRETCH_S;
use crate::note::Note;
use crate::onset::{ChangePoint, Direction};
use crate::reading::{Gap, GapReason, Partial, Pitch, Reading, State, Stretch};
use crate::refine::{Refiner, Tone};
use crate::segment::{Event, Segmenter, Step};
use crate::settings::{Settings, SettingsError};
use crate::stiff::{self, CENTS_PER_NEPER, Point};
use crate::track::{LOOK_AHEAD, Tracker};

/// Level below which nothing is searched, in dBFS: under the noise of dithered 16-bit silence.
const SILENCE_DBFS: f64 = -92.0;
/// Instants on either side that smooth a reading.
const NEIGHBOURS: usize = 4;
/// Instants kept: those being decided, those being smoothed, and the newest.
const KEPT: usize = LOOK_AHEAD + 2 * NEIGHBOURS + 2;

/// Where an [`Analyzer`] delivers. What is lent is only lent: copy what is to stay.
pub trait Sink {
    /// The next reading of the grid; readings come in order, later than their centre by a fixed look-ahead.
    fn reading(&mut self, _reading: &Reading) {}
    /// A note that has ended, after the readings within it.
    fn note(&mut self, _note: &Note) {}
    /// A gap that has ended.
    fn gap(&mut self, _gap: &Gap) {}
}

/// What is known of one instant.
#[derive(Debug)]
struct Instant {
    centre: u64,
    level_dbfs: f64,
    /// Fundamental and inharmonicity that the tones were refined for.
    model: (f64, f64),
    frame_s: f64,
    tones: Vec<Tone>,
    decided: Option<Candidate>,
    f0: f64,
    f0_sd_cents: f64,
    b: Option<(f64, f64)>,
}

/// The engine.
#[derive(Debug)]
pub struct Analyzer {
    settings: Settings,
    hop: usize,
    history: History,
    evidence: Evidence,
    refiner: Refiner,
    tracker: Tracker,
    instants: Vec<Instant>,
    points: Vec<Point>,
    /// Instants analysed, decided and delivered since the stream began.
    analysed: usize,
    decided: usize,
    delivered: usize,
    first_centre: u64,
    reading: Reading,
    missing: Option<Gap>,
    segmenter: Segmenter,
    change: ChangePoint,
    assembler: Assembler,
    /// Position of the note's onset, while one sounds.
    note_start: Option<u64>,
}

impl Analyzer {
    /// Builds an engine; all memory it will ever need is taken here.
    ///
    /// # Errors
    /// A setting outside its range.
    pub fn new(settings: &Settings) -> Result<Self, SettingsError> {
        settings.validate()?;
        let evidence = Evidence::new(settings);
        let hop = Evidence::hop(settings);
        let partials = settings.partials;
        let instant = || Instant {
            centre: 0,
            level_dbfs: f64::NEG_INFINITY,
            model: (0.0, 0.0),
            frame_s: 0.0,
            tones: Vec::with_capacity(partials),
            decided: None,
            f0: 0.0,
            f0_sd_cents: 0.0,
            b: None,
        };
        Ok(Self {
            hop,
            history: History::new(
                4 * evidence.reach()
                    + (KEPT + 20) * hop
                    + crate::convert::nearest_index(STRETCH_S * settings.sample_rate_hz),
            ),
            segmenter: Segmenter::default(),
            change: ChangePoint::new(settings.sample_rate_hz),
            assembler: Assembler::new(settings.sample_rate_hz, partials, hop),
            note_start: None,
            refiner: Refiner::new(partials),
            tracker: Tracker::new(),
            instants: (0..KEPT).map(|_| instant()).collect(),
            points: Vec::with_capacity(partials),
            analysed: 0,
            decided: 0,
            delivered: 0,
            first_centre: 0,
            reading: Reading { partials: Vec::with_capacity(partials), ..Reading::default() },
            missing: None,
            settings: settings.clone(),
            evidence,
        })
    }

    /// Samples between two readings.
    #[must_use]
    pub fn hop(&self) -> usize {
        self.hop
    }

    /// Takes in samples (full scale 1.0). Any cut of the same samples gives the same output.
    pub fn push(&mut self, samples: &[f32], sink: &mut impl Sink) {
        let mut rest = samples;
        while !rest.is_empty() {
            let good = rest.iter().take_while(|x| x.is_finite()).count();
            self.take(&rest[..good], sink);
            rest = &rest[good..];
            let bad = rest.iter().take_while(|x| !x.is_finite()).count();
            self.miss(bad as u64, GapReason::NonFinite, sink);
            rest = &rest[bad..];
        }
    }

    /// Says that `samples` samples were lost here: they become a [`Gap`].
    pub fn skip(&mut self, samples: u64, sink: &mut impl Sink) {
        self.miss(samples, GapReason::Lost, sink);
    }

    /// Ends the stream: delivers what is still to come. The next [`push`](Self::push) continues at the same position, as
    /// a new stream.
    pub fn finish(&mut self, sink: &mut impl Sink) {
        self.close_gap(sink);
        self.flush(sink);
        self.restart(self.history.end());
    }

    /// Forgets everything, the position included.
    pub fn reset(&mut self) {
        self.missing = None;
        self.restart(0);
    }

    fn restart(&mut self, position: u64) {
        self.history.restart(position);
        self.evidence.restart();
        self.tracker.restart();
        self.segmenter.restart();
        self.note_start = None;
        self.analysed = 0;
        self.decided = 0;
        self.delivered = 0;
        self.first_centre = position.next_multiple_of(self.hop as u64);
    }

    fn miss(&mut self, samples: u64, reason: GapReason, sink: &mut impl Sink) {
        if samples == 0 {
            return;
        }
        if let Some(gap) = self.missing.as_mut().filter(|g| g.reason == reason) {
            gap.end += samples;
            return;
        }
        self.close_gap(sink);
        self.flush(sink);
        let start = self.history.end();
        self.missing = Some(Gap { start, end: start + samples, reason });
    }

    fn close_gap(&mut self, sink: &mut impl Sink) {
        if let Some(gap) = self.missing.take() {
            sink.gap(&gap);
            self.restart(gap.end);
        }
    }

    fn take(&mut self, mut samples: &[f32], sink: &mut impl Sink) {
        if samples.is_empty() {
            return;
        }
        self.close_gap(sink);
        let reach = self.evidence.reach() as u64;
        while !samples.is_empty() {
            let due = self.centre(self.analysed) + reach;
            let room = crate::convert::index(due - self.history.end());
            let (now, later) = samples.split_at(samples.len().min(room));
            self.history.push(now);
            samples = later;
            if self.history.end() == due {
                self.analyse();
                if self.analysed > LOOK_AHEAD {
                    self.decide(LOOK_AHEAD);
                    if self.decided > NEIGHBOURS {
                        self.deliver(sink);
                    }
                }
            }
        }
    }

    fn flush(&mut self, sink: &mut impl Sink) {
        while self.centre(self.analysed) < self.history.end() {
            self.analyse();
            if self.analysed > LOOK_AHEAD {
                self.decide(LOOK_AHEAD);
                if self.decided > NEIGHBOURS {
                    self.deliver(sink);
                }
            }
        }
        while self.decided < self.analysed {
            self.decide(self.analysed - 1 - self.decided);
            if self.decided > NEIGHBOURS {
                self.deliver(sink);
            }
        }
        while self.delivered < self.decided {
            self.deliver(sink);
        }
        if let Some(event) = self.segmenter.finish() {
            self.note_event(event, sink);
        }
    }

    fn centre(&self, index: usize) -> u64 {
        self.first_centre + (index * self.hop) as u64
    }

    /// Analyses the next instant, and refines the partials of what looks like its pitch so far.
    fn analyse(&mut self) {
        let centre = self.centre(self.analysed);
        self.evidence.run(&self.history, centre, self.tracker.next());
        let level_dbfs = self.evidence.level_dbfs();
        if !(level_dbfs > SILENCE_DBFS) {
            self.tracker.next().clear();
        }
        self.tracker.push();
        let instant = &mut self.instants[self.analysed % KEPT];
        instant.centre = centre;
        instant.level_dbfs = level_dbfs;
        instant.tones.clear();
        instant.model = (0.0, 0.0);
        if let (Some(best), _) = self.tracker.decide(0) {
            instant.model = (best.hz, best.b);
            instant.frame_s =
                self.evidence.refine(instant.model, self.settings.partials, &mut self.refiner);
            instant.tones.extend_from_slice(&self.refiner.tones);
        }
        self.analysed += 1;
    }

    /// Decides the pitch of the next instant, `age` instants old.
    fn decide(&mut self, age: usize) {
        let (chosen, _) = self.tracker.decide(age);
        let instant = &mut self.instants[self.decided % KEPT];
        instant.decided = chosen;
        if let Some(chosen) = chosen {
            if chosen.hz.total_cmp(&instant.model.0).is_ne() {
                self.evidence.revisit(&self.history, instant.centre, chosen.hz);
                instant.model = (chosen.hz, chosen.b);
                instant.frame_s =
                    self.evidence.refine(instant.model, self.settings.partials, &mut self.refiner);
                instant.tones.clear();
                instant.tones.extend_from_slice(&self.refiner.tones);
            }
            self.points.clear();
            self.points.extend(instant.tones.iter().map(|t| Point {
                n: t.n as f64,
                hz: t.hz,
                sd_hz: t.sd_hz,
            }));
            match stiff::fit(&self.points, None) {
                Some(fit) => {
                    instant.f0 = fit.f0;
                    instant.f0_sd_cents = fit.f0_sd_cents;
                    instant.b = Some((fit.b, fit.b_sd)).filter(|b| b.1.is_finite());
                }
                None => instant.decided = None,
            }
        }
        self.decided += 1;
    }

    /// Delivers the next reading.
    fn deliver(&mut self, sink: &mut impl Sink) {
        let instant = &self.instants[self.delivered % KEPT];
        let reading = &mut self.reading;
        reading.centre = instant.centre;
        reading.level_dbfs = instant.level_dbfs;
        reading.partials.clear();
        reading.strays.clear();
        reading.pitch = None;
        reading.stretch = None;
        reading.state =
            if instant.level_dbfs > SILENCE_DBFS { State::Unpitched } else { State::Silent };
        if let Some(chosen) = instant.decided {
            reading.state = State::Steady;
            reading.pitch = Some(Pitch {
                f0_hz: instant.f0,
                f0_sd_cents: instant.f0_sd_cents,
                confidence: chosen.score,
            });
            reading.stretch = instant.b.map(|(b, b_sd)| Stretch { b, b_sd });
            for tone in &instant.tones {
                let harmonic = tone.n as f64 * instant.f0;
                reading.partials.push(Partial {
                    number: number(tone.n),
                    frequency_hz: tone.hz,
                    frequency_sd_hz: tone.sd_hz,
                    cents_from_harmonic: CENTS_PER_NEPER * (tone.hz / harmonic).ln(),
                    cents_sd: CENTS_PER_NEPER * tone.sd_hz / tone.hz,
                    level_dbfs: 10.0 * tone.amplitude.norm_sqr().log10(),
                    level_sd_db: 8.686 * (0.5 / tone.snr).sqrt(),
                    phase_rad: tone.amplitude.arg(),
                    snr_db: 10.0 * tone.snr.log10(),
                });
            }
        }
        sink.reading(reading);
        self.follow_note(sink);
        self.delivered += 1;
    }

    /// Takes the instant being delivered into the notes.
    fn follow_note(&mut self, sink: &mut impl Sink) {
        let instant = &self.instants[self.delivered % KEPT];
        let step = Step {
            centre: instant.centre,
            f0: self.reading.pitch.map(|p| p.f0_hz),
            level_dbfs: instant.level_dbfs,
        };
        let (ended, begun) = self.segmenter.step(step);
        for event in [ended, begun].into_iter().flatten() {
            self.note_event(event, sink);
        }
        if self.note_start.is_some() && self.segmenter.holds(step.centre) {
            let instant = &self.instants[self.delivered % KEPT];
            let pitch = (instant.f0, instant.f0_sd_cents);
            self.assembler.add(&self.history, instant.centre, pitch, &instant.tones);
        }
    }

    fn note_event(&mut self, event: Event, sink: &mut impl Sink) {
        let hop = self.hop as u64;
        let f0 = self.instants[self.delivered % KEPT].f0.max(self.settings.lowest_hz);
        let period = nearest_index(self.settings.sample_rate_hz / f0);
        match event {
            Event::Begin { first } => {
                let span = (first.saturating_sub(5 * hop), first + 5 * hop);
                let found = self.change.find(&self.history, span, period, Direction::Rise);
                let stream = self.history.start();
                let start = found.unwrap_or(first.saturating_sub(hop / 2).max(stream));
                self.note_start = Some(start);
                self.assembler.begin(start);
            }
            Event::End { last } => {
                let Some(start) = self.note_start.take() else { return };
                let span = (last.saturating_sub(5 * hop), last + 5 * hop);
                let found = self.change.find(&self.history, span, period, Direction::Fall);
                let end = found.unwrap_or(last + hop / 2).min(self.history.end());
                let end = if last + hop >= self.history.end() { self.history.end() } else { end };
                if end > start {
                    if let Some(note) = self.assembler.end(&self.history, end) {
                        sink.note(note);
                    }
                }
            }
        }
    }
}
