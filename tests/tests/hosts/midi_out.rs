//! The note output: what comes in passes through at its sample, and while a check is outside a message of the user's choice
//! is on, at positions that follow from the samples alone.

use clack_host::events::event_types::{
    MidiEvent, NoteChokeEvent, NoteExpressionEvent, NoteExpressionType, NoteOffEvent, NoteOnEvent,
};
use clack_host::events::spaces::CoreEventSpace;
use clack_host::events::{Match, UnknownEvent};
use clack_host::prelude::*;
use plumbtone_analysis::check::CheckSink;
use plumbtone_tests::clap_host::{Format, Instance, Running};

use crate::checks::{LANE, alone_into, sound};
use crate::rig::{instance, set, tone};

const RATE: f64 = 48_000.0;
/// How long after its place in the sound a message is sent, in samples: 1.25 s.
const DELAY: u64 = 60_000;
const BLOCKS: [&[usize]; 5] = [&[64], &[256], &[1024], &[333, 1, 4096, 17], &[16_384]];

/// Something that comes in: its sample, what puts it into a block, and what must come out.
type Input = (usize, Box<dyn Fn(u32, &mut EventBuffer)>, String);
/// An event at its sample of the whole render, in words.
type Told = (u64, String);

fn words(event: &UnknownEvent) -> String {
    match event.as_core_event() {
        Some(CoreEventSpace::NoteOn(e)) => format!("on {:?} {}", e.pckn(), e.velocity()),
        Some(CoreEventSpace::NoteOff(e)) => format!("off {:?} {}", e.pckn(), e.velocity()),
        Some(CoreEventSpace::NoteExpression(e)) => {
            format!("{:?} {:?} {}", e.expression_type(), e.pckn(), e.value())
        }
        Some(CoreEventSpace::Midi(e)) => format!("MIDI {:?}", e.data()),
        _ => format!("something else: {event:?}"),
    }
}

/// What came out of the last block, which began at a sample of the render.
fn came_out(running: &Running, from: usize) -> Vec<Told> {
    let at = |event: &UnknownEvent| from as u64 + u64::from(event.header().time());
    running.events_out().iter().map(|event| (at(event), words(event))).collect()
}

/// Plays a sound in blocks; `comes` puts in the events between two samples. Gives all that came out.
fn play(
    running: &mut Running,
    sound: &[f32],
    blocks: &[usize],
    mut comes: impl FnMut(usize, usize, &mut EventBuffer),
) -> Vec<Told> {
    let mut lengths = blocks.iter().copied().cycle();
    let (mut from, mut out) = (0, Vec::new());
    while from < sound.len() {
        let to = sound.len().min(from + lengths.next().unwrap_or(512));
        let mut events = EventBuffer::new();
        comes(from, to, &mut events);
        let block = &sound[from..to];
        let events = InputEvents::from_buffer(&events);
        running.process(&[block, block], &events, None).expect("it processes");
        let came = came_out(running, from);
        let ordered = came.is_sorted_by_key(|(at, _)| *at);
        assert!(ordered && came.iter().all(|&(at, _)| at < to as u64), "{came:?}");
        out.extend(came);
        from = to;
    }
    out
}

fn started(instance: &mut Instance, blocks: &[usize], offline: bool) -> Running {
    let block_max = blocks.iter().copied().max().unwrap_or(1);
    let format = Format { sample_rate_hz: RATE, block_max, channels: 2, offline };
    instance.start(format).expect("it starts")
}

fn put<E: AsRef<UnknownEvent>>(
    input: &mut Vec<Input>,
    at: usize,
    event: impl Fn(u32) -> E + 'static,
) {
    let said = words(event(0).as_ref());
    input.push((at, Box::new(move |time, events| events.push(event(time).as_ref())), said));
}

/// All kinds of note input.
fn input() -> Vec<Input> {
    let pckn = |channel: u8, key: u8, id: u8| {
        Pckn::new(0_u16, u16::from(channel), u16::from(key), u32::from(id))
    };
    let mut input: Vec<Input> = Vec::new();
    for k in 0..200_u8 {
        let (at, channel, key) = (37 * usize::from(k), k % 16, k % 128);
        let velocity = f64::from(k % 17) / 16.0;
        let voice = pckn(channel, key, k);
        put(&mut input, at, move |t| NoteOnEvent::new(t, voice, velocity));
        for data in [[0xb0 | channel, key, 100], [0xe0, key, k / 2], [0xd3, key, 0], [0xc5, key, 0]]
        {
            put(&mut input, at + 1, move |t| MidiEvent::new(t, 0, data));
        }
        for (kind, value) in
            [(NoteExpressionType::Pressure, 0.25), (NoteExpressionType::Tuning, -1.5)]
        {
            put(&mut input, at + 3, move |t| NoteExpressionEvent::new(t, voice, kind, value));
        }
        put(&mut input, at + 20, move |t| NoteOffEvent::new(t, voice, velocity));
    }
    // The framework sends no choke: the note ends all the same.
    let voice = pckn(1, 60, 7);
    put(&mut input, 8_000, move |t| NoteChokeEvent::new(t, voice));
    input.last_mut().expect("the choke").2 = words(NoteOffEvent::new(0, voice, 0.0).as_ref());
    input
}

