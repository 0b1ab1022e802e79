//! Where an instance's engine delivers: the readout for the editor, and the log if one is wanted.

use std::collections::VecDeque;
use std::sync::Arc;

use nice_plug_egui::RepaintNotifier;
use plumbtone_analysis::tuning::NoteName;
use plumbtone_analysis::{Gap, GapReason, Reading, Sink};
use triple_buffer::Input;

use crate::marks::Cause;
use crate::readings_log::{Line, ReadingsLog};
use crate::readout::{Condition, Gaps, Live, Readout, copy_reading};
use crate::session::{Anchor, SessionPosition, Transport};
use crate::status::Status;

/// The worker's end of an instance's results.
#[derive(Debug)]
pub(crate) struct Delivery {
    /// What is published next.
    pub(crate) readout: Readout,
    changed: bool,
    frozen: bool,
    /// Where the transport was told, oldest first; one at or before the last reading's centre, and all later ones.
    anchors: VecDeque<Anchor>,
    /// Keys held, in the order they went down.
    held: Vec<u8>,
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
    ) -> Self {
        Self {
            readout: Readout::default(),
            changed: false,
            frozen: false,
            anchors: VecDeque::new(),
            held: Vec::new(),
            output,
            repaint,
            log,
            status,
        }
    }

    /// A new stream begins.
    pub(crate) fn start(&mut self) {
        self.readout.stream += 1;
        self.readout.measured = false;
        self.readout.live = None;
        self.readout.gaps = Gaps::default();
        self.readout.played = None;
        self.held.clear();
        self.anchors.clear();
        self.stand(Condition::Waiting);
    }

    pub(crate) fn stand(&mut self, condition: Condition) {
        self.changed |= self.readout.condition != condition;
        self.readout.condition = condition;
    }

    /// Sound is coming in.
    pub(crate) fn hear(&mut self) {
        self.stand(if self.frozen { Condition::Frozen } else { Condition::Measuring });
    }

    pub(crate) fn freeze(&mut self, frozen: bool) {
        self.frozen = frozen;
    }

    pub(crate) fn anchor(&mut self, at: u64, transport: Transport) {
        self.anchors.push_back(Anchor { at, transport });
    }

    pub(crate) fn key(&mut self, key: u8, down: bool) {
        self.held.retain(|&held| held != key);
        if down {
            self.held.push(key);
        }
        self.readout.played = self.held.last().map(|&key| NoteName::from_midi(i16::from(key)));
        self.changed = true;
    }

    pub(crate) fn miss(&mut self, samples: u64, cause: Cause) {
        match cause {
            Cause::Overrun => self.readout.gaps.overrun += samples,
            Cause::Unwatched => self.readout.gaps.unwatched += samples,
        }
        self.changed = true;
    }

    /// Hands the readout over, if anything in it changed.
    pub(crate) fn publish(&mut self) {
        if !self.changed {
            return;
        }
        self.changed = false;
        self.output.input_buffer_mut().copy(&self.readout);
        self.output.publish();
        self.repaint.request_repaint();
        if self.log.as_mut().is_some_and(|log| log.flush().is_err()) {
            self.log = None;
        }
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
        self.changed = true;
        if self.frozen && self.readout.measured {
            return;
        }
        copy_reading(&mut self.readout.reading, reading);
        self.readout.session = session;
        self.readout.measured = true;
    }

    fn gap(&mut self, gap: &Gap) {
        // What was lost on the way is counted where it is told, with its cause.
        if gap.reason == GapReason::NonFinite {
            self.readout.gaps.non_finite += gap.end - gap.start;
            self.changed = true;
        }
    }
}
