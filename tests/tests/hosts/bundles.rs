//! The bundles as files, in hosts of others: CLAP loaded as a library, VST3 in the hosts dawdreamer and pedalboard.
//!
//! `cargo xtask test` makes the bundles and sets the hosts up. Without them these tests say what they skip; where the
//! variable CI is set nothing may be skipped.

use std::path::{Path, PathBuf};
use std::process::Command;

use plumbtone_analysis::Settings;
use plumbtone_analysis::signals::demo;
use plumbtone_tests::clap_host::{Format, Instance, Library};
use plumbtone_tests::readings::{VARIABLE, read_logs};
use plumbtone_tests::take::Take;

use crate::rig::tone;

/// Readings before the end of a sound that may depend on what follows it: half a second.
const LOOK_AHEAD_READINGS: usize = 50;

pub(crate) fn target() -> PathBuf {
    std::env::var_os("CARGO_TARGET_DIR")
        .map_or_else(|| Path::new(env!("CARGO_MANIFEST_DIR")).join("../target"), PathBuf::from)
}

/// The path, if something is there; says what is skipped if not.
pub(crate) fn there(path: PathBuf, what: &str) -> Option<PathBuf> {
    if path.exists() {
        return Some(path);
    }
    assert!(std::env::var_os("CI").is_none(), "{} is missing", path.display());
    println!("skipped: {what}; {} is missing (cargo xtask test makes it)", path.display());
    None
}

#[test]
fn the_clap_bundle_loads_and_passes_audio() {
    let Some(bundle) = there(target().join("bundled/Plumbtone.clap"), "the CLAP bundle") else {
        return;
    };
    let library = Library::load(&bundle).expect("the bundle loads");
    let mut instance = Instance::new(&library).expect("an instance");
    let mut running = instance.start(Format::default()).expect("it starts");
    let sound = vec![tone(51, 220.0, 0.2, 48_000.0); 2];
    assert!(running.play(&sound, &[512]).expect("it processes"), "output equals input");
    instance.stop(running);
}

#[test]
fn vst3_hosts_render_what_the_engine_measures() {
    let what = "the VST3 bundle in dawdreamer and pedalboard";
    let bundle = there(target().join("bundled/Plumbtone.vst3"), what);
    let python = there(target().join("vst3-hosts/bin/python"), what);
    let (Some(bundle), Some(python)) = (bundle, python) else { return };
    let folder = tempfile::TempDir::new().expect("a temporary folder");
    let sound = demo();
    let wav = folder.path().join("sound.f32");
    let bytes: Vec<u8> = sound.samples.iter().flat_map(|sample| sample.to_le_bytes()).collect();
    std::fs::write(&wav, bytes).expect("the sound is written");
    let engine = Take::of(&Settings::new(sound.sample_rate_hz), &sound.samples).expect("an engine");
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("hosts/vst3_hosts.py");
    for host in ["dawdreamer", "pedalboard"] {
        let logs = folder.path().join(host);
        let output = Command::new(&python)
            .arg(&script)
            .args([host, "render"])
            .args([&bundle, &wav])
            .arg(sound.sample_rate_hz.to_string())
            .env(VARIABLE, &logs)
            .output()
            .expect("the host starts");
        let said = String::from_utf8_lossy(&output.stdout);
        let errors = String::from_utf8_lossy(&output.stderr);
        assert!(output.status.success(), "{host}: {said}{errors}");
        let logs = read_logs(&logs).expect("logs that can be read");
        let streams: Vec<_> = logs
            .iter()
            .flat_map(|log| log.chunk_by(|a, b| a.stream == b.stream))
            .filter(|stream| stream.len() >= engine.readings.len())
            .collect();
        assert!(streams.len() >= 3, "{host}: {} whole renders", streams.len());
        for (number, stream) in streams.iter().enumerate() {
            // dawdreamer renders whole blocks, so silence follows the sound's last samples.
            let same = match host {
                "dawdreamer" => engine.readings.len() - LOOK_AHEAD_READINGS,
                _ => engine.readings.len(),
            };
            for (logged, reading) in stream.iter().zip(&engine.readings).take(same) {
                assert!(logged.is(reading), "{host}, render {number}, at {}", logged.centre);
            }
        }
    }
}

#[test]
fn vst3_hosts_pass_audio_and_keep_states() {
    let what = "the VST3 bundle in dawdreamer and pedalboard";
    let bundle = there(target().join("bundled/Plumbtone.vst3"), what);
    let python = there(target().join("vst3-hosts/bin/python"), what);
    let (Some(bundle), Some(python)) = (bundle, python) else { return };
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("hosts/vst3_hosts.py");
    for host in ["dawdreamer", "pedalboard"] {
        let output = Command::new(&python)
            .arg(&script)
            .args([host, "pass"])
            .arg(&bundle)
            .output()
            .expect("the host starts");
        let said = String::from_utf8_lossy(&output.stdout);
        let errors = String::from_utf8_lossy(&output.stderr);
        assert!(output.status.success(), "{host}: {said}{errors}");
    }
}
