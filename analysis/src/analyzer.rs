//! The streaming engine: samples in, readings and notes out.

use crate::average::Averager;
use crate::convert::{index, nearest_index};
use crate::fundamental::{CANDIDATES, Candidate};
use crate::history::History;
use crate::instant::Evidence;
use crate::measure::note::STRETCH_S;
use crate::note::Note;
use crate::notes::Notes;
use crate::reading::{Gap, GapReason, Pitch, Reading, State, Stretch};
use crate::refine::Refiner;
use crate::segment::Step;
use crate::settings::{Settings, SettingsError};
use crate::settle::{self, Instant, NEIGHBOURS};
use crate::spectrum::TransformRuns;
use crate::stiff::{self, CENTS_PER_NEPER, Point};
use crate::strays::peaks::STRAYS_MAX;
use crate::track::{LOOK_AHEAD, Tracker};

/// Level below which nothing is searched, in dBFS: under the noise of dithered 16-bit silence.
const SILENCE_DBFS: f64 = -92.0;
/// Instants kept: those being decided, and those being settled with their neighbours.
const KEPT: usize = LOOK_AHEAD + 2 * NEIGHBOURS + 2;
/// Distance of the partials' fit from the pitch decided for, in cents, that says that they were not its partials: a pitch that
/// swings faster than the frame can follow leaves lines beside its own.
const ASTRAY_CENTS: f64 = 100.0;
/// Score of a candidate in the newest samples from which it is shown before anything is decided.
const LIVE_SCORE: f64 = 0.45;

/// Where an [`Analyzer`] delivers. What is lent is only lent: copy what is to stay.
pub trait Sink {
    /// Whether provisional readings are wanted; asked once per reading. They cost about as much as the readings.
    fn wants_live(&self) -> bool {
        false
    }

    /// A provisional reading of the newest samples, for the eye: quicker than a [`reading`](Self::reading) (whose neighbours
    /// must be known), and not as sure. Its partials are not averaged.
    fn live(&mut self, _reading: &Reading) {}

    /// The next reading of the grid; readings come in order, later than their centre by a fixed look-ahead.
    fn reading(&mut self, _reading: &Reading) {}

    /// A note that has ended, after the readings within it.
    fn note(&mut self, _note: &Note) {}

