//! The measurement of a whole note: every partial as a damped sinusoid, by maximum likelihood.
//!
//! The samples are turned once into one slow complex signal per partial ([`baseband`]): brought down by the partial's
//! expected phase and summed over blocks of 5 ms, which loses nothing and keeps white noise white. In each, a damped
//! exponential is looked for ([`coarse`]) and fitted ([`damped`]) in what the other partials leave ([`shares`]), round after
//! round until nothing moves ([`rows`]). Where the note's pitch moves, the expected phase moves along ([`path`]). [`lines`]
//! looks at the note through one long transform for what belongs to no partial, [`voices`] for detuned fundamentals beside the
//! first one, and [`clusters`] for partials of several lines.

pub(crate) mod assemble;
mod baseband;
mod clusters;
mod coarse;
mod damped;
pub(crate) mod lines;
pub(crate) mod note;
mod path;
mod rows;
mod shares;
mod voices;
