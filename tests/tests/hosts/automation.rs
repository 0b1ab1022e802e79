//! Parameters moved by the host.

use clack_host::prelude::*;
use plumbtone_tests::clap_host::Format;
use plumbtone_tests::readings::Logged;

use crate::rig::{Log, instance, set, tone};

const RATE: f64 = 48_000.0;

/// Renders left: A3, right: E4, and switches from left to right at a sample.
fn render_switch(block: usize, at: usize) -> Vec<Logged> {
    let sound = [tone(3, 220.0, 1.5, RATE), tone(4, 330.0, 1.5, RATE)];
    let log = Log::open();
    let mut instance = instance();
    let format = Format { block_max: block, offline: true, ..Format::default() };
    let mut running = instance.start(format).expect("it starts");
    let (mut from, total) = (0, sound[0].len());
    while from < total {
        let to = total.min(from + block);
        let mut events = EventBuffer::new();
        if from == 0 {
            events.push(&set(&mut instance, "Channel", "Left", 0));
        }
        if (from..to).contains(&at) {
            let offset = u32::try_from(at - from).expect("within the block");
            events.push(&set(&mut instance, "Channel", "Right", offset));
            events.push(&set(&mut instance, "Partials", "3", offset));
        }
        let part: Vec<&[f32]> = sound.iter().map(|channel| &channel[from..to]).collect();
        running.process(&part, &InputEvents::from_buffer(&events), None).expect("it processes");
        from = to;
    }
    instance.stop(running);
    log.readings().pop().expect("one log")
}

#[test]
fn automation_takes_effect_at_its_sample_whatever_the_block() {
    let at = 36_123;
    let reference = render_switch(512, at);
    for block in [64, 480, 4096] {
        assert_eq!(render_switch(block, at), reference, "blocks of {block}");
    }
    let near =
        |wanted: f64| move |r: &&Logged| r.f0_hz.is_some_and(|hz| (hz / wanted - 1.0).abs() < 0.01);
    let before = reference.iter().filter(|r| r.centre < 30_000).filter(near(220.0)).count();
    let after: Vec<&Logged> =
        reference.iter().filter(|r| r.centre > 48_000).filter(near(330.0)).collect();
    assert!(before > 40, "{before} readings of the left channel before the switch");
    assert!(after.len() > 40, "{} readings of the right channel after it", after.len());
    let most = after.iter().map(|r| r.partials.len()).max();
    assert_eq!(most, Some(3), "partials after the switch");
}

#[test]
fn the_plugin_shows_what_the_host_set() {
    let mut instance = instance();
    let mut running = instance.start(Format::default()).expect("it starts");
    let silence = [[0.0_f32; 64]; 2];
    let block: Vec<&[f32]> = silence.iter().map(<[f32; 64]>::as_slice).collect();
    for (name, text, shown) in [
        ("Concert pitch", "442", "442.00 Hz"),
        ("Temperament", "Vallotti", "Vallotti"),
        // Notes follow the concert pitch set above.
        ("Lowest pitch", "A1", "55.25 Hz"),
        ("Integration time", "0.25 s", "250 ms"),
        ("Partials", "64", "64"),
        ("Tolerance", "3.5 ct", "3.5 ct"),
        ("Reference", "Played notes", "Played notes"),
    ] {
        let mut events = EventBuffer::new();
        events.push(&set(&mut instance, name, text, 0));
        running.process(&block, &InputEvents::from_buffer(&events), None).expect("it processes");
        assert_eq!(instance.shown(name).expect("a text"), shown, "{name} set to {text}");
    }
    instance.stop(running);
}
