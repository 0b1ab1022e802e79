//! The plugin in hosts: as CLAP linked into this program and driven as a host does, as VST3 in hosts of others.
#![expect(clippy::expect_used, reason = "the helpers of these tests fail them as they should")]
#![expect(clippy::print_stdout, reason = "what is skipped has to be said")]

mod allocations;
mod automation;
mod bundles;
mod bundles_checks;
mod captures;
mod checks;
mod editor;
mod keys;
mod lifecycle;
mod live;
mod many;
mod midi_out;
mod pass_through;
mod rig;
mod session;
mod state;
mod text_entry;
mod the_program;
mod whole_readings;
