//! A sounding note, measured whole: the averaged figures of everything between its onset and its end.

use crate::descriptors::Descriptors;
use crate::reading::{Stray, Stretch};

/// The lines that a partial is made of, when there are several.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cluster {
    /// How many, from 26 dB under the strongest on.
    pub lines: u32,
    /// From the lowest to the highest, in cents.
    pub spread_cents: f64,
    /// Rate at which the two strongest beat, in Hz.
    pub beat_hz: f64,
}

/// One partial of a note.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NotePartial {
    /// Partial number, from 1.
    pub number: u32,
    /// Mean frequency over the note, in Hz.
    pub frequency_hz: f64,
    /// Standard deviation of the frequency, in Hz.
    pub frequency_sd_hz: f64,
    /// Distance from `number * f0`, in cents.
    pub cents_from_harmonic: f64,
    /// Standard deviation of that distance, in cents.
    pub cents_sd: f64,
    /// Level at the note's start, in dBFS: the fitted decay line there.
    pub level_dbfs: f64,
    /// Standard deviation of that level, in dB.
    pub level_sd_db: f64,
    /// Level at the start relative to the strongest partial, in dB (0 or less).
    pub level_relative_db: f64,
    /// Mean power over the note, as a level in dBFS.
    pub level_mean_dbfs: f64,
    /// Cosine phase at the note's start, in radians, -pi to pi.
    pub phase_rad: f64,
    /// Decay, in dB per second; positive when the partial falls.
    pub decay_db_per_s: f64,
    /// Standard deviation of the decay, in dB per second.
    pub decay_sd: f64,
    /// Mean power over the noise within a bandwidth of 1 Hz (an observation of one second), in dB.
    pub snr_db: f64,
    /// What it is made of, when it is no single line: the figures above then stand for all of it together.
    pub cluster: Option<Cluster>,
}

/// One sounding note.
#[derive(Debug, Clone, Default)]
pub struct Note {
    /// Sample position of the onset.
    pub start: u64,
    /// Sample position after the last sample that belongs to it.
    pub end: u64,
    /// Fundamental of the stiff-string model, averaged over the note, in Hz.
    pub f0_hz: f64,
    /// Its standard deviation, in cents.
    pub f0_sd_cents: f64,
    /// Inharmonicity, when two partials or more allow an estimate.
    pub stretch: Option<Stretch>,
    /// Partials found, by rising number.
    pub partials: Vec<NotePartial>,
    /// Strays found, strongest first, at most [`Note::STRAYS_MAX`].
    pub strays: Vec<Stray>,
    /// How many more strays there were than the list holds.
    pub strays_left_out: usize,
    /// What the partials say together.
    pub descriptors: Descriptors,
}

impl Note {
    /// Most strays that a note lists.
    pub const STRAYS_MAX: usize = 2048;
}
