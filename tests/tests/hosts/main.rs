//! The plugin in hosts: as CLAP linked into this program and driven as a host does, as VST3 in hosts of others.

mod allocations;
mod automation;
mod bundles;
mod lifecycle;
mod live;
mod many;
mod pass_through;
mod rig;
mod session;
mod state;
mod text_entry;
mod whole_readings;
