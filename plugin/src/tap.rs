//! The audio thread's side: copies the chosen signal and marks into wait-free rings and does nothing else.
//!
//! Nothing here allocates, locks, logs, calls the system or can panic. While in real time a block for which the rings
//! have no room is dropped whole and becomes a gap; where the host renders offline the tap waits for room instead.

use std::sync::Arc;
use std::time::{Duration, Instant};

use rtrb::{Consumer, Producer, RingBuffer};

use crate::controls::Controls;
use crate::convert::{index, nearest, position};
use crate::marks::{Cause, Event, Mark};
use crate::parameters::Channel;
use crate::session::{Anchor, News, Transport};
use crate::status::Status;
use crate::turns::{Listener, Sent, Teller, Turn, turns};

/// Time that the ring of samples holds at least, in seconds.
const RING_S: f64 = 0.7;
/// Blocks of the host's largest size that it holds at least.
const RING_BLOCKS: usize = 4;
/// Marks that their ring holds: a second of dense playing.
const RING_MARKS: usize = 512;
/// Slots of that ring kept for what a block may need beside its notes.
const MARKS_A_BLOCK: usize = 8;
/// How long the offline tap sleeps before it looks for room again, and how often until it gives up on a worker that
/// makes no room at all (a quarter of a minute).
const WAIT: Duration = Duration::from_micros(250);
const WAITS_MAX: u32 = 60_000;

/// How far ahead of the clock a host is that renders offline: this many times, and by this many seconds.
const AHEAD: (f64, f64) = (1.25, 0.1);

/// What the tap is built for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Format {
    pub(crate) sample_rate_hz: f64,
    pub(crate) block_max: usize,
    pub(crate) patience: Patience,
}

/// Whether the tap may wait for room.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Patience {
    /// Never: the host runs in real time.
    Never,
    /// Always: the host renders offline.
    Always,
    /// When the host is ahead of the clock, which it can only be offline. For hosts whose word is not to be had.
    WhenAhead,
}

/// The worker's end of the rings.
#[derive(Debug)]
pub(crate) struct Intake {
    pub(crate) samples: Consumer<f32>,
    pub(crate) marks: Consumer<Mark>,
    /// What goes back; taken out by whoever tells it.
    pub(crate) turns: Option<Teller>,
    pub(crate) format: Format,
}

/// A key that went down or up within a block.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Note {
    /// Samples after the block's first.
    pub(crate) offset: usize,
    pub(crate) key: u8,
    pub(crate) down: bool,
}

/// A check turned outside or back within the block that was taken last.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Due {
    /// Samples after the block's first.
    pub(crate) offset: usize,
    /// Whether it should have come with an earlier block.
    pub(crate) late: bool,
    pub(crate) outside: bool,
}

/// The audio thread's end of the rings.
#[derive(Debug)]
pub(crate) struct Tap {
    samples: Producer<f32>,
    marks: Producer<Mark>,
    turns: Listener,
    mixed: Vec<f32>,
    format: Format,
    status: Arc<Status>,
    /// Samples and marks put into the rings since they were made.
    sent: u64,
    marked: u64,
    /// Stream position: those, less what went before the last start, plus what was missed since.
    at: u64,
    /// Stream position of the first sample of the block that was taken last.
    from: u64,
    /// The stream that the next mark has to start.
    starting: Option<u64>,
    /// What the worker was last told.
    told_controls: Option<Controls>,
    told_transport: Option<Anchor>,
    /// Samples that the worker has still to be told it missed.
    overrun: u64,
    unwatched: u64,
    listening: bool,
    /// Whether the worker knows of a stream whose end it has not been told.
    open: bool,
    /// When the stream's first block came.
    begun: Option<Instant>,
}

impl Tap {
    /// Takes all the memory that both ends will need.
    pub(crate) fn new(format: Format, status: Arc<Status>) -> (Self, Intake) {
        let seconds = index(nearest(RING_S * format.sample_rate_hz));
        let capacity = seconds.max(RING_BLOCKS * format.block_max).next_power_of_two();
        let (samples, samples_out) = RingBuffer::new(capacity);
        let (marks, marks_out) = RingBuffer::new(RING_MARKS);
        let (teller, mut listener) = turns(format.sample_rate_hz);
        let tap = Self {
            samples,
            marks,
            starting: Some(listener.start()),
            turns: listener,
            mixed: vec![0.0; format.block_max.max(1)],
            format,
            status,
            sent: 0,
            marked: 0,
            at: 0,
            from: 0,
            told_controls: None,
            told_transport: None,
            overrun: 0,
            unwatched: 0,
            listening: false,
            open: false,
            begun: None,
        };
        (tap, Intake { samples: samples_out, marks: marks_out, turns: Some(teller), format })
    }

