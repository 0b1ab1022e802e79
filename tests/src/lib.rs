//! Fixtures for the checks against the world outside.
pub mod bounds;
