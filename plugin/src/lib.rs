//! Plumbtone as a VST3 and CLAP plugin: audio passes through bit for bit while the engine measures it beside.
//!
//! The audio thread owns the [`tap`], which copies samples and marks into wait-free rings and does nothing else. A small
//! [`pool`] of threads, shared by all instances of the process, takes them out again and runs one [`analysis`] per
//! instance. What it finds goes to the [`editor`] as a [`readout`] of plain data through a triple buffer; single values
//! go both ways through the atomics of [`status`].
#![forbid(unsafe_code)]

mod analysis;
pub mod captures;
pub mod check;
mod controls;
mod convert;
mod delivery;
pub mod editor;
pub mod keys;
mod marks;
mod midi_out;
pub mod offset;
pub mod parameters;
mod plumbtone;
mod pool;
pub mod readings_log;
pub mod readout;
pub mod report_files;
pub mod session;
mod state;
mod status;
mod stored;
mod tap;
pub mod trail;
mod turns;
pub mod voices;

pub use plumbtone::Plumbtone;

nice_plug::nice_export_clap!(Plumbtone<true>);
nice_plug::nice_export_vst3!(Plumbtone<false>);