    pub(crate) fn format(&self) -> Format {
        self.format
    }

    /// Begins a new stream at position 0.
    pub(crate) fn start(&mut self) {
        self.end();
        self.at = 0;
        self.from = 0;
        self.starting = Some(self.turns.start());
        self.told_controls = None;
        self.told_transport = None;
        self.overrun = 0;
        self.unwatched = 0;
        self.listening = false;
        self.begun = None;
    }

    /// Ends the stream: the worker delivers what is still to come.
    pub(crate) fn end(&mut self) {
        if self.open && (self.has_room(0) || self.wait_for_room(0)) {
            self.mark(0, Event::End { bounce: self.may_wait() });
            (self.listening, self.open) = (false, false);
        }
    }

    /// Takes one block. `channels` are of equal length; `notes` come in order.
    pub(crate) fn block(
        &mut self,
        channels: &[&mut [f32]],
        controls: &Controls,
        transport: &Transport,
        notes: impl Iterator<Item = Note>,
    ) {
        let length = channels.first().map_or(0, |channel| channel.len());
        self.from = self.at;
        if length == 0 {
            return;
        }
        if !self.listens(controls) {
            self.pass_by(position(length));
            return;
        }
        if !self.has_room(length) && !self.wait_for_room(length) {
            self.drop_block(position(length));
            return;
        }
        self.mark_changes(controls, transport);
        self.mark_notes(notes, length);
        self.copy(channels, controls.channel, length);
    }

    /// Whether anybody uses what would be measured.
    fn listens(&self, controls: &Controls) -> bool {
        self.status.watched() || controls.check || controls.capture
    }

    fn pass_by(&mut self, length: u64) {
        if self.listening && (self.has_room(0) || self.wait_for_room(0)) {
            self.mark(0, Event::Pause);
            self.listening = false;
            // What changes meanwhile is told when somebody listens again.
            self.told_controls = None;
        }
        self.unwatched += length;
        self.advance(length);
    }

    fn drop_block(&mut self, length: u64) {
        self.overrun += length;
        self.status.lose_samples(length);
        self.advance(length);
    }

    fn advance(&mut self, length: u64) {
        self.at += length;
        self.status.at(self.at);
        if self.format.patience != Patience::Never {
            self.turns.remember(Sent { at: self.at, samples: self.sent, marks: self.marked });
        }
    }

    /// Offline, waits until all that is due in the block that was taken last has come.
    pub(crate) fn wait_for_turns(&self) {
        if self.may_wait() && !self.turns.is_complete(self.at) {
            self.wait(|| self.turns.is_complete(self.at), || self.turns.progress());
        }
    }

    /// The next that is due in the block that was taken last.
    pub(crate) fn due(&mut self) -> Option<Due> {
        let Turn { at, outside, .. } = self.turns.next(self.at)?;
        let offset = index(at.saturating_sub(self.from));
        // Where it may be waited for, it was not wanted before.
        let late = at < self.from && !self.may_wait();
        Some(Due { offset, late, outside })
    }

    fn has_room(&self, length: usize) -> bool {
        self.samples.slots() >= length && self.marks.slots() >= MARKS_A_BLOCK
    }

    /// Offline, waits until there is room; false while in real time, or when the worker makes none for very long.
    fn wait_for_room(&self, length: usize) -> bool {
        if !self.may_wait() || length > self.samples.buffer().capacity() {
            return false;
        }
        self.wait(|| self.has_room(length), || position(self.samples.slots()))
    }

    /// Waits until something is done; false when the worker is gone or makes no progress for very long.
    fn wait(&self, is_done: impl Fn() -> bool, progress: impl Fn() -> u64) -> bool {
        let mut before = progress();
        let mut waits = 0;
        while waits < WAITS_MAX && !self.samples.is_abandoned() {
            std::thread::sleep(WAIT);
            if is_done() {
                return true;
            }
            let now = progress();
            waits = if now > before { 0 } else { waits + 1 };
            before = now;
        }
        false
    }

    fn may_wait(&self) -> bool {
        match self.format.patience {
            Patience::Never => false,
            Patience::Always => true,
            Patience::WhenAhead => {
                let elapsed_s = self.begun.map_or(0.0, |begun| begun.elapsed().as_secs_f64());
                self.at as f64 / self.format.sample_rate_hz > AHEAD.0 * elapsed_s + AHEAD.1
            }
        }
    }

    fn mark(&mut self, offset: usize, event: Event) {
        let mark = Mark { after: self.sent + position(offset), event };
        // Room was made sure of before; a mark that finds none would only be missing.
        self.marked += u64::from(self.marks.push(mark).is_ok());
    }

