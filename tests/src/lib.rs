//! Fixtures for the checks against the world outside.

pub mod bounds;
pub mod cast;
pub mod clap_host;
pub mod estimators;
pub mod figures;
pub mod lowest_peak;
pub mod periodicity;
pub mod readings;
pub mod recorded;
pub mod soundfont;
pub mod take;
