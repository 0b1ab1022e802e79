//! Checks against the world outside, in one binary.
mod published_bounds;
