//! What the tests share: the linked plugin, sounds, and the readings that come out.

use std::path::Path;

use clack_host::events::event_types::ParamValueEvent;
use clack_host::prelude::Pckn;
use plumbtone_analysis::signals::{Random, Timbre, Tone, narrow, sample_count};
use plumbtone_plugin::readings_log::log_into;
use plumbtone_tests::clap_host::{Format, Instance, Library};
use plumbtone_tests::readings::{Logged, read_logs};
use serde_json::Value;
use tempfile::TempDir;

/// The plugin as linked into this program.
pub(crate) fn library() -> Library {
    Library::linked(&plumbtone_plugin::clap_entry).expect("the linked plugin loads")
}

/// A new instance of the linked plugin.
pub(crate) fn instance() -> Instance {
    Instance::new(&library()).expect("an instance is made")
}

/// Logs the readings of the instances that this thread makes while it lives.
pub(crate) struct Log(TempDir);

impl Log {
    pub(crate) fn open() -> Self {
        let folder = TempDir::new().expect("a temporary folder");
        log_into(Some(folder.path()));
        Self(folder)
    }

    /// The readings of each instance so far.
    pub(crate) fn readings(&self) -> Vec<Vec<Logged>> {
        read_logs(self.path()).expect("logs that can be read")
    }

    fn path(&self) -> &Path {
        self.0.path()
    }
}

impl Drop for Log {
    fn drop(&mut self) {
        log_into(None);
    }
}

/// Plays a sound offline through a new instance and returns the readings that came out.
pub(crate) fn render(sound: &[Vec<f32>], sample_rate_hz: f64, blocks: &[usize]) -> Vec<Logged> {
    let log = Log::open();
    let mut instance = instance();
    let block_max = blocks.iter().copied().max().unwrap_or(1);
    let format = Format { sample_rate_hz, block_max, channels: sound.len(), offline: true };
    let mut running = instance.start(format).expect("it starts");
    let equal = running.play(sound, blocks).expect("it processes");
    assert!(equal, "output equals input, {sample_rate_hz} Hz, blocks of {blocks:?}");
    instance.stop(running);
    log.readings().pop().expect("one log")
}

/// A steady tone of `f0_hz`, `seconds` long: the same samples for the same seed.
pub(crate) fn tone(seed: u64, f0_hz: f64, seconds: f64, sample_rate_hz: f64) -> Vec<f32> {
    let mut random = Random::new(seed);
    let timbre = Timbre { partials: 12, tilt_db_per_octave: -6.0, ..Timbre::default() };
    let tone = Tone::random(&mut random, sample_rate_hz, f0_hz, 1e-4, &timbre);
    narrow(&tone.render(sample_count(seconds, sample_rate_hz)))
}

/// Noise with every kind of awkward sample in it: negative zero, denormals, infinities, NaN.
pub(crate) fn awkward(seed: u64, length: usize) -> Vec<f32> {
    let mut random = Random::new(seed);
    let special = [-0.0, f32::MIN_POSITIVE / 4.0, f32::INFINITY, f32::NEG_INFINITY, f32::NAN, 1e30];
    (0..length)
        .map(|index| {
            if index % 37 == 36 {
                special[(index / 37) % special.len()]
            } else {
                narrow(&[random.normal()])[0]
            }
        })
        .collect()
}

/// An event that gives a parameter the value a text stands for, at a sample of the next block.
pub(crate) fn set(instance: &mut Instance, name: &str, text: &str, time: u32) -> ParamValueEvent {
    let (id, value) = instance.value(name, text).expect("a value");
    ParamValueEvent::new(time, id, Pckn::match_all(), value)
}

/// A saved state as what it holds.
pub(crate) fn json(state: &[u8]) -> Value {
    let start = state.iter().position(|&byte| byte == b'{').expect("the state is JSON");
    serde_json::from_slice(&state[start..]).expect("the state is JSON")
}

/// Loads a state of such a form.
pub(crate) fn load(instance: &mut Instance, state: &Value) {
    let text = serde_json::to_vec(state).expect("JSON");
    let length = u64::try_from(text.len()).expect("a length").to_le_bytes();
    instance.load([&length[..], &text].concat().as_slice()).expect("it loads");
}
