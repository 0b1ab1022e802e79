//! In real time: paced by the clock, nothing is lost.

use std::thread;
use std::time::{Duration, Instant};

use clack_host::prelude::*;
use plumbtone_tests::clap_host::Format;

use crate::rig::{Log, instance, set, tone};

const RATE: f64 = 48_000.0;
const BLOCK: usize = 512;

#[test]
fn a_live_instance_with_a_check_armed_measures_without_gap() {
    let sound = tone(31, 220.0, 2.0, RATE);
    let log = Log::open();
    let mut instance = instance();
    let armed = set(&mut instance, "Check", "On", 0);
    let mut running =
        instance.start(Format { block_max: BLOCK, ..Format::default() }).expect("it starts");
    let start = Instant::now();
    for (number, block) in sound.chunks(BLOCK).enumerate() {
        let due = start + Duration::from_secs_f64((number * BLOCK) as f64 / RATE);
        thread::sleep(due.saturating_duration_since(Instant::now()));
        let mut events = EventBuffer::new();
        events.push(&armed);
        running
            .process(&[block, block], &InputEvents::from_buffer(&events), None)
            .expect("it processes");
    }
    // Dropping the instance leaves what is still in its ring; the pool gets a moment for it.
    thread::sleep(Duration::from_millis(500));
    instance.stop(running);
    let centres: Vec<u64> =
        log.readings().pop().expect("one log").iter().map(|reading| reading.centre).collect();
    let step = centres[1] - centres[0];
    let regular = centres.windows(2).all(|pair| pair[1] - pair[0] == step);
    assert!(regular, "no gap between readings: {centres:?}");
    let last = centres.last().copied().unwrap_or_default();
    assert!(last + 24_000 > sound.len() as u64, "measured up to {last} of {}", sound.len());
}