    /// A gap that has ended.
    fn gap(&mut self, _gap: &Gap) {}
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
    averager: Averager,
    notes: Notes,
    /// Looks at the newest samples, and instants analysed, decided and delivered since the stream began.
    looked: usize,
    analysed: usize,
    decided: usize,
    delivered: usize,
    first_centre: u64,
    reading: Reading,
    live: Vec<Candidate>,
    missing: Option<Gap>,
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
        let hop_s = hop as f64 / settings.sample_rate_hz;
        let stretch = nearest_index(STRETCH_S * settings.sample_rate_hz);
        Ok(Self {
            hop,
            history: History::new(4 * evidence.reach() + (KEPT + 20) * hop + stretch),
            evidence,
            refiner: Refiner::new(partials),
            tracker: Tracker::new(),
            instants: (0..KEPT).map(|_| Instant::new(partials)).collect(),
            points: Vec::with_capacity(partials),
            averager: Averager::new(partials, hop_s, settings.integration_s),
            notes: Notes::new(settings, hop),
            looked: 0,
            analysed: 0,
            decided: 0,
            delivered: 0,
            first_centre: 0,
            reading: Reading {
                partials: Vec::with_capacity(partials),
                strays: Vec::with_capacity(STRAYS_MAX),
                ..Reading::default()
            },
            live: Vec::with_capacity(CANDIDATES + 1),
            missing: None,
            settings: settings.clone(),
        })
    }

    /// Samples between two readings.
    #[must_use]
    pub fn hop(&self) -> usize {
        self.hop
    }

    /// Samples after a reading's centre that it may depend on, at most.
    #[must_use]
    pub fn look_ahead(&self) -> usize {
        (LOOK_AHEAD + NEIGHBOURS) * self.hop + 2 * self.evidence.reach()
    }

    /// How often each of the engine's transforms has run since it was built, for benches: what it takes at least.
    pub fn transforms(&self) -> impl Iterator<Item = TransformRuns> {
        self.evidence.transforms().chain(self.notes.transforms())
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
        self.averager.restart();
        self.notes.restart();
        self.looked = 0;
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
        let start = self.missing.map_or(self.history.end(), |gap| gap.end);
        self.close_gap(sink);
        self.flush(sink);
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
        while !samples.is_empty() {
            let next = self.due().min(self.live_due());
            let room = index(next - self.history.end());
            let (now, later) = samples.split_at(samples.len().min(room));
            self.history.push(now);
            samples = later;
            while self.history.end() == self.due() {
                self.advance(sink);
            }
            if self.history.end() == self.live_due() {
                self.looked += 1;
                if sink.wants_live() {
                    self.look_at_newest(sink);
                }
            }
        }
    }

    /// Where the stream must have come to before the next instant is analysed. The first ones wait until the longest frame
    /// can be filled.
    fn due(&self) -> u64 {
        let reach = self.evidence.reach() as u64;
        (self.centre(self.analysed) + reach).max(self.history.start() + 2 * reach)
    }

    /// The same for the next look at the newest samples.
    fn live_due(&self) -> u64 {
        self.centre(self.looked) + self.evidence.reach() as u64
    }

    /// Analyses the next instant and passes on what it completes.
    fn advance(&mut self, sink: &mut impl Sink) {
        self.analyse();
        if self.analysed > LOOK_AHEAD {
            self.decide(LOOK_AHEAD);
        }
        if self.decided > self.delivered + NEIGHBOURS {
            self.deliver(sink);
        }
    }

    fn flush(&mut self, sink: &mut impl Sink) {
        while self.centre(self.analysed) < self.history.end() {
            self.advance(sink);
        }
        while self.decided < self.analysed {
            self.decide(self.analysed - 1 - self.decided);
            if self.decided > self.delivered + NEIGHBOURS {
                self.deliver(sink);
            }
        }
        while self.delivered < self.decided {
            self.deliver(sink);
        }
        self.notes.finish(&self.history, sink);
    }

    fn centre(&self, index: usize) -> u64 {
        self.first_centre + (index * self.hop) as u64
    }

    /// Analyses the next instant, and refines the partials of what looks like its pitch so far.
    fn analyse(&mut self) {
        let centre = self.centre(self.analysed);
        let quiet = self.history.loud_until() + self.evidence.reach() as u64 <= centre;
        let (level_dbfs, noise_dbfs) = if quiet {
            // Nothing in the longest frame is above the silence threshold, so nothing is transformed.
            self.evidence.restart();
            (f64::NEG_INFINITY, f64::NEG_INFINITY)
        } else {
            self.evidence.run(&self.history, centre, self.tracker.next());
            (self.evidence.level_dbfs(), self.evidence.noise_dbfs())
        };
        if !(level_dbfs > SILENCE_DBFS) {
            self.tracker.next().clear();
        }
        self.tracker.push();
        let instant = &mut self.instants[self.analysed % KEPT];
        instant.centre = centre;
        instant.level_dbfs = level_dbfs;
        instant.calm_dbfs = level_dbfs;
        instant.noise_dbfs = noise_dbfs;
        instant.tones.clear();
        instant.model = (0.0, 0.0);
        instant.second = 0.0;
        instant.strays.clear();
        if let (Some(best), _) = self.tracker.decide(0) {
            instant.second = self.evidence.second_voice(&best);
            instant.calm_dbfs = self.evidence.calm_level_dbfs(best.hz);
            self.evidence.strays((best.hz, best.b), &mut instant.strays);
            Self::refine(
                &mut self.evidence,
                &self.history,
                &mut self.refiner,
                &self.settings,
                instant,
                &best,
            );
        }
        self.analysed += 1;
    }

    fn refine(
        evidence: &mut Evidence,
        history: &History,
        refiner: &mut Refiner,
        settings: &Settings,
        instant: &mut Instant,
        candidate: &Candidate,
    ) {
        instant.model = (candidate.hz, candidate.b);
        instant.frame_s =
            evidence.refine(history, instant.centre, instant.model, settings.partials, refiner);
        instant.tones.clear();
        instant.tones.extend_from_slice(&refiner.tones);
    }

    /// Decides the pitch of the next instant, `age` instants old.
    fn decide(&mut self, age: usize) {
        let (chosen, candidates) = self.tracker.decide(age);
        let instant = &mut self.instants[self.decided % KEPT];
        instant.decided = chosen;
        if let Some(chosen) = chosen {
            let others = candidates.iter().filter(|c| c.hz.total_cmp(&chosen.hz).is_ne());
            let next = others.map(|c| c.cost).fold(f64::INFINITY, f64::min);
            instant.advantage = next - chosen.cost;
            if chosen.hz.total_cmp(&instant.model.0).is_ne() {
                instant.strays.clear();
                Self::refine(
                    &mut self.evidence,
                    &self.history,
                    &mut self.refiner,
                    &self.settings,
                    instant,
                    &chosen,
                );
            }
            self.points.clear();
            self.points.extend(instant.tones.iter().map(Point::from));
            let near = |f0: f64| CENTS_PER_NEPER * (f0 / chosen.hz).ln().abs() < ASTRAY_CENTS;
            match stiff::fit(&self.points).filter(|fit| near(fit.f0)) {
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

    /// Delivers the next reading and takes it into the notes.
    fn deliver(&mut self, sink: &mut impl Sink) {
        let hop_s = self.hop as f64 / self.settings.sample_rate_hz;
        let instant = &self.instants[self.delivered % KEPT];
        let around = |k: isize| {
            let at = self.delivered.checked_add_signed(k).filter(|&at| at < self.decided)?;
            Some(&self.instants[at % KEPT])
        };
        let settled = settle::settle(around, hop_s, SILENCE_DBFS);
        let reading = &mut self.reading;
        reading.centre = instant.centre;
        reading.level_dbfs = instant.level_dbfs;
        reading.noise_dbfs = instant.noise_dbfs;
        reading.state = settled.state;
        reading.partials.clear();
        reading.strays.clear();
        reading.stretch = None;
        reading.pitch = settled.pitch.map(|(f0_hz, f0_sd_cents, confidence)| Pitch {
            f0_hz,
            f0_sd_cents,
            confidence,
        });
        if let Some(pitch) = reading.pitch {
            reading.strays.extend_from_slice(&instant.strays);
            reading.stretch = instant.b.map(|(b, b_sd)| Stretch { b, b_sd });
            let f0 = (pitch.f0_hz, pitch.f0_sd_cents);
            self.averager.run(f0, instant.frame_s, &instant.tones, &mut reading.partials);
        }
        sink.reading(reading);
        let step = Step {
            centre: instant.centre,
            f0: reading.pitch.map(|p| p.f0_hz),
            level_dbfs: instant.calm_dbfs,
        };
        self.notes.step(&self.history, step, instant.f0_sd_cents, &instant.tones, sink);
        self.delivered += 1;
    }

    /// Delivers a provisional reading of the newest samples.
    fn look_at_newest(&mut self, sink: &mut impl Sink) {
        self.live.clear();
        let heard = 2 * self.evidence.reach() as u64;
        let quiet = self.history.loud_until() + heard <= self.history.end();
        let (level_dbfs, noise_dbfs) = if quiet {
            (f64::NEG_INFINITY, f64::NEG_INFINITY)
        } else {
            (self.evidence.newest(&self.history, &mut self.live), self.evidence.noise_dbfs())
        };
        let reading = &mut self.reading;
        reading.centre = self.history.end();
        reading.level_dbfs = level_dbfs;
        reading.noise_dbfs = noise_dbfs;
        reading.partials.clear();
        reading.strays.clear();
        reading.pitch = None;
        reading.stretch = None;
        let loud = level_dbfs > SILENCE_DBFS;
        reading.state = if loud { State::Unpitched } else { State::Silent };
        let best = self.live.first().filter(|c| loud && c.score > LIVE_SCORE);
        if let Some(best) = best {
            let model = (best.hz, best.b);
            reading.centre =
                self.evidence.refine_newest(model, self.settings.partials, &mut self.refiner);
            self.points.clear();
            self.points.extend(self.refiner.tones.iter().map(Point::from));
            if let Some(fit) = stiff::fit(&self.points) {
                reading.state = State::Steady;
                reading.stretch =
                    fit.b_sd.is_finite().then_some(Stretch { b: fit.b, b_sd: fit.b_sd });
                let confidence = settle::provisional_confidence(best);
                reading.pitch =
                    Some(Pitch { f0_hz: fit.f0, f0_sd_cents: fit.f0_sd_cents, confidence });
                reading
                    .partials
                    .extend(self.refiner.tones.iter().map(|t| t.partial(fit.f0, fit.f0_sd_cents)));
            }
        }
        sink.live(reading);
    }
}
