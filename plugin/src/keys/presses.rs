//! Which key a note belongs to: the one that was held while it sounded.
//!
//! Sound comes a little after its key (latency, a slow attack) and goes on after it (release); keys lap over each other
//! when they are played legato. So a note goes to the key that was held for most of its time, if that one was down when it
//! began, and if no other was held for long: several at once have no single sheet.

use std::collections::VecDeque;

/// Most presses remembered: more than anybody plays within one note.
const PRESSES_MAX: usize = 512;
/// How much later than the note's onset its key may come, in seconds: where a pitch begins is found to a few hundredths.
const EARLY_S: f64 = 0.1;
/// How long after its key has gone up a short sound may still begin, in seconds.
const LATE_S: f64 = 0.15;
/// How long another key may be held within a note: so many seconds, or this share of the note.
const LAP_S: f64 = 0.1;
const LAP_SHARE: f64 = 0.2;

/// A key, from when it went down until it went up.
#[derive(Debug, Clone, Copy)]
struct Press {
    number: u64,
    key: u8,
    down: u64,
    up: Option<u64>,
}

/// The presses that notes may still belong to, in the order in which they went down.
#[derive(Debug, Default)]
pub(super) struct Presses {
    all: VecDeque<Press>,
    /// Presses so far.
    count: u64,
}

/// What a note belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Match {
    /// This key, in the press of this number.
    Key { key: u8, press: u64 },
    /// Several keys were held at once.
    Several { newest: u8 },
    /// No key was held for it.
    Nothing,
}

impl Match {
    /// Number of the press.
    pub(super) fn press(self) -> Option<u64> {
        match self {
            Self::Key { press, .. } => Some(press),
            Self::Several { .. } | Self::Nothing => None,
        }
    }
}

impl Press {
    /// Samples of a stretch for which it was held.
    fn held_within(&self, start: u64, end: u64) -> u64 {
        self.up.unwrap_or(u64::MAX).min(end).saturating_sub(self.down.max(start))
    }
}

impl Presses {
    pub(super) fn clear(&mut self) {
        self.all.clear();
    }

    /// A key goes down or up.
    pub(super) fn key(&mut self, at: u64, key: u8, down: bool) {
        let held = self.all.iter_mut().filter(|press| press.key == key && press.up.is_none());
        held.for_each(|press| press.up = Some(at));
        if down {
            if self.all.len() == PRESSES_MAX {
                self.all.pop_front();
            }
            self.count += 1;
            self.all.push_back(Press { number: self.count, key, down: at, up: None });
        }
    }

    /// All keys go up.
    pub(super) fn release_all(&mut self, at: u64) {
        self.all.iter_mut().filter(|p| p.up.is_none()).for_each(|press| press.up = Some(at));
    }