#[test]
fn note_input_passes_through_at_its_sample() {
    let input = input();
    let expected: Vec<Told> =
        input.iter().map(|(at, _, said)| (*at as u64, said.clone())).collect();
    let quiet = vec![0.0; 9_000];
    // With and without anybody listening, waiting for the worker, and with blocks dropped since nothing paces them.
    for (armed, offline, sound) in
        [(false, false, &quiet), (true, true, &quiet), (true, false, &tone(5, 220.0, 3.0, RATE))]
    {
        for blocks in BLOCKS {
            let mut instance = instance();
            let check = set(&mut instance, "Check", if armed { "On" } else { "Off" }, 0);
            let mut running = started(&mut instance, blocks, offline);
            let out = play(&mut running, sound, blocks, |from, to, events| {
                events.push(&check);
                for (at, put, _) in input.iter().filter(|(at, ..)| (from..to).contains(at)) {
                    put(u32::try_from(at - from).expect("small"), events);
                }
            });
            instance.stop(running);
            assert_eq!(out.len(), expected.len(), "blocks of {blocks:?}");
            for (out, expected) in out.iter().zip(&expected) {
                assert_eq!(out, expected, "blocks of {blocks:?}, check armed: {armed}");
            }
        }
    }
}

#[test]
fn more_notes_than_a_block_has_room_for_pass_through_too() {
    let mut instance = instance();
    let mut running = started(&mut instance, &[4096], false);
    let note = |k: u32| NoteOnEvent::new(k, Pckn::new(0_u16, 0_u16, 60_u16, k), 0.5);
    let out = play(&mut running, &[0.0; 4096], &[4096], |_, _, events| {
        (0..3000).for_each(|k| events.push(&note(k)));
    });
    instance.stop(running);
    let expected: Vec<Told> = (0..3000).map(|k| (u64::from(k), words(note(k).as_ref()))).collect();
    assert!(out == expected, "{} events came out", out.len());
}

/// Where a message goes on and off.
#[derive(Default, Debug)]
struct Turns(Vec<(u64, bool)>);

impl CheckSink for Turns {
    fn established(&mut self, position: u64) {
        self.0.push((position + DELAY, true));
    }
    fn over(&mut self, position: u64) {
        self.0.push((position + DELAY, false));
    }
}

const NOTE: [&str; 2] = ["on", "off"];

/// What comes out while the lane of checks is played, with what else is set at which sample.
fn alarmed(blocks: &[usize], offline: bool, settings: &[(usize, &str, &str)]) -> Vec<Told> {
    let mut instance = instance();
    let sound = sound();
    let mut set_at: Vec<(usize, &str, &str)> = settings.to_vec();
    for (on, off) in LANE {
        set_at.extend([(on, "Check", "On"), (off, "Check", "Off")]);
    }
    set_at.sort_by_key(|&(at, ..)| at);
    let mut running = started(&mut instance, blocks, offline);
    let out = play(&mut running, &sound, blocks, |from, to, events| {
        for &(at, name, text) in set_at.iter().filter(|(at, ..)| (from..to).contains(at)) {
            let offset = u32::try_from(at - from).expect("small");
            events.push(&set(&mut instance, name, text, offset));
        }
    });
    instance.stop(running);
    out
}

#[test]
fn nothing_is_sent_unless_it_is_set() {
    assert_eq!(alarmed(&[512], true, &[]), [], "by default");
}

