//! What must hold for every course of readings under a drift check.

use std::f64::consts::TAU;

use plumbtone_analysis::check::{
    Check, CheckSettings, CheckSink, Outcome, Reference, Span, Verdict,
};
use plumbtone_analysis::signals::Random;
use plumbtone_analysis::tuning::ratio;
use plumbtone_analysis::{Gap, GapReason, Pitch, Reading, State};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngSeed};

const RATE_HZ: f64 = 48_000.0;
const HOP: usize = 480;

fn config() -> Config {
    Config {
        rng_seed: RngSeed::Fixed(5),
        failure_persistence: None,
        cases: 200,
        ..Config::default()
    }
}

/// A stretch of a course.
#[derive(Debug, Clone, Copy)]
enum Stretch {
    Pitch { readings: usize, cents: f64, slope: f64, swing: f64, noise: f64 },
    Silent(usize),
    Noise(usize),
    Gap(usize),
}

fn course() -> impl Strategy<Value = (u64, Vec<Stretch>)> {
    let pitch = (1_usize..200, -60.0..60.0, -20.0..20.0, 0.0..50.0, 0.01..3.0).prop_map(
        |(readings, cents, slope, swing, noise)| Stretch::Pitch {
            readings,
            cents,
            slope,
            swing: if swing < 25.0 { 0.0 } else { swing },
            noise,
        },
    );
    let stretch = prop_oneof![
        6 => pitch,
        1 => (1_usize..50).prop_map(Stretch::Silent),
        1 => (1_usize..50).prop_map(Stretch::Noise),
        1 => (1_usize..50).prop_map(Stretch::Gap),
    ];
    (any::<u64>(), prop::collection::vec(stretch, 1..12))
}

/// What goes into a check.
#[derive(Debug, Clone)]
enum Event {
    Reading(Reading),
    Gap(Gap),
}

/// The events of a course about a reference in Hz; `sign` mirrors it.
fn events((seed, stretches): &(u64, Vec<Stretch>), reference_hz: f64, sign: f64) -> Vec<Event> {
    let mut random = Random::new(*seed);
    let mut events = Vec::new();
    let mut centre: u64 = 0;
    for stretch in stretches {
        let (count, state) = match *stretch {
            Stretch::Pitch { readings, .. } => (readings, State::Steady),
            Stretch::Silent(readings) => (readings, State::Silent),
            Stretch::Noise(readings) => (readings, State::Unpitched),
            Stretch::Gap(readings) => {
                let end = centre + (readings * HOP) as u64;
                events.push(Event::Gap(Gap { start: centre, end, reason: GapReason::Lost }));
                centre = end;
                continue;
            }
        };
        for index in 0..count {
            let pitch = match *stretch {
                Stretch::Pitch { cents, slope, swing, noise, .. } => {
                    let time_s = index as f64 * HOP as f64 / RATE_HZ;
                    let vibrato = swing * (TAU * 5.5 * time_s).sin();
                    let cents = cents + slope * time_s + vibrato + noise * random.normal();
                    let f0_hz = reference_hz * ratio(sign * cents);
                    Some(Pitch { f0_hz, f0_sd_cents: noise, confidence: 0.9 })
                }
                _ => None,
            };
            events.push(Event::Reading(Reading {
                centre,
                state,
                pitch,
                level_dbfs: -20.0,
                ..Reading::default()
            }));
            centre += HOP as u64;
        }
    }
    events
}

#[derive(Default)]
struct Told(Vec<Span>);

impl CheckSink for Told {
    fn span(&mut self, span: &Span) {
        self.0.push(*span);
    }
}

#[expect(clippy::expect_used, reason = "a test's helper fails it as it should")]
fn run(events: &[Event], reference_hz: f64, tolerance_cents: f64, looks: bool) -> (Outcome, Told) {
    let settings = CheckSettings { tolerance_cents, ..CheckSettings::new(RATE_HZ, HOP) };
    let mut check =
        Check::new(&settings, Reference::Frequency(reference_hz)).expect("sound settings");
    let mut told = Told::default();
    for event in events {
        match event {
            Event::Reading(reading) => check.reading(reading, &mut told),
            Event::Gap(gap) => check.gap(gap, &mut told),
        }
        if looks {
            drop(check.outcome());
        }
    }
    check.finish(&mut told);
    (check.outcome(), told)
}

