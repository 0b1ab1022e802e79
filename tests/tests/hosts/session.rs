//! Readings know where in the session they lie.

use clack_host::events::event_types::{TransportEvent, TransportFlags};
use clack_host::events::{EventFlags, EventHeader};
use clack_host::prelude::InputEvents;
use clack_host::utils::{BeatTime, SecondsTime};
use plumbtone_tests::clap_host::Format;
use plumbtone_tests::readings::Logged;

use crate::rig::{Log, instance, tone};

const RATE: f64 = 48_000.0;
/// Tempo in quarter notes a minute; the session is in 3/4.
const TEMPO: f64 = 90.0;
/// The session's time when the render begins, in seconds.
pub(crate) const START_S: f64 = 4.0;

pub(crate) fn transport(session_s: f64) -> TransportEvent {
    let beats = session_s * TEMPO / 60.0;
    let bar = (beats / 3.0).floor();
    TransportEvent {
        header: EventHeader::new_core(0, EventFlags::empty()),
        flags: TransportFlags::HAS_TEMPO
            | TransportFlags::HAS_BEATS_TIMELINE
            | TransportFlags::HAS_SECONDS_TIMELINE
            | TransportFlags::HAS_TIME_SIGNATURE
            | TransportFlags::IS_PLAYING,
        song_pos_beats: BeatTime::from_float(beats),
        song_pos_seconds: SecondsTime::from_float(session_s),
        tempo: TEMPO,
        tempo_inc: 0.0,
        loop_start_beats: BeatTime::from_float(0.0),
        loop_end_beats: BeatTime::from_float(0.0),
        loop_start_seconds: SecondsTime::from_float(0.0),
        loop_end_seconds: SecondsTime::from_float(0.0),
        bar_start: BeatTime::from_float(3.0 * bar),
        bar_number: i32::try_from(plumbtone_tests::cast::index(bar)).expect("few bars"),
        time_signature_numerator: 3,
        time_signature_denominator: 4,
    }
}

/// Renders a tone while the session plays; `session_s` gives the session's time for a stream position.
fn render(block: usize, session_s: impl Fn(usize) -> f64) -> Vec<Logged> {
    let sound = tone(41, 220.0, 2.0, RATE);
    let log = Log::open();
    let mut instance = instance();
    let format = Format { block_max: block, offline: true, ..Format::default() };
    let mut running = instance.start(format).expect("it starts");
    for (number, part) in sound.chunks(block).enumerate() {
        let told = transport(session_s(number * block));
        running.process(&[part, part], &InputEvents::empty(), Some(&told)).expect("it processes");
    }
    instance.stop(running);
    log.readings().pop().expect("one log")
}

#[test]
fn seconds_bars_and_beats_follow_the_transport() {
    for block in [512, 480, 64] {
        let readings = render(block, |at| START_S + at as f64 / RATE);
        assert!(readings.len() > 150, "{} readings in blocks of {block}", readings.len());
        for reading in &readings {
            let expected_s = START_S + reading.centre as f64 / RATE;
            let beats = expected_s * TEMPO / 60.0;
            let at = reading.session_s.expect("a session time");
            assert!((at - expected_s).abs() < 1e-4, "{at} s, not {expected_s}");
            let (bar, beat) = (reading.bar.expect("a bar"), reading.beat.expect("a beat"));
            let since_start = (bar - 1) as f64 * 3.0 + beat - 1.0;
            assert!((since_start - beats).abs() < 2e-3, "{bar}|{beat}, not {beats} beats");
        }
    }
}

#[test]
fn a_loop_jump_cuts_the_sound() {
    // The host jumps back by two seconds after the first: what is measured on either side does not mix.
    let jump = 48_128;
    let looped = render(512, |at| START_S + at as f64 / RATE - if at >= jump { 2.0 } else { 0.0 });
    let at = |reading: &Logged| reading.session_s.expect("a session time");
    for reading in &looped {
        let stream_s = reading.centre as f64 / RATE;
        let before = (at(reading) - (START_S + stream_s)).abs() < 1e-4;
        let after = (at(reading) - (START_S - 2.0 + stream_s)).abs() < 1e-4;
        let expected = if reading.centre < jump as u64 { before } else { after };
        assert!(expected, "{} s at sample {}", at(reading), reading.centre);
    }
    let straight = render(512, |at| START_S + at as f64 / RATE);
    assert_ne!(looped.len(), 0, "readings");
    assert!(straight.len() >= looped.len(), "{} against {}", straight.len(), looped.len());
}
