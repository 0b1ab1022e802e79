//! Nothing is allocated or freed on the audio thread, nor by the engine once it is built.

use clack_host::events::event_types::NoteOnEvent;
use clack_host::prelude::*;
use nice_assert_no_alloc::{assert_no_alloc, violation_count};
use plumbtone_analysis::signals::{Random, Timbre, Tone, add_at, add_noise, narrow};
use plumbtone_analysis::{Analyzer, Settings, Sink};
use plumbtone_tests::clap_host::Format;

use crate::rig::{awkward, instance, set};

/// Blocks: enough to fill the ring over and over, for nothing paces them.
const BLOCKS: usize = 2_000;
const BLOCK: usize = 256;

#[test]
fn the_guard_counts_an_allocation() {
    let before = violation_count();
    let kept = assert_no_alloc(|| vec![1_u8; 100]);
    assert!(violation_count() > before, "{} bytes went unnoticed", kept.len());
}

#[test]
fn blocks_with_notes_automation_and_overruns_allocate_nothing() {
    let sound = [awkward(1, BLOCK), awkward(2, BLOCK)];
    let block: Vec<&[f32]> = sound.iter().map(Vec::as_slice).collect();
    let mut instance = instance();
    let armed = set(&mut instance, "Check", "On", 0);
    let channels =
        ["Mid", "Left", "Right", "Side"].map(|name| set(&mut instance, "Channel", name, 9));
    let mut running =
        instance.start(Format { block_max: BLOCK, ..Format::default() }).expect("it starts");
    let before = violation_count();
    for number in 0..BLOCKS {
        let mut events = EventBuffer::with_capacity(8);
        events.push(&armed);
        events.push(&channels[number % channels.len()]);
        events.push(&NoteOnEvent::new(10, Pckn::new(0_u16, 0_u16, 60_u16, 1_u32), 0.5));
        if number % 500 == 499 {
            running.reset();
        }
        running.process(&block, &InputEvents::from_buffer(&events), None).expect("it processes");
    }
    assert_eq!(violation_count(), before, "allocations in {BLOCKS} blocks");
    instance.stop(running);
}

/// A sink that asks for all there is and keeps nothing.
struct Greedy;

impl Sink for Greedy {
    fn wants_live(&self) -> bool {
        true
    }
}

#[test]
fn an_engine_that_is_built_allocates_nothing() {
    for rate in [8_000.0, 48_000.0] {
        let sound = eventful(rate);
        let mut analyzer = Analyzer::new(&Settings { partials: 128, ..Settings::new(rate) })
            .expect("they are sound");
        let before = violation_count();
        assert_no_alloc(|| {
            for (number, block) in sound.chunks(997).enumerate() {
                analyzer.push(block, &mut Greedy);
                if number % 50 == 49 {
                    analyzer.skip(100, &mut Greedy);
                }
            }
            analyzer.finish(&mut Greedy);
            analyzer.push(&sound, &mut Greedy);
            analyzer.reset();
            analyzer.push(&[f32::NAN; 7], &mut Greedy);
            analyzer.finish(&mut Greedy);
        });
        assert_eq!(violation_count(), before, "allocations at {rate} Hz");
    }
}

/// Notes of all registers, some at once, one of more than the longest stretch that is measured whole, then silence and noise.
fn eventful(rate: f64) -> Vec<f32> {
    let mut random = Random::new(11);
    let second = |s: f64| plumbtone_analysis::signals::sample_count(s, rate);
    let mut sound = vec![0.0; second(14.0)];
    for (at_s, long_s, f0) in [
        (0.1, 0.5, 55.0),
        (0.6, 0.4, 440.0),
        (1.0, 7.5, 110.0),
        (9.0, 1.0, 220.0),
        (9.0, 1.0, 277.0),
    ] {
        let timbre = Timbre { partials: 128, ..Timbre::default() };
        let tone = Tone::random(&mut random, rate, f0, 2e-4, &timbre);
        add_at(&mut sound, second(at_s), &tone.render(second(long_s)));
    }
    add_noise(&mut random, &mut sound, 50.0);
    sound[second(11.0)..second(12.0)].fill(0.0);
    narrow(&sound)
}
