//! Fixtures for the checks against the world outside.

pub mod bounds;
pub mod cast;
pub mod figures;
pub mod lowest_peak;
pub mod periodicity;
pub mod recorded;
pub mod soundfont;
pub mod take;
