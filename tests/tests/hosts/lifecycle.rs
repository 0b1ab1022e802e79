//! Activating, resetting, rate changes: in any order.

use plumbtone_analysis::signals::Random;
use plumbtone_tests::clap_host::{Format, Running};

use crate::rig::{Log, awkward, instance, tone};

#[test]
fn any_order_of_calls_keeps_passing_audio() {
    let sound = [awkward(5, 3_000), awkward(6, 3_000)];
    for seed in 0..20 {
        let mut random = Random::new(seed);
        let mut instance = instance();
        let mut running: Option<Running> = None;
        for step in 0..30 {
            running = match (running.take(), random.pick(&[0, 1, 2, 3])) {
                (Some(running), 0) => {
                    instance.stop(running);
                    None
                }
                (Some(mut running), 1) => {
                    running.reset();
                    Some(running)
                }
                (Some(mut running), _) => {
                    let blocks = [random.pick(&[1, 64, 333, 512])];
                    let equal = running.play(&sound, &blocks).expect("it processes");
                    assert!(equal, "seed {seed}, step {step}");
                    Some(running)
                }
                (None, _) => {
                    let format = Format {
                        sample_rate_hz: random.pick(&[44_100.0, 48_000.0, 96_000.0, 192_000.0]),
                        block_max: 512,
                        channels: 2,
                        offline: random.pick(&[false, true]),
                    };
                    Some(instance.start(format).expect("it starts"))
                }
            };
        }
        if let Some(running) = running {
            instance.stop(running);
        }
    }
}

#[test]
fn another_sample_rate_measures_the_same_pitch() {
    let log = Log::open();
    let mut instance = instance();
    for sample_rate_hz in [44_100.0, 96_000.0, 48_000.0] {
        let sound = vec![tone(8, 220.0, 1.0, sample_rate_hz); 2];
        let format = Format { sample_rate_hz, offline: true, ..Format::default() };
        let mut running = instance.start(format).expect("it starts");
        running.play(&sound, &[512]).expect("it processes");
        instance.stop(running);
        let readings = log.readings().pop().expect("one log");
        let last = readings.last().expect("readings").stream;
        let middle = readings.iter().rfind(|r| r.stream == last && r.partials.len() > 3);
        let f0_hz = middle.and_then(|r| r.f0_hz).expect("a pitch");
        assert!((f0_hz / 220.0 - 1.0).abs() < 1e-3, "{f0_hz} Hz at a rate of {sample_rate_hz} Hz");
    }
}

#[test]
fn a_reset_begins_at_position_zero() {
    let log = Log::open();
    let mut instance = instance();
    let sound = vec![tone(9, 330.0, 0.8, 48_000.0); 2];
    let mut running =
        instance.start(Format { offline: true, ..Format::default() }).expect("it starts");
    for _ in 0..3 {
        running.play(&sound, &[512]).expect("it processes");
        running.reset();
    }
    instance.stop(running);
    let readings = log.readings().pop().expect("one log");
    let of = |stream| -> Vec<_> {
        let stream_of = |r: &&_| matches!(r, plumbtone_tests::readings::Logged { stream: s, .. } if *s == stream);
        readings
            .iter()
            .filter(stream_of)
            .cloned()
            .map(|mut r| {
                r.stream = 0;
                r
            })
            .collect()
    };
    let first = readings.first().expect("readings").stream;
    assert!(of(first).len() > 50, "{} readings", of(first).len());
    for stream in [first + 1, first + 2] {
        assert_eq!(of(stream), of(first), "stream {stream}");
    }
}
