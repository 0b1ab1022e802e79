//! The readings that come out are the engine's own, whatever the host's blocks and speed.

use plumbtone_analysis::Settings;
use plumbtone_analysis::signals::demo;
use plumbtone_tests::readings::Logged;
use plumbtone_tests::take::Take;

use crate::rig::{render, tone};

fn assert_same(logged: &[Logged], engine: &Take, what: &str) {
    assert_eq!(logged.len(), engine.readings.len(), "{what}: number of readings");
    for (logged, reading) in logged.iter().zip(&engine.readings) {
        assert!(logged.is(reading), "{what} at {}: {logged:?} against {reading:?}", logged.centre);
    }
}

#[test]
fn an_offline_render_equals_the_engine_alone() {
    let sound = demo();
    let engine = Take::of(&Settings::new(sound.sample_rate_hz), &sound.samples).expect("an engine");
    let channels = vec![sound.samples.clone(); 2];
    for blocks in [&[512][..], &[4096], &[480], &[1, 511, 17, 4096, 64, 3]] {
        let logged = render(&channels, sound.sample_rate_hz, blocks);
        assert_same(&logged, &engine, &format!("blocks of {blocks:?}"));
    }
}

#[test]
fn three_renders_are_identical() {
    let sound = vec![tone(11, 146.8, 2.0, 44_100.0); 2];
    let first = render(&sound, 44_100.0, &[512]);
    assert!(first.iter().any(|r| !r.partials.is_empty()), "partials were found");
    for again in 0..2 {
        assert_eq!(render(&sound, 44_100.0, &[512]), first, "render {again}");
    }
}

#[test]
fn mono_and_every_rate_equal_the_engine_alone() {
    for sample_rate_hz in [44_100.0, 96_000.0, 192_000.0] {
        let sound = tone(12, 220.0, 0.7, sample_rate_hz);
        let engine = Take::of(&Settings::new(sample_rate_hz), &sound).expect("an engine");
        let logged = render(&[sound], sample_rate_hz, &[512]);
        assert_same(&logged, &engine, &format!("{sample_rate_hz} Hz"));
    }
}
