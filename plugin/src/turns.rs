//! Where a check turns outside and back, on its way from the worker to the audio thread.
//!
//! A turn is sent at a stream position that follows from the samples alone: a fixed [`DELAY_S`] after the place in the sound
//! where it was established, which is longer than engine and check look ahead and the worker normally takes. In the host's
//! offline mode the audio thread waits until the worker is past what a block may still depend on, so that a bounce sends at
//! exactly that position, at any block size and speed.

use std::collections::VecDeque;
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use rtrb::{Consumer, Producer, RingBuffer};

use crate::convert::{nearest, position};

/// How long after its place in the sound a turn is sent, in seconds: the engine looks ahead by up to 0.28 s, the check by up
/// to 0.65 s, and the rest is [`MARGIN_S`] and some.
pub(crate) const DELAY_S: f64 = 1.25;
/// Least time between the newest sample that a turn rests on and its sending, in seconds: for a large block (0.19 s) to come
/// whole and the worker to take it up (0.03 s). It counts where a pitch with many drop-outs is judged later than usual.
const MARGIN_S: f64 = 0.25;
/// Turns on their way at once: spans are 0.15 s long at least.
const RING: usize = 64;
/// Places in the stream, within the margin, at which the audio thread remembers what it had sent.
const PLACES: usize = 16;

/// A check turned outside or back.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Turn {
    /// Number of the stream, from 1.
    stream: u64,
    /// Stream position at which it is sent.
    pub(crate) at: u64,
    pub(crate) outside: bool,
}

/// How far the worker is with what came out of the rings: its turns up to there are told.
#[derive(Debug, Default)]
struct Progress {
    samples: AtomicU64,
    marks: AtomicU64,
}

/// The worker's end.
#[derive(Debug)]
pub(crate) struct Teller {
    turns: Producer<Turn>,
    progress: Arc<Progress>,
    margin: u64,
    delay: u64,
    stream: u64,
    /// The newest sample that what is decided now may rest on.
    known: u64,
    /// Position of the newest turn: none is sent before it.
    last: u64,
    /// What has found no room yet.
    waiting: VecDeque<Turn>,
}

/// The audio thread's end.
#[derive(Debug)]
pub(crate) struct Listener {
    turns: Consumer<Turn>,
    progress: Arc<Progress>,
    margin: u64,
    stream: u64,
    /// What had been sent by which position, oldest first, a few places within the margin.
    sent: VecDeque<Sent>,
}

/// What the audio thread had put into the rings by a stream position.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Sent {
    pub(crate) at: u64,
    pub(crate) samples: u64,
    pub(crate) marks: u64,
}

/// Both ends, with all the memory that the audio thread's needs.
pub(crate) fn turns(sample_rate_hz: f64) -> (Teller, Listener) {
    let (to, from) = RingBuffer::new(RING);
    let progress = Arc::<Progress>::default();
    let margin = nearest(MARGIN_S * sample_rate_hz).max(position(PLACES));
    let teller = Teller {
        turns: to,
        progress: Arc::clone(&progress),
        margin,
        delay: nearest(DELAY_S * sample_rate_hz),
        stream: 0,
        known: 0,
        last: 0,
        waiting: VecDeque::new(),
    };
    let sent = VecDeque::with_capacity(2 * PLACES + 4);
    (teller, Listener { turns: from, progress, margin, stream: 0, sent })
}

impl Teller {
    /// Another stream begins.
    pub(crate) fn start(&mut self, stream: u64) {
        self.stream = stream;
        self.known = 0;
        self.last = 0;
        self.waiting.clear();
    }

    /// What comes next may rest on the samples up to this position.
    pub(crate) fn know(&mut self, position: u64) {
        self.known = position;
    }

    /// Hands over what was told, and says that all of it is that comes of so many samples and marks.
    pub(crate) fn publish(&mut self, samples: u64, marks: u64) {
        while let Some(turn) = self.waiting.pop_front() {
            if self.turns.push(turn).is_err() {
                self.waiting.push_front(turn);
                break;
            }
        }
        // Whoever sees this sees the turns too.
        self.progress.samples.store(samples, Ordering::Release);
        self.progress.marks.store(marks, Ordering::Release);
    }

    /// A check turned outside, or back, at a place in the sound.
    pub(crate) fn tell(&mut self, place: u64, outside: bool) {
        let at = (place + self.delay).max(self.known + self.margin).max(self.last);
        self.last = at;
        self.waiting.push_back(Turn { stream: self.stream, at, outside });
    }
}

impl Listener {
    /// Another stream begins; gives its number. Turns of the one before are not sent any more.
    pub(crate) fn start(&mut self) -> u64 {
        self.stream += 1;
        self.sent.clear();
        self.stream
    }

    /// Remembers what was sent by a position; positions grow.
    pub(crate) fn remember(&mut self, sent: Sent) {
        let apart = self.margin / position(PLACES);
        // The newest stands for its neighbourhood, the last place included.
        let before = self.sent.len().checked_sub(2).and_then(|k| self.sent.get(k));
        if before.is_some_and(|before| sent.at < before.at + apart) {
            self.sent.pop_back();
        }
        // What has left the margin is asked for no more; a place too few would only mean to wait for a later one.
        while self.sent.front().is_some_and(|first| first.at + self.margin < sent.at)
            || self.sent.len() == self.sent.capacity()
        {
            self.sent.pop_front();
        }
        self.sent.push_back(sent);
    }