fn seconds(spans: &[Span]) -> f64 {
    spans.iter().map(|span| (span.end - span.start) as f64 / RATE_HZ).sum()
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn spans_are_in_order_long_enough_and_beyond_the_tolerance(course in course()) {
        let (outcome, told) = run(&events(&course, 220.0, 1.0), 220.0, 10.0, false);
        prop_assert_eq!(&outcome.spans, &told.0);
        for span in &outcome.spans {
            prop_assert!(span.end - span.start >= 7200, "{:?}", span);
            prop_assert!(span.worst_cents.abs() > 10.0 && span.mean_cents.abs() > 10.0, "{:?}", span);
            prop_assert!(span.worst_cents * span.mean_cents > 0.0, "{:?}", span);
            prop_assert!(outcome.worst_cents.unwrap().abs() >= span.worst_cents.abs(), "{:?}", outcome);
        }
        for pair in outcome.spans.windows(2) {
            prop_assert!(pair[0].end <= pair[1].start, "{:?}", pair);
        }
        let outside = matches!(outcome.verdict, Verdict::Outside);
        prop_assert!(!outside || !outcome.spans.is_empty(), "{:?}", outcome.verdict);
        prop_assert!(outcome.verdict != Verdict::Within || outcome.spans.is_empty());
        let shares = outcome.measured_share.into_iter().chain(outcome.vibrato.map(|v| v.share));
        for share in shares {
            prop_assert!((0.0..=1.0).contains(&share), "{:?}", outcome);
        }
        let figures = [outcome.worst_cents, outcome.mean_cents, outcome.drift.map(|d| d.sd)];
        prop_assert!(figures.iter().flatten().all(|x| x.is_finite()), "{:?}", outcome);
    }

    #[test]
    fn looking_at_it_on_the_way_changes_nothing(course in course()) {
        let events = events(&course, 220.0, 1.0);
        prop_assert_eq!(run(&events, 220.0, 10.0, true).0, run(&events, 220.0, 10.0, false).0);
    }

    #[test]
    fn transposing_sound_and_reference_changes_no_span(course in course()) {
        let low = run(&events(&course, 220.0, 1.0), 220.0, 10.0, false).0;
        let high = run(&events(&course, 233.0, 1.0), 233.0, 10.0, false).0;
        let (a, b) = (seconds(&low.spans), seconds(&high.spans));
        prop_assert!((a - b).abs() < 0.02, "{} s at 220 Hz, {} s at 233 Hz", a, b);
    }

    #[test]
    fn mirroring_mirrors(course in course()) {
        let up = run(&events(&course, 220.0, 1.0), 220.0, 10.0, false).0;
        let down = run(&events(&course, 220.0, -1.0), 220.0, 10.0, false).0;
        prop_assert!((seconds(&up.spans) - seconds(&down.spans)).abs() < 0.02);
        let (a, b) = (up.mean_cents.unwrap_or(0.0), down.mean_cents.unwrap_or(0.0));
        // Not to the last digit: how far neighbouring readings are taken to be independent depends on the pitch.
        prop_assert!((a + b).abs() < 0.05, "means {} and {}", a, b);
    }

    #[test]
    fn a_wider_tolerance_is_exceeded_for_no_longer(course in course()) {
        let events = events(&course, 220.0, 1.0);
        let times = [5.0, 10.0, 20.0, 40.0, 80.0]
            .map(|tolerance| seconds(&run(&events, 220.0, tolerance, false).0.spans));
        for pair in times.windows(2) {
            // What is too uncertain for one tolerance may be sure for another, and a span cut short by a crossing is not.
            prop_assert!(pair[1] <= pair[0] + 0.3, "{:?}", times);
        }
    }
}
