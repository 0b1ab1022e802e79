//! Checks against the world outside, in one binary.
mod properties_tuning;
mod published_bounds;
mod published_descriptors;
mod published_tones;
mod published_tuning;
mod published_windows;