    /// The key of a note from `start` to `end`. Notes come in order: what lies before this one is forgotten.
    pub(super) fn of(&mut self, start: u64, end: u64, sample_rate_hz: f64) -> Match {
        let seconds = |s: f64| crate::convert::nearest(s * sample_rate_hz);
        let oldest = start.saturating_sub(seconds(LATE_S));
        self.all.retain(|press| press.up.is_none_or(|up| up >= oldest));
        let held = |press: &Press| press.held_within(start, end);
        // Of presses that were held equally long, such as not at all, the newest.
        let own = self.all.iter().filter(|p| p.down < end).max_by_key(|p| (held(p), p.number));
        let Some(own) = own else { return Match::Nothing };
        let lap = seconds(LAP_S.max(LAP_SHARE * (end - start) as f64 / sample_rate_hz));
        let others = || self.all.iter().filter(|press| press.key != own.key && held(press) > 0);
        if others().map(held).sum::<u64>() > lap {
            let newest = others().map(|p| (p.down, p.key)).chain([(own.down, own.key)]).max();
            return Match::Several { newest: newest.map_or(own.key, |(_, key)| key) };
        }
        // The same key may have been struck again within the note.
        let first =
            self.all.iter().filter(|press| press.key == own.key).map(|press| press.down).min();
        if first.is_some_and(|down| down > start + seconds(EARLY_S)) {
            return Match::Nothing;
        }
        Match::Key { key: own.key, press: own.number }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE_HZ: f64 = 1_000.0;

    /// Keys from when to when, in milliseconds; and what a note from when to when is taken for.
    fn found(presses: &[(u8, u64, u64)], (start, end): (u64, u64)) -> Match {
        let mut edges: Vec<(u64, u8, bool)> = presses
            .iter()
            .flat_map(|&(key, down, up)| [(down, key, true), (up, key, false)])
            .collect();
        edges.sort_unstable();
        let mut all = Presses::default();
        edges.into_iter().for_each(|(at, key, down)| all.key(at, key, down));
        all.of(start, end, RATE_HZ)
    }

    fn key(found: Match) -> Option<u8> {
        match found {
            Match::Key { key, .. } => Some(key),
            Match::Several { .. } | Match::Nothing => None,
        }
    }

    #[test]
    fn a_note_is_that_of_the_key_that_was_held() {
        for (what, presses, note, expected) in [
            ("alone", &[(60, 0, 800)][..], (10, 900), Some(60)),
            ("found a little early", &[(60, 50, 800)], (0, 900), Some(60)),
            ("a slow attack", &[(60, 0, 2_000)], (900, 2_500), Some(60)),
            ("a long release", &[(60, 0, 200)], (20, 3_000), Some(60)),
            ("short, after its key", &[(60, 0, 40)], (120, 600), Some(60)),
            ("legato, the first", &[(60, 0, 1_050), (62, 1_000, 2_000)], (5, 1_010), Some(60)),
            ("legato, the second", &[(60, 0, 1_050), (62, 1_000, 2_000)], (990, 2_010), Some(62)),
            ("a run", &[(60, 0, 140), (62, 125, 265), (64, 250, 390)], (135, 262), Some(62)),
            ("late by 80 ms", &[(60, 0, 400), (62, 400, 800)], (80, 480), Some(60)),
            ("struck again", &[(60, 0, 500), (60, 500, 1_000)], (0, 1_000), Some(60)),
        ] {
            assert_eq!(key(found(presses, note)), expected, "{what}");
        }
    }

    #[test]
    fn a_key_that_was_not_held_for_it_is_none() {
        for (what, presses, note) in [
            ("no key at all", &[][..], (0, 900)),
            ("long before", &[(60, 0, 400)], (700, 1_500)),
            ("in the midst of it", &[(60, 600, 3_000)], (0, 3_000)),
            ("after it", &[(60, 1_000, 2_000)], (0, 990)),
        ] {
            assert_eq!(found(presses, note), Match::Nothing, "{what}");
        }
    }

    #[test]
    fn several_keys_held_at_once_are_none_of_them() {
        for (what, presses, note) in [
            ("an octave", &[(48, 0, 1_000), (60, 10, 1_000)][..], (20, 1_000)),
            ("a key held below a tune", &[(36, 0, 9_000), (60, 1_000, 1_900)], (1_010, 2_000)),
            ("a glide from one to the other", &[(60, 0, 500), (62, 500, 1_000)], (0, 1_000)),
        ] {
            assert!(matches!(found(presses, note), Match::Several { .. }), "{what}");
        }
    }

    #[test]
    fn every_press_is_told_apart() {
        let mut all = Presses::default();
        let mut presses = Vec::new();
        for at in [0, 1_000] {
            all.key(at, 60, true);
            all.key(at + 600, 60, false);
            presses.push(all.of(at + 10, at + 700, RATE_HZ).press());
        }
        assert_eq!(presses, [Some(1), Some(2)], "numbers");
    }

    #[test]
    fn what_is_remembered_is_bounded() {
        let mut all = Presses::default();
        for at in 0..10_000 {
            all.key(at, 60, true);
        }
        assert_eq!(all.all.len(), PRESSES_MAX, "presses");
        all.release_all(10_000);
        assert_eq!(all.of(10_400, 11_000, RATE_HZ), Match::Nothing, "nothing is held");
        assert_eq!(all.all.len(), 0, "what is past is forgotten");
    }
}