    /// Marks all that is new since the last block that got through; at most [`MARKS_A_BLOCK`] marks.
    fn mark_changes(&mut self, controls: &Controls, transport: &Transport) {
        (self.listening, self.open) = (true, true);
        if let Some(stream) = self.starting.take() {
            self.begun = Some(Instant::now());
            self.mark(0, Event::Start { stream });
        }
        for (samples, cause) in [(self.overrun, Cause::Overrun), (self.unwatched, Cause::Unwatched)]
        {
            if samples > 0 {
                self.mark(0, Event::Missed { samples, cause });
            }
        }
        (self.overrun, self.unwatched) = (0, 0);
        if self.told_controls.as_ref() != Some(controls) {
            self.told_controls = Some(*controls);
            self.mark(0, Event::Controls(*controls));
        }
        let news = self.told_transport.as_ref().map_or(News::Changed, |told| {
            told.news(self.at, transport, self.format.sample_rate_hz)
        });
        if news == News::Jumped {
            self.mark(0, Event::Jump);
        }
        if news != News::None {
            self.told_transport = Some(Anchor { at: self.at, transport: *transport });
            self.mark(0, Event::Transport(*transport));
        }
    }

    fn mark_notes(&mut self, notes: impl Iterator<Item = Note>, length: usize) {
        for Note { offset, key, down } in notes {
            if self.marks.slots() > 0 {
                self.mark(offset.min(length - 1), Event::Note { key, down });
            } else {
                self.status.lose_note();
            }
        }
    }

    fn copy(&mut self, channels: &[&mut [f32]], channel: Channel, length: usize) {
        let mut from = 0;
        while from < length {
            let to = length.min(from + self.mixed.len());
            let pushed = match (channels, channel) {
                ([left, right], Channel::Mid) => {
                    let mixed = &mut self.mixed[..to - from];
                    mix(mixed, &left[from..to], &right[from..to], |l, r| 0.5 * (l + r));
                    self.samples.push_entire_slice(mixed)
                }
                ([left, right], Channel::Side) => {
                    let mixed = &mut self.mixed[..to - from];
                    mix(mixed, &left[from..to], &right[from..to], |l, r| 0.5 * (l - r));
                    self.samples.push_entire_slice(mixed)
                }
                ([_, right], Channel::Right) => self.samples.push_entire_slice(&right[from..to]),
                ([only, ..], _) => self.samples.push_entire_slice(&only[from..to]),
                ([], _) => Ok(()),
            };
            debug_assert!(pushed.is_ok(), "room was made sure of");
            from = to;
        }
        self.sent += position(length);
        self.advance(position(length));
    }
}

