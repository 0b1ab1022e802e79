//! One instance's share of the worker's work: takes samples and marks out of the rings and runs the engine over them.

use std::collections::VecDeque;

use plumbtone_analysis::{Analyzer, Settings, SettingsError};

use crate::controls::Controls;
use crate::convert::{index, nearest, position};
use crate::delivery::Delivery;
use crate::marks::{Event, Mark};
use crate::readout::Condition;
use crate::session::Anchor;
use crate::tap::{Intake, Patience};

/// Most samples taken in one turn of an instance in real time, which may have fallen behind, and of one whose host waits:
/// short enough that instances take fair turns.
const SLICE: usize = 8192;
const SLICE_WAITING: usize = 1024;
/// Changed settings take effect at the next multiple of this stream time, in seconds, so that a parameter on the move
/// does not rebuild the engine at each step; a fixed grid keeps that independent of blocks and speed.
const SETTLE_S: f64 = 0.1;

/// How engines are built.
pub(crate) type Build = fn(&Settings) -> Result<Analyzer, SettingsError>;

/// The engine of one instance, between the rings and the delivery.
#[derive(Debug)]
pub(crate) struct Analysis {
    intake: Option<Intake>,
    build: Build,
    engine: Engine,
    controls: Controls,
    /// Stream position at which changed settings take effect.
    settle_at: Option<u64>,
    /// Stream position of the next sample.
    position: u64,
    /// Samples that came out of the ring so far, and how many of them were dealt with.
    popped: u64,
    taken: u64,
    marks: VecDeque<Mark>,
    /// Marks that were dealt with.
    applied: u64,
    slice: Vec<f32>,
    delivery: Delivery,
}

#[derive(Debug)]
enum Engine {
    /// To be built when the next sample comes.
    Absent,
    Running(Box<Analyzer>),
    /// The settings are outside its range.
    Refused,
    /// It panicked.
    Failed,
}

impl Analysis {
    pub(crate) fn new(build: Build, delivery: Delivery) -> Self {
        Self {
            intake: None,
            build,
            engine: Engine::Absent,
            controls: Controls::default(),
            settle_at: None,
            position: 0,
            popped: 0,
            taken: 0,
            marks: VecDeque::new(),
            applied: 0,
            slice: vec![0.0; SLICE],
            delivery,
        }
    }

    /// Listens to another tap from here on.
    pub(crate) fn install(&mut self, mut intake: Intake) {
        if let Some(turns) = intake.turns.take() {
            self.delivery.checks.tell(turns);
        }
        self.delivery.readout.sample_rate_hz = intake.format.sample_rate_hz;
        self.engine = Engine::Absent;
        self.marks.clear();
        self.popped = 0;
        self.taken = 0;
        self.applied = 0;
        self.position = 0;
        self.intake = Some(intake);
    }

    /// Takes a slice's worth of what waits in the rings. Returns whether there was anything.
    pub(crate) fn turn(&mut self) -> bool {
        let Some(intake) = &mut self.intake else { return false };
        // Samples first: all marks that belong before them are in their ring by then.
        let most = match intake.format.patience {
            Patience::Never => SLICE,
            Patience::Always | Patience::WhenAhead => SLICE_WAITING,
        };
        let count = intake.samples.slots().min(most);
        while let Ok(mark) = intake.marks.pop() {
            self.marks.push_back(mark);
        }
        if count == 0 && self.marks.front().is_none_or(|mark| mark.after > self.taken) {
            return false;
        }
        let mut slice = core::mem::take(&mut self.slice);
        if intake.samples.pop_entire_slice(&mut slice[..count]).is_ok() {
            self.popped += position(count);
            self.take(&slice[..count]);
        }
        self.slice = slice;
        self.publish();
        true
    }

    /// The engine panicked in the midst of a turn: says so, and lets everything pass until the next stream.
    pub(crate) fn fail(&mut self) {
        self.engine = Engine::Failed;
        self.taken = self.popped;
        self.slice.resize(SLICE, 0.0);
        self.delivery.stand(Condition::Failed);
        self.publish();
    }

    fn publish(&mut self) {
        self.delivery.publish();
        self.delivery.checks.publish(self.taken, self.applied);
    }

    fn take(&mut self, mut samples: &[f32]) {
        loop {
            while let Some(mark) = self.marks.pop_front_if(|mark| mark.after <= self.taken) {
                self.applied += 1;
                self.apply(mark.event);
            }
            if samples.is_empty() {
                return;
            }
            let due = self.marks.front().map_or(usize::MAX, |mark| index(mark.after - self.taken));
            let (now, later) = samples.split_at(samples.len().min(due));
            self.taken += position(now.len());
            self.feed(now);
            samples = later;
        }
    }

