//! Test sounds whose truth is known exactly: stiff tones, moving pitch, aliasing waves, mains hum, chords, drums, noise.
//!
//! Everything is computed in `f64` with true phases and narrowed to the engine's `f32` last, through [`narrow`]. The same
//! seed gives the same samples for ever: the random generator is the module's own. Cosine phases, levels and the stiff
//! series are those of the crate's conventions.
//!
//! ```
//! use plumbtone_analysis::signals::{Random, Timbre, Tone, add_noise, narrow};
//!
//! let mut random = Random::new(1);
//! let tone = Tone::random(&mut random, 48_000.0, 110.0, 2e-4, &Timbre::default());
//! let mut samples = tone.render(48_000);
//! add_noise(&mut random, &mut samples, 60.0);
//! assert_eq!(narrow(&samples).len(), 48_000);
//! ```

mod chord;
mod demo;
mod drums;
mod mains;
mod motion;
mod moving;
mod naive;
mod noise;
mod random;
mod samples;
mod tone;

pub use chord::{chord, render_together};
pub use demo::{Demo, demo};
pub use drums::{Drum, clicks};
pub use mains::Hum;
pub use motion::{Motion, Point, Vibrato};
pub use moving::MovingTone;
pub use naive::{NaiveWave, Shape, WavePartial};
pub use noise::{add_noise, white_noise};
pub use random::Random;
pub use samples::{add, add_at, amplitude, level_db, mean_power, narrow, sample_count};
pub use tone::{Timbre, Tone, TonePartial};
