//! Captures taken by the parameter: what is kept is the engine's own reading, whatever the blocks, with no editor open.

use clack_host::prelude::*;
use plumbtone_analysis::Settings;
use plumbtone_plugin::captures::{Capture, Kept};
use plumbtone_tests::clap_host::{Format, Instance};
use plumbtone_tests::take::Take;

use crate::rig::{instance, json, set, tone};

const RATE: f64 = 48_000.0;
/// Where the lane switches Capture on and off: held, pressed for one sample while held is over, and in silence.
const LANE: [(usize, usize); 2] = [(30_000, 60_123), (100_001, 130_000)];

fn kept(instance: &mut Instance) -> Vec<Capture> {
    let state = json(&instance.save().expect("a state"));
    let text = state["fields"]["captures"].as_str().expect("the captures are kept");
    let kept: Kept = serde_json::from_str(text).expect("in their form");
    kept.captures.into_iter().map(|capture| Capture { time: String::new(), ..capture }).collect()
}

/// Renders a sound offline with Capture on over some stretches.
fn render(sound: &[f32], lane: &[(usize, usize)], block: usize) -> Vec<Capture> {
    let mut instance = instance();
    let format = Format { sample_rate_hz: RATE, block_max: block, channels: 2, offline: true };
    let mut running = instance.start(format).expect("it starts");
    for (number, part) in sound.chunks(block).enumerate() {
        let from = number * block;
        let mut events = EventBuffer::new();
        for &(on, off) in lane {
            for (at, text) in [(on, "On"), (off, "Off")] {
                if (from..from + part.len()).contains(&at) {
                    let offset = u32::try_from(at - from).expect("within the block");
                    events.push(&set(&mut instance, "Capture", text, offset));
                }
            }
        }
        let events = InputEvents::from_buffer(&events);
        running.process(&[part, part], &events, None).expect("it processes");
    }
    instance.stop(running);
    let found = kept(&mut instance);
    let saved = instance.save().expect("a state");
    let mut fresh = crate::rig::instance();
    fresh.load(saved.as_slice()).expect("it loads");
    assert_eq!(kept(&mut fresh), found, "captures survive the round trip");
    found
}

#[test]
fn each_time_it_is_switched_on_one_reading_is_kept_whatever_the_block() {
    let mut sound = tone(31, 220.0, 1.5, RATE);
    sound.extend(tone(32, 330.0, 1.5, RATE));
    let found = render(&sound, &LANE, 512);
    let notes: Vec<&str> = found.iter().map(Capture::note_name).collect();
    assert_eq!(notes, ["A3", "E4"], "one for each");
    for block in [64, 441, 4096] {
        assert_eq!(render(&sound, &LANE, block), found, "blocks of {block}");
    }
    // The first one was taken 0.4 s after somebody began to listen, where it was switched on.
    let mut engine = plumbtone_analysis::Analyzer::new(&Settings::new(RATE)).expect("settings");
    let mut take = Take::default();
    engine.skip(30_000, &mut take);
    engine.push(&sound[30_000..], &mut take);
    let reading = take.readings.iter().find(|r| r.centre >= 30_000 + 19_200).expect("a reading");
    assert_eq!(found[0].reading().pitch, reading.pitch, "the engine's own");
    assert_eq!(found[0].reading().partials, reading.partials, "figure for figure");
}

#[test]
fn silence_and_a_parameter_that_stays_on_keep_nothing() {
    let silence = vec![0.0; 96_000];
    assert_eq!(render(&silence, &[(10_000, 60_000)], 512), [], "no single pitch");
    let sound = tone(31, 220.0, 1.0, RATE);
    assert_eq!(render(&sound, &[(0, 96_000)], 512), [], "on from the start: nobody switched it on");
}
