//! What each partial did lately: kept by the editor while it is open, so that a pinned one shows its past at once.

use std::collections::VecDeque;

use plumbtone_analysis::Partial;

use crate::convert::{index, single};

/// Seconds between two entries, and how many there are: thirty seconds.
const STEP_S: f64 = 0.05;
const ENTRIES: usize = 600;
/// Partials remembered.
const PARTIALS: usize = 128;

/// Cents and level of one partial at one time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Moment {
    /// Seconds of the stream.
    pub(crate) time_s: f64,
    pub(crate) cents: f32,
    pub(crate) level_dbfs: f32,
}

/// The last half minute of all partials.
#[derive(Debug, Clone, Default)]
pub(crate) struct Memory {
    stream: u64,
    entries: VecDeque<Entry>,
}

#[derive(Debug, Clone)]
struct Entry {
    time_s: f64,
    /// Cents and level by partial number; NaN where there was none.
    partials: Vec<(f32, f32)>,
}

impl Memory {
    /// Takes the partials of a reading of a stream.
    pub(crate) fn push(&mut self, stream: u64, time_s: f64, partials: &[Partial]) {
        let newest = self.entries.back().map(|entry| entry.time_s);
        if stream != self.stream || newest.is_some_and(|newest| time_s < newest) {
            self.entries.clear();
            self.stream = stream;
        } else if newest.is_some_and(|newest| time_s < newest + STEP_S) {
            return;
        }
        let mut entry = if self.entries.len() == ENTRIES { self.entries.pop_front() } else { None }
            .unwrap_or_else(|| Entry { time_s, partials: Vec::new() });
        entry.time_s = time_s;
        entry.partials.clear();
        for partial in partials {
            let slot = index(u64::from(partial.number)).saturating_sub(1);
            if slot < PARTIALS {
                let least = (slot + 1).max(entry.partials.len());
                entry.partials.resize(least, (f32::NAN, f32::NAN));
                entry.partials[slot] =
                    (single(partial.cents_from_harmonic), single(partial.level_dbfs));
            }
        }
        self.entries.push_back(entry);
    }

    /// What a partial did, oldest first; `None` where it was not there.
    pub(crate) fn of(&self, number: u32) -> impl Iterator<Item = Option<Moment>> {
        let slot = index(u64::from(number)).saturating_sub(1);
        self.entries.iter().map(move |entry| {
            let &(cents, level_dbfs) = entry.partials.get(slot)?;
            let here = cents.is_finite() && level_dbfs.is_finite();
            here.then_some(Moment { time_s: entry.time_s, cents, level_dbfs })
        })
    }

    /// Seconds of the stream from the oldest entry to the newest, at least some.
    pub(crate) fn span_s(&self) -> Option<(f64, f64)> {
        let (first, last) = (self.entries.front()?.time_s, self.entries.back()?.time_s);
        Some((first.min(last - 1.0), last))
    }
}
