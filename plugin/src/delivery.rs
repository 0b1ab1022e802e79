//! Where an instance's engine delivers: the readout for the editor, the checks, and the log if one is wanted.

use std::collections::VecDeque;
use std::sync::{Arc, Mutex, PoisonError};

use nice_plug_egui::RepaintNotifier;
use plumbtone_analysis::tuning::{NoteName, Tuning};
use plumbtone_analysis::{Gap, GapReason, Note, Reading, Sink, State};
use triple_buffer::Input;

use crate::captures::Press;
use crate::check::Checks;
use crate::keys::Keys;
use crate::marks::Cause;
use crate::readings_log::{Line, ReadingsLog};
use crate::readout::{Condition, Gaps, Live, Missing, Readout};
use crate::session::{Anchor, SessionPosition};
use crate::status::Status;
use crate::trail::Trail;
use crate::voices::Voices;

/// In silence the editor draws anew once in this many readings only.
const SILENT_READINGS: u32 = 100;

/// The worker's end of an instance's results.
#[derive(Debug)]
pub(crate) struct Delivery {
    /// What is published next.
    pub(crate) readout: Readout,
    /// What is checked.
    pub(crate) checks: Checks,
    /// What is collected key by key.
    pub(crate) keys: Keys,
    /// What is captured.
    pub(crate) press: Press,
    changed: bool,
    /// Whether the change is worth drawing.
    visible: bool,
    silent_readings: u32,
    frozen: bool,
    /// Whether the gap told next is one that somebody would have listened to.
    heard: bool,
    /// Where the transport was told, oldest first; one at or before the last reading's centre, and all later ones.
    anchors: VecDeque<Anchor>,
    /// Keys held, in the order they went down.
    held: Vec<u8>,
    /// The pitch over time; the editor looks at it without waiting.
    trail: Arc<Mutex<Trail>>,
    output: Input<Readout>,
    repaint: RepaintNotifier,
    log: Option<ReadingsLog>,
    status: Arc<Status>,
}

impl Delivery {
    pub(crate) fn new(
        status: Arc<Status>,
        output: Input<Readout>,
        repaint: RepaintNotifier,
        log: Option<ReadingsLog>,
        (checks, keys, press): (Checks, Keys, Press),
    ) -> Self {
        Self {
            readout: Readout::default(),
            checks,
            keys,
            press,
            changed: false,
            visible: false,
            silent_readings: 0,
            frozen: false,
            heard: true,
            trail: Arc::default(),
            anchors: VecDeque::new(),
            held: Vec::new(),
            output,
            repaint,
            log,
            status,
        }
    }

    /// The pitch over time, for the editor.
    pub(crate) fn trail(&self) -> Arc<Mutex<Trail>> {
        Arc::clone(&self.trail)
    }

    /// An engine begins, whose readings lie this many samples apart.
    pub(crate) fn begin(&mut self, hop: usize) {
        self.keys.begin(self.readout.tuning, self.readout.sample_rate_hz);
        self.with_trail(|trail| trail.grid(hop, self.readout.sample_rate_hz));
    }

    /// Notes are called otherwise from here on.
    pub(crate) fn tune(&mut self, tuning: Tuning) {
        if self.readout.tuning != tuning {
            self.readout.tuning = tuning;
            self.keys.tune(tuning);
            self.readout.forget_offset();
            self.show();
        }
    }

    /// A new stream begins.
    pub(crate) fn start(&mut self) {
        self.readout.stream += 1;
        self.readout.measured = false;
        self.readout.live = None;
        self.readout.gaps = Gaps::default();
        self.readout.last_gap = None;
        self.readout.forget_offset();
        self.readout.played = None;
        self.readout.voices = Voices::default();
        self.held.clear();
        self.anchors.clear();
        self.keys.start();
        self.press.start();
        self.stand(Condition::Waiting);
    }

    pub(crate) fn stand(&mut self, condition: Condition) {
        if self.readout.condition != condition {
            self.readout.condition = condition;
            self.show();
        }
    }

    /// Sound is coming in.
    pub(crate) fn hear(&mut self) {
        self.stand(if self.frozen { Condition::Frozen } else { Condition::Measuring });
    }

    pub(crate) fn freeze(&mut self, frozen: bool) {
        self.frozen = frozen;
    }

    /// The reading at a position, or the one on display while that is held, is to be captured.
    pub(crate) fn capture(&mut self, at: u64) {
        if self.frozen && self.readout.measured {
            self.press.take(&self.readout);
            self.show();
        } else {
            self.press.press(at);
        }
    }

