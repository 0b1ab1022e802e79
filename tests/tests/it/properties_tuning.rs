//! What must hold for every note, concert pitch and temperament.

use plumbtone_analysis::tuning::{NoteName, Temperament, Tuning, cents, midi_tuning, ratio};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngSeed};

/// Half a step of the MIDI Tuning Standard, in cents.
const HALF_STEP_CENTS: f64 = 50.0 / 16384.0;

/// The same cases in every run.
fn config() -> Config {
    Config { rng_seed: RngSeed::Fixed(69), failure_persistence: None, ..Config::default() }
}

fn tuning() -> impl Strategy<Value = Tuning> {
    (300.0..=600.0, prop::sample::select(&Temperament::ALL[..]))
        .prop_filter_map("a tuning", |(pitch_hz, temperament)| {
            Tuning::new(pitch_hz, temperament).ok()
        })
}

/// Frequencies spread evenly over the octaves.
fn frequency_hz() -> impl Strategy<Value = f64> {
    (-6.0..11.0).prop_map(|octaves: f64| 20.0 * octaves.exp2())
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn a_note_is_nearest_to_its_own_frequency(tuning in tuning(), number in -300_i16..300) {
        let note = NoteName::from_midi(number);
        let nearest = tuning.nearest(tuning.frequency_hz(note)).unwrap();
        prop_assert_eq!(nearest.note, note);
        prop_assert!(nearest.cents.abs() < 1e-9, "{:?}", nearest);
    }

    #[test]
    fn note_and_rest_make_the_frequency(tuning in tuning(), frequency_hz in frequency_hz()) {
        let nearest = tuning.nearest(frequency_hz).unwrap();
        let rebuilt_hz = tuning.frequency_hz(nearest.note) * ratio(nearest.cents);
        prop_assert!((rebuilt_hz / frequency_hz - 1.0).abs() < 1e-12, "{} Hz", rebuilt_hz);
    }

    #[test]
    fn no_other_note_is_nearer(tuning in tuning(), frequency_hz in frequency_hz()) {
        let nearest = tuning.nearest(frequency_hz).unwrap();
        for number in nearest.note.midi() - 24..nearest.note.midi() + 24 {
            let other = tuning.frequency_hz(NoteName::from_midi(number));
            let distance = cents(frequency_hz / other).abs();
            prop_assert!(distance >= nearest.cents.abs(), "{} is {} away", number, distance);
        }
    }

    #[test]
    fn an_octave_doubles(tuning in tuning(), number in -300_i16..300) {
        let [low, high] = [number, number + 12].map(|n| tuning.frequency_hz(NoteName::from_midi(n)));
        prop_assert!((high / low - 2.0).abs() < 1e-12, "{} and {} Hz", low, high);
    }

    #[test]
    fn midi_codes_lie_within_half_a_step(frequency_hz in 8.1758..13289.0_f64) {
        let bytes = midi_tuning::encode(frequency_hz).unwrap();
        let decoded_hz = midi_tuning::decode(bytes).unwrap();
        let error = cents(decoded_hz / frequency_hz).abs();
        prop_assert!(error < HALF_STEP_CENTS + 1e-9, "{:X?}: {} cents off", bytes, error);
    }

    #[test]
    fn any_text_is_a_note_or_an_error(text in "[A-Ha-h]?[#b]?[-+]?[0-9]{0,4}|\\PC*") {
        match text.parse::<NoteName>() {
            Ok(note) => prop_assert_eq!(note.to_string().parse(), Ok(note)),
            Err(error) => prop_assert_eq!(error.given, text),
        }
    }
}
