//! Single values shared by the audio thread, the worker and the editor: plain atomics, no order between them.

use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};

/// Values of one instance.
#[derive(Debug, Default)]
pub(crate) struct Status {
    /// Whether the readings are logged.
    logged: bool,
    /// Whether an editor is open.
    watched: AtomicBool,
    /// Stream position after the last sample the tap saw.
    position: AtomicU64,
    /// Samples lost because the worker fell behind, since the instance was made.
    lost_samples: AtomicU64,
    /// Marks of notes lost for the same reason.
    lost_notes: AtomicU64,
    /// MIDI messages of checks that were sent late, for the worker was.
    late_messages: AtomicU64,
}

impl Status {
    pub(crate) fn new(logged: bool) -> Self {
        Self { logged, ..Self::default() }
    }

    /// Whether an editor is open.
    pub(crate) fn shown(&self) -> bool {
        self.watched.load(Ordering::Relaxed)
    }

    /// Whether anybody gets to see the readings.
    pub(crate) fn watched(&self) -> bool {
        self.logged || self.shown()
    }

    pub(crate) fn watch(&self, watched: bool) {
        self.watched.store(watched, Ordering::Relaxed);
    }

    pub(crate) fn position(&self) -> u64 {
        self.position.load(Ordering::Relaxed)
    }

    pub(crate) fn at(&self, position: u64) {
        self.position.store(position, Ordering::Relaxed);
    }

    pub(crate) fn lost_samples(&self) -> u64 {
        self.lost_samples.load(Ordering::Relaxed)
    }

    pub(crate) fn lose_samples(&self, samples: u64) {
        self.lost_samples.fetch_add(samples, Ordering::Relaxed);
    }

    pub(crate) fn lost_notes(&self) -> u64 {
        self.lost_notes.load(Ordering::Relaxed)
    }

    pub(crate) fn lose_note(&self) {
        self.lost_notes.fetch_add(1, Ordering::Relaxed);
    }

    pub(crate) fn late_messages(&self) -> u64 {
        self.late_messages.load(Ordering::Relaxed)
    }

    pub(crate) fn send_late(&self) {
        self.late_messages.fetch_add(1, Ordering::Relaxed);
    }
}