    /// No more readings come for now.
    pub(crate) fn close(&mut self) {
        if self.press.close(&self.readout) {
            self.show();
        }
    }

    pub(crate) fn anchor(&mut self, anchor: Anchor) {
        self.anchors.push_back(anchor);
        self.checks.anchor(anchor);
    }

    /// A key goes down or up at a position.
    pub(crate) fn key(&mut self, at: u64, key: u8, down: bool) {
        self.held.retain(|&held| held != key);
        if down {
            self.held.push(key);
        }
        self.readout.played = self.held.last().map(|&key| NoteName::from_midi(i16::from(key)));
        self.checks.key(at, self.readout.played.map(|note| self.readout.tuning.frequency_hz(note)));
        self.keys.key(at, key, down);
        self.show();
    }

    pub(crate) fn miss(&mut self, samples: u64, cause: Cause) {
        match cause {
            Cause::Overrun => self.readout.gaps.overrun += samples,
            Cause::Unwatched => self.readout.gaps.unwatched += samples,
        }
        self.heard = cause == Cause::Overrun;
        self.show();
    }

    /// Hands the readout over, if anything in it changed.
    pub(crate) fn publish(&mut self) {
        if !self.changed {
            return;
        }
        self.changed = false;
        self.output.input_buffer_mut().copy(&self.readout);
        self.output.publish();
        self.repaint.request_repaint_with(core::mem::take(&mut self.visible));
        if self.log.as_mut().is_some_and(|log| log.flush().is_err()) {
            self.log = None;
        }
    }

    /// What changed is to be drawn.
    fn show(&mut self) {
        self.changed = true;
        self.visible = true;
    }

    /// A reading came: silence goes on looking like silence, but for its time.
    fn show_reading(&mut self, reading: &Reading) {
        let same = reading.state == State::Silent && self.readout.reading.state == State::Silent;
        self.silent_readings = if same { self.silent_readings + 1 } else { 0 };
        self.visible |= self.silent_readings.is_multiple_of(SILENT_READINGS);
    }

    fn with_trail<R>(&self, f: impl FnOnce(&mut Trail) -> R) -> R {
        f(&mut self.trail.lock().unwrap_or_else(PoisonError::into_inner))
    }

    fn session(&mut self, centre: u64) -> SessionPosition {
        while self.anchors.get(1).is_some_and(|next| next.at <= centre) {
            self.anchors.pop_front();
        }
        let rate = self.readout.sample_rate_hz;
        self.anchors.front().map_or_else(SessionPosition::default, |a| a.position(centre, rate))
    }
}

impl Sink for Delivery {
    fn wants_live(&self) -> bool {
        self.status.shown()
    }

    fn live(&mut self, reading: &Reading) {
        if !self.frozen {
            let Reading { centre, pitch, level_dbfs, .. } = *reading;
            self.readout.live = Some(Live { centre, pitch, level_dbfs });
            self.changed = true;
            self.visible |= pitch.is_some();
        }
    }

    fn reading(&mut self, reading: &Reading) {
        let session = self.session(reading.centre);
        if let Some(log) = &mut self.log {
            let Readout { stream, sample_rate_hz, .. } = self.readout;
            if log.add(&Line::of(stream, sample_rate_hz, reading, &session)).is_err() {
                self.log = None;
            }
        }
        let stream = self.readout.stream;
        let trail_end = self.with_trail(|trail| {
            trail.push(stream, reading, &session);
            trail.next()
        });
        self.keys.reading(reading);
        self.checks.reading(reading, trail_end.saturating_sub(1), self.status.shown());
        self.readout.weigh(reading);
        self.changed = true;
        if self.frozen && self.readout.measured {
            return;
        }
        self.show_reading(reading);
        self.readout.take(reading, session);
        self.readout.trail_end = trail_end;
        self.visible |= self.press.reading(&self.readout);
    }

    fn note(&mut self, note: &Note) {
        self.readout.voices.take(note);
        self.keys.note(note);
        self.show();
    }

    fn gap(&mut self, gap: &Gap) {
        self.checks.gap(gap);
        // What was lost on the way is counted where it is told, with its cause.
        if gap.reason == GapReason::NonFinite {
            self.readout.gaps.non_finite += gap.end - gap.start;
        }
        if gap.reason == GapReason::NonFinite || self.heard {
            self.readout.last_gap = Some(Missing { samples: gap.end - gap.start, end: gap.end });
        }
        self.show();
    }
}
