//! Saved states: round trips, pieces, damage.

use std::io::{self, Read};

use clack_host::prelude::*;
use plumbtone_tests::clap_host::{Format, Instance};

use crate::rig::{instance, set};

/// Hands out one byte at a time.
struct Drip<'a>(&'a [u8]);

impl Read for Drip<'_> {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let Some((&first, rest)) = self.0.split_first() else { return Ok(0) };
        let Some(slot) = buffer.first_mut() else { return Ok(0) };
        *slot = first;
        self.0 = rest;
        Ok(1)
    }
}

/// An instance whose parameters are all away from their defaults.
fn changed() -> Instance {
    let mut instance = instance();
    let mut running = instance.start(Format::default()).expect("it starts");
    let mut events = EventBuffer::new();
    for (name, text) in [
        ("Concert pitch", "415.3"),
        ("Temperament", "Young I"),
        ("Channel", "Side"),
        ("Lowest pitch", "50"),
        ("Highest pitch", "2000"),
        ("Integration time", "250"),
        ("Partials", "17"),
        ("Freeze", "On"),
        ("Capture", "On"),
        ("Check", "On"),
        ("Tolerance", "7.5"),
        ("Reference", "Reference pitch"),
        ("Reference pitch", "221.5"),
    ] {
        events.push(&set(&mut instance, name, text, 0));
    }
    let silence = [[0.0_f32; 64]; 2];
    let block: Vec<&[f32]> = silence.iter().map(<[f32; 64]>::as_slice).collect();
    running.process(&block, &InputEvents::from_buffer(&events), None).expect("it processes");
    instance.stop(running);
    instance
}

#[test]
fn a_state_survives_the_round_trip() {
    let saved = changed().save().expect("a state");
    assert_ne!(saved, instance().save().expect("a state"), "it is not the default");
    let mut fresh = instance();
    fresh.load(saved.as_slice()).expect("it loads");
    assert_eq!(fresh.save().expect("a state"), saved, "saved, loaded and saved again");
    let mut dripped = instance();
    dripped.load(Drip(&saved)).expect("it loads");
    assert_eq!(dripped.save().expect("a state"), saved, "loaded byte by byte");
}

#[test]
fn a_state_cut_short_leaves_the_old_one() {
    let saved = changed().save().expect("a state");
    let mut fresh = instance();
    let before = fresh.save().expect("a state");
    for length in 0..saved.len() {
        let loaded = fresh.load(&saved[..length]);
        assert!(loaded.is_err(), "{length} of {} bytes were taken", saved.len());
        assert_eq!(fresh.save().expect("a state"), before, "{length} of {} bytes", saved.len());
    }
}

#[test]
fn a_damaged_state_never_does_worse_than_defaults() {
    let saved = changed().save().expect("a state");
    let mut damaged_loads = 0;
    for at in 0..saved.len() {
        let mut damaged = saved.clone();
        damaged[at] = damaged[at].wrapping_add(1);
        let mut fresh = instance();
        if fresh.load(damaged.as_slice()).is_ok() {
            damaged_loads += 1;
        }
        let again = fresh.save().expect("a state");
        let mut other = instance();
        other.load(again.as_slice()).expect("what is saved can be loaded");
        assert_eq!(other.save().expect("a state"), again, "byte {at} damaged");
    }
    assert!(damaged_loads > 0, "some damage only touches single values");
}
