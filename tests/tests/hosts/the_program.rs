//! The plugin and the program `plumbtone` say the same of the same samples, bit for bit.

use std::path::Path;
use std::process::Command;

use plumbtone_tests::readings::Logged;
use serde::Deserialize;
use tempfile::TempDir;

use crate::bundles::{target, there};
use crate::rig::{render, tone};

const RATE_HZ: u32 = 48_000;

/// As much of the program's JSON as the plugin logs.
#[derive(Deserialize)]
struct Measured {
    frames: Vec<Frame>,
}

#[derive(Deserialize)]
struct Frame {
    time_s: f64,
    state: String,
    f0_hz: Option<f64>,
    f0_sd_cents: Option<f64>,
    confidence: Option<f64>,
    level_dbfs: Option<f64>,
}

impl Frame {
    fn is(&self, logged: &Logged) -> bool {
        let bits = |x: Option<f64>| x.map(f64::to_bits);
        let at = logged.centre as f64 / f64::from(RATE_HZ);
        self.time_s.to_bits() == at.to_bits()
            && self.state == logged.state
            && bits(self.f0_hz) == bits(logged.f0_hz)
            && bits(self.f0_sd_cents) == bits(logged.f0_sd_cents)
            && bits(self.confidence) == bits(logged.confidence)
            && bits(self.level_dbfs) == bits(logged.level_dbfs)
    }
}

#[test]
fn the_middle_of_a_stereo_file_measures_alike() {
    let program = target().join("debug/plumbtone").with_extension(std::env::consts::EXE_EXTENSION);
    let Some(program) = there(program, "the comparison with the program") else { return };
    let rate = f64::from(RATE_HZ);
    let sides = [tone(61, 196.0, 1.3, rate), tone(62, 196.4, 1.3, rate)];
    let folder = TempDir::new().expect("a temporary folder");
    let file = folder.path().join("stereo.wav");
    write_stereo(&file, &sides);
    let output =
        Command::new(program).args(["measure", "--json"]).arg(&file).output().expect("it runs");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let said: Measured = serde_json::from_slice(&output.stdout).expect("JSON");
    let logged = render(&sides, rate, &[512]);
    assert_eq!(said.frames.len(), logged.len(), "number of readings");
    assert!(said.frames.iter().any(|f| f.f0_hz.is_some()), "a pitch was found");
    for (frame, logged) in said.frames.iter().zip(&logged) {
        assert!(frame.is(logged), "{} s: {logged:?}", frame.time_s);
    }
}

/// A file of floating-point samples.
pub(crate) fn write_stereo(file: &Path, sides: &[Vec<f32>; 2]) {
    let format = hound::WavSpec {
        channels: 2,
        sample_rate: RATE_HZ,
        bits_per_sample: 32,
        sample_format: hound::SampleFormat::Float,
    };
    let mut writer = hound::WavWriter::create(file, format).expect("a file");
    for (left, right) in sides[0].iter().zip(&sides[1]) {
        writer.write_sample(*left).expect("it is written");
        writer.write_sample(*right).expect("it is written");
    }
    writer.finalize().expect("it is closed");
}
