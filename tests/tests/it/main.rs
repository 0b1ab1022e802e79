//! Checks against the world outside, in one binary.
mod accuracy_drift;
mod accuracy_moving;
mod accuracy_recorded;
mod accuracy_tones;
mod fixtures_soundfont;
mod properties_check;
mod properties_engine;
mod properties_tuning;
mod published_bounds;
mod published_descriptors;
mod published_stability;
mod published_tones;
mod published_tuning;
mod published_windows;
mod reference_estimators;
mod streaming;
mod verdicts;
