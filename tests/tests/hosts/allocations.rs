//! Nothing is allocated or freed on the audio thread.

use clack_host::events::event_types::NoteOnEvent;
use clack_host::prelude::*;
use nice_assert_no_alloc::{assert_no_alloc, violation_count};
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