#[test]
fn outside_sends_at_the_same_sample_whatever_the_block() {
    // The lane's second check is the one that is outside.
    let mut turns = Turns::default();
    let shift = LANE[1].0 as u64;
    alone_into(&sound(), LANE[1], &mut turns);
    let positions: Vec<u64> = turns.0.iter().map(|&(at, _)| at).collect();
    assert!(matches!(turns.0[..], [(_, true), (_, false)]), "{turns:?}, from {shift} on");
    let key = Pckn::new(0_u16, 2_u16, 69_u16, Match::All);
    let (on, off) =
        (NoteOnEvent::new(0, key, f64::from(100.0_f32 / 127.0)), NoteOffEvent::new(0, key, 0.0));
    let note: Vec<Told> =
        positions.iter().copied().zip([words(on.as_ref()), words(off.as_ref())]).collect();
    let controller: Vec<Told> = positions
        .iter()
        .copied()
        .zip(
            [[0xb2, 69, 127], [0xb2, 69, 0]].map(|data| words(MidiEvent::new(0, 0, data).as_ref())),
        )
        .collect();
    let number = [(0, "MIDI number", "A4"), (0, "MIDI channel", "3")];
    for blocks in BLOCKS {
        for (output, expected) in [("Note", &note), ("Controller", &controller)] {
            let settings = [&[(0, "MIDI output", output)], &number[..]].concat();
            assert_eq!(
                &alarmed(blocks, true, &settings),
                expected,
                "{output}, blocks of {blocks:?}"
            );
        }
    }
}

/// Kinds and samples of what came out.
fn kinds(out: &[Told]) -> Vec<(u64, &str)> {
    out.iter().map(|(at, said)| (*at, said.split(' ').next().unwrap_or_default())).collect()
}

#[test]
fn what_is_on_goes_off_with_its_setting() {
    let usual = alarmed(&[512], true, &[(0, "MIDI output", "Note")]);
    let [(on, _), (off, _)] = usual[..] else { panic!("{usual:?}") };
    let middle = usize::try_from(on + 777).expect("small");
    let off_at = [(0, "MIDI output", "Note"), (middle, "MIDI output", "Off")];
    let expected = [(on, NOTE[0]), (middle as u64, NOTE[1])];
    assert_eq!(kinds(&alarmed(&[480], true, &off_at)), expected, "switched off");
    let other = [(0, "MIDI output", "Note"), (middle, "MIDI number", "72")];
    let expected =
        [(on, NOTE[0]), (middle as u64, NOTE[1]), (middle as u64, NOTE[0]), (off, NOTE[1])];
    let out = alarmed(&[480], true, &other);
    assert_eq!(kinds(&out), expected, "another note takes its place");
    // Between the kind and the velocity.
    let key = |(_, said): &Told| {
        said.split_once(' ')
            .and_then(|(_, rest)| rest.rsplit_once(' '))
            .expect("words")
            .0
            .to_owned()
    };
    assert_eq!(key(&out[0]), key(&out[1]), "the old one ends");
    assert_eq!(key(&out[2]), key(&out[3]), "the new one ends");
    assert_ne!(key(&out[1]), key(&out[2]), "the two are not the same");
}

#[test]
fn a_check_that_is_switched_off_while_outside_ends_it() {
    let mut instance = instance();
    let sound = sound();
    // Outside from 3.5 s on, and switched off at 4.5 s.
    let (begin, end) = (150_000, 216_000);
    let events = [
        (0, set(&mut instance, "MIDI output", "Controller", 0)),
        (begin, set(&mut instance, "Check", "On", 0)),
        (end, set(&mut instance, "Check", "Off", 0)),
    ];
    let mut running = started(&mut instance, &[480], true);
    let out = play(&mut running, &sound, &[480], |from, to, into| {
        for (_, event) in events.iter().filter(|(at, _)| (from..to).contains(at)) {
            into.push(event);
        }
    });
    instance.stop(running);
    let [on, off] = &out[..] else { panic!("{out:?}") };
    let placed = |at: u64| (at - DELAY) as f64 / RATE;
    assert!((placed(on.0) - 3.65).abs() < 0.03, "on at {} s", placed(on.0));
    assert!((placed(off.0) - 4.5).abs() < 0.02, "off at {} s", placed(off.0));
}

#[test]
fn a_new_stream_switches_off_what_is_on() {
    let sound = sound();
    for stop in [false, true] {
        let mut instance = instance();
        let events =
            [set(&mut instance, "MIDI output", "Note", 0), set(&mut instance, "Check", "On", 0)];
        let mut running = started(&mut instance, &[512], true);
        // It ends while the note is on.
        let out = play(&mut running, &sound[..260_000], &[512], |from, _, into| {
            if from == 0 {
                events.iter().for_each(|event| into.push(event));
            }
        });
        assert_eq!(kinds(&out).iter().map(|k| k.1).collect::<Vec<_>>(), ["on"], "{out:?}");
        if stop {
            instance.stop(running);
            running = started(&mut instance, &[512], true);
        } else {
            running.reset();
        }
        let out = play(&mut running, &sound[..20_000], &[512], |_, _, _| {});
        assert_eq!(kinds(&out), [(0, "off")], "stopped: {stop}");
        instance.stop(running);
    }
}
