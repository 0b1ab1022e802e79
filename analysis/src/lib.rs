//! Plumbtone's engine: which partials a sound is made of, how far each lies off the harmonic series, what belongs to
//! no partial, and how sure each figure is.
//!
//! Pure computation: no file, window, host, thread or clock. Samples go into an [`Analyzer`]; [`Reading`]s on a fixed
//! grid, [`Note`]s and [`Gap`]s come out through a [`Sink`]. Cutting the input differently changes nothing.
//!
//! # Conventions
//! - Samples are `f32`, full scale 1.0. Levels are dBFS with 0 dBFS = a sine of peak amplitude 1.0.
//! - Frequencies are Hz, times sample counts (`u64`, from the first sample ever pushed) or seconds (`_s`).
//! - Partials are numbered from 1 (the fundamental); the model is `f_n = n * f0 * sqrt(1 + B * n^2)`, so `f0` is the
//!   model's and partial 1 lies at `f0 * sqrt(1 + B)`.
//! - Every deviation (`_sd`) is one standard deviation.
//! - Phases are cosine phases in radians: a partial is `A * cos(2 pi f t + phase)`.
#![forbid(unsafe_code)]

mod analyzer;
mod average;
pub mod check;
pub mod compare;
mod convert;
mod descriptors;
mod fundamental;
mod history;
mod instant;
pub mod keys;
pub mod masking;
mod measure;
mod note;
mod notes;
mod onset;
mod peaks;
mod reading;
pub mod recipe;
mod refine;
mod segment;
mod settings;
mod settle;
#[cfg(feature = "signals")]
pub mod signals;
mod spectrum;
mod stiff;
mod strays;
mod track;
pub mod tuning;
pub mod waveform;
pub mod window;

pub use analyzer::{Analyzer, Sink};
pub use descriptors::Descriptors;
pub use note::{Cluster, Note, NotePartial};
pub use reading::{Gap, GapReason, Partial, Pitch, Reading, State, Stray, StrayKind, Stretch};
pub use settings::{Settings, SettingsError};
pub use spectrum::TransformRuns;

/// Version of the engine.
pub const VERSION: &str = env!("CARGO_PKG_VERSION");