/// Mixes sample by sample; all slices are of equal length.
#[inline]
fn mix(mixed: &mut [f32], left: &[f32], right: &[f32], f: impl Fn(f32, f32) -> f32) {
    for ((out, &l), &r) in mixed.iter_mut().zip(left).zip(right) {
        *out = f(l, r);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const FORMAT: Format =
        Format { sample_rate_hz: 48_000.0, block_max: 512, patience: Patience::Never };

    fn watched() -> Arc<Status> {
        let status = Arc::new(Status::default());
        status.watch(true);
        status
    }

    fn block(tap: &mut Tap, controls: &Controls, value: f32, length: usize) {
        let (mut left, mut right) = (vec![value; length], vec![-0.5 * value; length]);
        let channels = [&mut left[..], &mut right[..]];
        tap.block(&channels, controls, &Transport::default(), std::iter::empty());
    }

    fn events(intake: &mut Intake) -> Vec<Mark> {
        std::iter::from_fn(|| intake.marks.pop().ok()).collect()
    }

    #[test]
    fn every_channel_is_the_one_it_is_called() {
        for (channel, expected) in [
            (Channel::Mid, 0.25),
            (Channel::Left, 1.0),
            (Channel::Right, -0.5),
            (Channel::Side, 0.75),
        ] {
            let (mut tap, mut intake) = Tap::new(FORMAT, watched());
            let controls = Controls { channel, ..Controls::default() };
            block(&mut tap, &controls, 1.0, 512);
            let mut samples = [0.0; 512];
            assert!(intake.samples.pop_entire_slice(&mut samples).is_ok(), "{channel:?}");
            let same = samples.iter().all(|x: &f32| x.to_bits() == f32::to_bits(expected));
            assert!(same, "{channel:?}: {} instead of {expected}", samples[0]);
        }
    }

    #[test]
    fn nothing_is_taken_while_nobody_listens_and_that_is_marked() {
        let status = Arc::new(Status::default());
        let (mut tap, mut intake) = Tap::new(FORMAT, Arc::clone(&status));
        let controls = Controls::default();
        block(&mut tap, &controls, 1.0, 300);
        assert_eq!(intake.samples.slots(), 0, "samples while unwatched");
        assert_eq!(events(&mut intake), [], "marks while unwatched");
        status.watch(true);
        block(&mut tap, &controls, 1.0, 100);
        let missed = Event::Missed { samples: 300, cause: Cause::Unwatched };
        let marks = events(&mut intake);
        assert!(marks.contains(&Mark { after: 0, event: missed }), "{marks:?}");
        assert_eq!(intake.samples.slots(), 100, "samples since");
        assert_eq!(status.position(), 400, "all samples count");
    }

    #[test]
    fn an_armed_check_listens_without_an_editor() {
        let (mut tap, intake) = Tap::new(FORMAT, Arc::default());
        let controls = Controls { check: true, ..Controls::default() };
        block(&mut tap, &controls, 1.0, 100);
        assert_eq!(intake.samples.slots(), 100, "samples with a check armed");
    }

    #[test]
    fn a_full_ring_drops_whole_blocks_and_marks_the_gap() {
        let status = watched();
        let (mut tap, mut intake) = Tap::new(FORMAT, Arc::clone(&status));
        let controls = Controls::default();
        let capacity = intake.samples.buffer().capacity();
        let fitting = capacity / 512;
        for _ in 0..fitting + 3 {
            block(&mut tap, &controls, 1.0, 512);
        }
        assert_eq!(intake.samples.slots(), fitting * 512, "whole blocks");
        assert_eq!(status.lost_samples(), 3 * 512, "counted");
        events(&mut intake);
        let mut room = vec![0.0; 512];
        assert!(intake.samples.pop_entire_slice(&mut room).is_ok(), "room for one");
        block(&mut tap, &controls, 1.0, 512);
        let gap = Event::Missed { samples: 3 * 512, cause: Cause::Overrun };
        let after = position(fitting * 512);
        assert_eq!(events(&mut intake), [Mark { after, event: gap }], "one mark");
    }

    #[test]
    fn a_host_ahead_of_the_clock_is_waited_for_and_one_in_time_is_not() {
        let format = Format { patience: Patience::WhenAhead, ..FORMAT };
        let (mut tap, _intake) = Tap::new(format, watched());
        tap.begun = Some(Instant::now());
        assert!(!tap.may_wait(), "nothing was played yet");
        tap.at = 480_000;
        assert!(tap.may_wait(), "ten seconds of sound in no time");
    }

    #[test]
    fn turns_are_due_at_their_sample_and_late_ones_at_once() {
        let status = watched();
        let (mut tap, mut intake) = Tap::new(FORMAT, status);
        let mut turns = intake.turns.take().unwrap();
        turns.start(1);
        // 1.25 s after their places: at samples 60 100 and 60 900.
        turns.tell(100, true);
        turns.tell(900, false);
        let controls = Controls::default();
        let mut found = Vec::new();
        for number in 0..120_u64 {
            block(&mut tap, &controls, 1.0, 512);
            let mut room = vec![0.0; 512];
            assert!(intake.samples.pop_entire_slice(&mut room).is_ok(), "the block came");
            events(&mut intake);
            while let Some(due) = tap.due() {
                found.push((number * 512 + position(due.offset), due.late, due.outside));
            }
            // The worker hands them over when the second is over.
            if number == 118 {
                turns.publish(0, 0);
            }
        }
        assert_eq!(found, [(119 * 512, true, true), (119 * 512, true, false)], "late");
        tap.start();
        turns.start(2);
        turns.tell(100, true);
        turns.publish(0, 0);
        for number in 0..120_u64 {
            block(&mut tap, &controls, 1.0, 512);
            let mut room = vec![0.0; 512];
            assert!(intake.samples.pop_entire_slice(&mut room).is_ok(), "the block came");
            events(&mut intake);
            let due = tap.due().map(|due| (number * 512 + position(due.offset), due.late));
            assert_eq!(due, (number == 117).then_some((60_100, false)), "block {number}");
        }
    }

    #[test]
    fn a_reset_ends_the_stream_before_the_next_begins() {
        let (mut tap, mut intake) = Tap::new(FORMAT, watched());
        let controls = Controls::default();
        block(&mut tap, &controls, 1.0, 64);
        tap.start();
        block(&mut tap, &controls, 1.0, 64);
        let order: Vec<Mark> = events(&mut intake)
            .into_iter()
            .filter(|mark| matches!(mark.event, Event::Start { .. } | Event::End { .. }))
            .collect();
        let expected = [
            (0, Event::Start { stream: 1 }),
            (64, Event::End { bounce: false }),
            (64, Event::Start { stream: 2 }),
        ]
        .map(|(after, event)| Mark { after, event });
        assert_eq!(order, expected, "start, end, start");
    }
}