    fn apply(&mut self, event: Event) {
        match event {
            Event::Start { stream } => self.start(stream),
            Event::Controls(controls) => self.control(controls),
            Event::Transport(transport) => {
                let anchor = Anchor { at: self.position, transport };
                if self.delivery.checks.is_ended_by(&anchor) {
                    self.finish();
                }
                self.delivery.anchor(anchor);
            }
            Event::Jump => self.finish(),
            Event::Missed { samples, cause } => {
                self.delivery.keys.lose(self.position);
                self.delivery.miss(samples, cause);
                if let Engine::Running(engine) = &mut self.engine {
                    engine.skip(samples, &mut self.delivery);
                }
                self.position += samples;
            }
            Event::Pause => {
                self.rest(Condition::Paused);
                // Nobody listens while it is on.
                self.controls.capture = false;
            }
            Event::Note { key, down } => self.delivery.key(self.position, key, down),
            Event::End { bounce } => {
                self.rest(Condition::Ended);
                self.delivery.checks.close(bounce);
            }
        }
    }

    fn start(&mut self, stream: u64) {
        self.finish();
        self.delivery.start();
        self.delivery.checks.start(stream);
        self.position = 0;
        self.settle_at = None;
        match &mut self.engine {
            Engine::Running(engine) => engine.reset(),
            Engine::Absent | Engine::Refused | Engine::Failed => self.engine = Engine::Absent,
        }
    }

    fn control(&mut self, controls: Controls) {
        let rate = self.delivery.readout.sample_rate_hz;
        let before = core::mem::replace(&mut self.controls, controls);
        self.delivery.tune(controls.tuning());
        self.delivery.freeze(controls.freeze);
        self.delivery.press.integrate(controls.integration_s());
        // A parameter that is on when the stream begins was switched on before it.
        if controls.capture && !before.capture && self.position > 0 {
            self.delivery.capture(self.position);
        }
        if controls.channel != before.channel || (before.check && !controls.check) {
            // Another signal from here on, or the end of what is checked: nothing before belongs to what follows.
            self.finish();
        }
        if controls.settings(rate) == before.settings(rate) {
            return;
        }
        if self.position == 0 {
            self.engine = Engine::Absent;
        } else {
            let grid = nearest(SETTLE_S * rate).max(1);
            self.settle_at = Some((self.position + 1).next_multiple_of(grid));
        }
    }

    fn feed(&mut self, mut samples: &[f32]) {
        while !samples.is_empty() {
            if self.settle_at.is_some_and(|at| at <= self.position) {
                self.settle_at = None;
                self.flush();
                self.engine = Engine::Absent;
            }
            let due = self.settle_at.map_or(usize::MAX, |at| index(at - self.position));
            let (now, later) = samples.split_at(samples.len().min(due));
            self.arm();
            self.position += position(now.len());
            if let Engine::Running(engine) = &mut self.engine {
                self.delivery.hear();
                engine.push(now, &mut self.delivery);
            }
            samples = later;
        }
    }

    /// Has the engine ready, and a check on if it should be.
    fn arm(&mut self) {
        let begins = self.controls.check && !self.delivery.checks.is_on();
        if begins {
            self.flush();
        }
        self.ready();
        if begins && let Engine::Running(engine) = &self.engine {
            let rate = self.delivery.readout.sample_rate_hz;
            self.delivery.checks.begin(self.position, &self.controls, rate, engine.hop());
        }
    }

    /// Builds the engine if there is none.
    fn ready(&mut self) {
        if !matches!(self.engine, Engine::Absent) {
            return;
        }
        let settings = self.controls.settings(self.delivery.readout.sample_rate_hz);
        self.engine = match (self.build)(&settings) {
            Ok(mut engine) => {
                self.delivery.begin(engine.hop());
                self.delivery.checks.look_ahead(position(engine.look_ahead()));
                // Its positions go on where the stream is.
                engine.skip(self.position, &mut self.delivery);
                Engine::Running(Box::new(engine))
            }
            Err(error) => {
                self.delivery.stand(Condition::Refused(error));
                Engine::Refused
            }
        };
    }

    /// Delivers what is still to come and stands still; an engine that does not work goes on saying so.
    fn rest(&mut self, condition: Condition) {
        self.finish();
        if matches!(self.engine, Engine::Absent | Engine::Running(_)) {
            self.delivery.stand(condition);
        }
    }

    /// Ends what is measured, and with it the check that is on.
    fn finish(&mut self) {
        self.flush();
        self.delivery.close();
        self.delivery.checks.end(self.position);
    }

    /// Delivers what is still to come.
    fn flush(&mut self) {
        if let Engine::Running(engine) = &mut self.engine {
            engine.finish(&mut self.delivery);
        }
    }
}