    /// Whether all turns that are sent before a position are here.
    pub(crate) fn is_complete(&self, before: u64) -> bool {
        let Some(needed) = self.sent.iter().find(|sent| sent.at + self.margin >= before) else {
            return true;
        };
        self.progress.samples.load(Ordering::Acquire) >= needed.samples
            && self.progress.marks.load(Ordering::Acquire) >= needed.marks
    }

    /// How far the worker is, as a number that grows.
    pub(crate) fn progress(&self) -> u64 {
        self.progress.samples.load(Ordering::Relaxed) + self.progress.marks.load(Ordering::Relaxed)
    }

    /// The next turn that is sent before a position, if it has come.
    pub(crate) fn next(&mut self, before: u64) -> Option<Turn> {
        while let Ok(&turn) = self.turns.peek() {
            let stale = turn.stream != self.stream;
            if !stale && turn.at >= before {
                return None;
            }
            // It was just there.
            let _ = self.turns.pop();
            if !stale {
                return Some(turn);
            }
        }
        None
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE_HZ: f64 = 48_000.0;
    const MARGIN: u64 = 12_000;
    const DELAY: u64 = 60_000;

    fn all(listener: &mut Listener, before: u64) -> Vec<(u64, bool)> {
        std::iter::from_fn(|| listener.next(before)).map(|turn| (turn.at, turn.outside)).collect()
    }

    #[test]
    fn turns_come_a_fixed_time_after_their_place_unless_judged_late() {
        let (mut teller, mut listener) = turns(RATE_HZ);
        teller.start(listener.start());
        teller.know(20_000);
        teller.tell(10_000, true);
        // Judged so late that the delay is over.
        teller.know(90_000);
        teller.tell(30_000, false);
        teller.tell(40_000, true);
        teller.publish(0, 0);
        assert_eq!(all(&mut listener, 70_000), [], "before it is due");
        assert_eq!(all(&mut listener, 70_001), [(10_000 + DELAY, true)]);
        let late = 90_000 + MARGIN;
        assert_eq!(all(&mut listener, u64::MAX), [(late, false), (late, true)]);
    }

    #[test]
    fn the_delay_is_longer_than_what_is_looked_ahead_at_every_rate() {
        use plumbtone_analysis::{Analyzer, Settings};
        // A long window of the check, and as many readings as may jump away and come back.
        let check_s = 0.65;
        for rate in
            [8_000.0, 22_050.0, 44_100.0, 48_000.0, 88_200.0, 96_000.0, 192_000.0, 384_000.0]
        {
            let engine = Analyzer::new(&Settings::new(rate)).unwrap();
            let engine_s = engine.look_ahead() as f64 / rate;
            let spare_s = DELAY_S - MARGIN_S - engine_s - check_s;
            assert!(spare_s >= 0.0, "{rate} Hz: the engine looks {engine_s} s ahead");
        }
    }

    #[test]
    fn turns_of_an_older_stream_are_dropped() {
        let (mut teller, mut listener) = turns(RATE_HZ);
        teller.start(listener.start());
        teller.tell(0, true);
        teller.publish(0, 0);
        let next = listener.start();
        teller.tell(1, false);
        teller.publish(0, 0);
        teller.start(next);
        teller.tell(5, true);
        teller.publish(0, 0);
        assert_eq!(all(&mut listener, u64::MAX), [(5 + DELAY, true)], "the new stream's alone");
    }

    #[test]
    fn a_full_ring_delays_and_loses_nothing() {
        let (mut teller, mut listener) = turns(RATE_HZ);
        teller.start(listener.start());
        let count = 3 * RING;
        for k in 0..count {
            teller.tell(position(k), k % 2 == 0);
        }
        let mut found = 0;
        for _ in 0..3 {
            teller.publish(0, 0);
            found += all(&mut listener, u64::MAX).len();
        }
        assert_eq!(found, count, "turns");
    }

    #[test]
    fn completeness_needs_all_that_lies_a_margin_back() {
        for block in [1, 64, 333, 4_096, 11_999, 12_000, 30_000] {
            let (mut teller, mut listener) = turns(RATE_HZ);
            let mut at = 0;
            while at < 100_000 {
                at += block;
                listener.remember(Sent { at, samples: at, marks: at / block });
            }
            let needed = at - MARGIN;
            teller.publish(needed - 1, u64::MAX);
            assert!(!listener.is_complete(at), "blocks of {block}: a sample is missing");
            // Places are remembered coarsely: no more than two of them, or a block, too much is asked for.
            teller.publish(needed + (2 * MARGIN / position(PLACES)).max(block), u64::MAX);
            assert!(listener.is_complete(at), "blocks of {block}: all is there");
            teller.publish(u64::MAX, (needed - 1) / block);
            assert!(!listener.is_complete(at), "blocks of {block}: a mark is missing");
            assert!(listener.sent.len() <= 2 * PLACES + 4, "blocks of {block}: memory");
        }
    }
}
