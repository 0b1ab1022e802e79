//! Note frequencies, intervals, temperaments and MIDI tuning codes against published values.

use plumbtone_analysis::tuning::{NoteName, Temperament, Tuning, cents, midi_tuning, ratio};

/// Index of each pitch class in a scale from C.
const C: usize = 0;
const CS: usize = 1;
const EB: usize = 3;
const E: usize = 4;
const GS: usize = 8;

fn assert_near(value: f64, expected: f64, tolerance: f64, what: &str) {
    let error = (value - expected).abs();
    assert!(error <= tolerance, "{what}: {value} for {expected}, off by {error:e}");
}

/// The interval from one pitch class up to another, in cents, 0 to 1200.
fn interval(scale: &[f64; 12], from: usize, to: usize) -> f64 {
    (scale[to] - scale[from]).rem_euclid(1200.0)
}

#[test]
fn equal_temperament_at_standard_pitch() {
    // ISO 16:1975 puts A4 at 440 Hz; f = 440 * 2^((m - 69) / 12).
    for (name, expected_hz) in [
        ("A4", 440.0),
        ("A0", 27.5),
        ("C1", 32.703196),
        ("E2", 82.406889),
        ("C4", 261.625565),
        ("C5", 523.251131),
        ("C8", 4186.009045),
        ("C-1", 8.175799),
        ("G9", 12543.853951),
    ] {
        let note: NoteName = name.parse().unwrap();
        assert_near(Tuning::default().frequency_hz(note), expected_hz, 1e-6, name);
        assert_eq!(note.to_string(), name, "read and written");
    }
    assert_eq!("C4".parse(), Ok(NoteName::from_midi(60)), "middle C");
}

#[test]
fn intervals_in_cents() {
    for (what, value, expected, tolerance) in [
        ("syntonic comma", 81.0 / 80.0, 21.506290, 1e-6),
        ("Pythagorean comma", 531441.0 / 524288.0, 23.460010, 1e-6),
        ("schisma", 32805.0 / 32768.0, 1.953721, 1e-6),
        ("diaschisma", 2048.0 / 2025.0, 19.5526, 1e-4),
        ("lesser diesis", 128.0 / 125.0, 41.0589, 1e-4),
        ("septimal comma", 64.0 / 63.0, 27.2641, 1e-4),
        ("pure fifth", 3.0 / 2.0, 701.955001, 1e-6),
        ("pure major third", 5.0 / 4.0, 386.313714, 1e-6),
        ("pure minor third", 6.0 / 5.0, 315.641287, 1e-6),
        ("48 kHz read as 44.1 kHz", 48000.0 / 44100.0, 146.7069, 1e-4),
        ("432 against 440 Hz", 432.0 / 440.0, -31.7667, 1e-4),
        ("440 to 441 Hz", 441.0 / 440.0, 3.93016, 1e-5),
        ("33 1/3 to 45 per minute", 45.0 * 3.0 / 100.0, 519.551, 1e-3),
    ] {
        assert_near(cents(value), expected, tolerance, what);
        assert_near(ratio(cents(value)), value, 1e-12, what);
    }
}

#[test]
fn temperament_table() {
    // Cents above C of C#, D, Eb, E, F, F#, G, G#, A, Bb, B. J. M. Barbour, Tuning and Temperament, 1951; T. Young, Phil.
    // Trans. R. Soc. 90:106-150, 1800; recomputed from the definitions there.
    #[rustfmt::skip]
    let table = [
        (Temperament::Equal, [100.0, 200.0, 300.0, 400.0, 500.0, 600.0, 700.0, 800.0, 900.0, 1000.0, 1100.0]),
        (Temperament::Pythagorean, [113.685, 203.910, 294.135, 407.820, 498.045, 611.730, 701.955, 815.640, 905.865, 996.090, 1109.775]),
        (Temperament::Meantone, [76.049, 193.157, 310.265, 386.314, 503.422, 579.471, 696.578, 772.627, 889.735, 1006.843, 1082.892]),
        (Temperament::Werckmeister3, [90.225, 192.180, 294.135, 390.225, 498.045, 588.270, 696.090, 792.180, 888.270, 996.090, 1092.180]),
        (Temperament::Kirnberger3, [90.225, 193.157, 294.135, 386.314, 498.045, 590.224, 696.578, 792.180, 889.735, 996.090, 1088.269]),
        (Temperament::Vallotti, [94.135, 196.090, 298.045, 392.180, 501.955, 592.180, 698.045, 796.090, 894.135, 1000.000, 1090.225]),
        (Temperament::Young1, [93.890, 195.845, 297.800, 391.690, 499.878, 591.935, 697.923, 795.845, 893.768, 999.755, 1091.813]),
        (Temperament::Young2, [90.225, 196.090, 294.135, 392.180, 498.045, 588.270, 698.045, 792.180, 894.135, 996.090, 1090.225]),
        (Temperament::Just, [111.731, 203.910, 315.641, 386.314, 498.045, 590.224, 701.955, 813.686, 884.359, 1017.596, 1088.269]),
    ];
    assert_eq!(table.len(), Temperament::ALL.len(), "every temperament has a row");
    for (temperament, expected) in table {
        let scale = temperament.cents_from_c();
        for (semitones, expected) in (1..).zip(expected) {
            assert_near(scale[semitones], expected, 6e-4, &format!("{temperament}, {semitones}"));
        }
    }
}

#[test]
fn frequencies_follow_the_table_with_a_in_common() {
    // Werckmeister III at 415 Hz: C lies 888.270 cents below A, so C4 is at 415 * 2^(-888.270 / 1200).
    let tuning = Tuning::new(415.0, Temperament::Werckmeister3).unwrap();
    let c4 = tuning.frequency_hz("C4".parse().unwrap());
    assert_near(cents(415.0 / c4), 888.270, 6e-4, "C4 to A4 in Werckmeister III");
}

#[test]
fn wolves_and_thirds() {
    let meantone = Temperament::Meantone.cents_from_c();
    let pythagorean = Temperament::Pythagorean.cents_from_c();
    assert_near(interval(&meantone, GS, EB), 737.637, 1e-3, "meantone wolf");
    assert_near(interval(&pythagorean, GS, EB), 678.495, 1e-3, "Pythagorean wolf");
    for (temperament, third) in [
        (Temperament::Werckmeister3, 390.225),
        (Temperament::Vallotti, 392.180),
        (Temperament::Kirnberger3, 386.314),
    ] {
        let scale = temperament.cents_from_c();
        assert_near(interval(&scale, C, E), third, 1e-3, &format!("{temperament}, C-E"));
    }
}

#[test]
fn well_temperaments_close_the_circle_and_keep_every_third_within_the_pythagorean_one() {
    for temperament in [
        Temperament::Werckmeister3,
        Temperament::Kirnberger3,
        Temperament::Vallotti,
        Temperament::Young1,
        Temperament::Young2,
    ] {
        let scale = temperament.cents_from_c();
        let fifths = (0..12).map(|note| interval(&scale, note, (note + 7) % 12));
        // No wolf: every fifth is pure or narrow by at most a quarter comma; together they make seven octaves.
        let sum = fifths.clone().inspect(|fifth| {
            assert!((696.0..701.956).contains(fifth), "{temperament}: a fifth of {fifth} cents");
        });
        assert_near(sum.sum(), 8400.0, 1e-9, temperament.name());
        let thirds = (0..12).map(|note| interval(&scale, note, (note + 4) % 12));
        let widest = thirds.fold(0.0, f64::max);
        let pythagorean = cents(81.0 / 64.0);
        assert!(widest < pythagorean + 1e-3, "{temperament}: a third of {widest} cents");
    }
    // These four reach it: C#-F is four pure fifths less two octaves.
    for temperament in [
        Temperament::Werckmeister3,
        Temperament::Kirnberger3,
        Temperament::Vallotti,
        Temperament::Young2,
    ] {
        let third = interval(&temperament.cents_from_c(), CS, 5);
        assert_near(third, 407.820, 1e-3, &format!("{temperament}, C#-F"));
    }
}

#[test]
fn pure_partials_against_equal_temperament() {
    // Partial n of a note falls on the equal-tempered note named here, and this far off it.
    let tuning = Tuning::default();
    let a2 = tuning.frequency_hz("A2".parse().unwrap());
    for (partial, name, rest) in [
        (3.0, "E4", 1.955),
        (5.0, "C#5", -13.686),
        (7.0, "G5", -31.174),
        (9.0, "B5", 3.910),
        (11.0, "Eb6", -48.682),
        (13.0, "F6", 40.528),
    ] {
        let nearest = tuning.nearest(partial * a2).unwrap();
        assert_eq!(nearest.note.to_string(), name, "partial {partial}");
        assert_near(nearest.cents, rest, 1e-3, &format!("partial {partial}"));
    }
}

#[test]
fn concert_pitches_against_the_standard() {
    for (pitch_hz, expected) in [
        (415.0, -101.271),
        (430.0, -39.800),
        (432.0, -31.767),
        (435.0, -19.786),
        (442.0, 7.851),
        (443.0, 11.764),
        (466.0, 99.392),
    ] {
        let a4 = Tuning::new(pitch_hz, Temperament::Equal).unwrap();
        let a4 = a4.frequency_hz("A4".parse().unwrap());
        assert_near(cents(a4 / 440.0), expected, 6e-4, &format!("{pitch_hz} Hz"));
    }
}

#[test]
fn midi_tuning_standard_codes() {
    // MIDI 1.0 Detailed Specification, "MIDI Tuning": codes by its formula. Its table of examples prints some of these
    // frequencies wrongly (8.2104 for 00 00 01, 12543.88 for 7F 00 00).
    for (frequency_hz, bytes) in [
        (432.0, [0x44, 0x57, 0x2B]),
        (442.0, [0x45, 0x0A, 0x06]),
        (415.0, [0x43, 0x7E, 0x30]),
        (439.9, [0x44, 0x7F, 0x40]),
        (440.0, [0x45, 0x00, 0x00]),
    ] {
        assert_eq!(midi_tuning::encode(frequency_hz), Some(bytes), "{frequency_hz} Hz");
    }
    for (bytes, frequency_hz) in [
        ([0x00, 0x00, 0x01], 8.175828),
        ([0x3C, 0x00, 0x00], 261.625565),
        ([0x3D, 0x00, 0x00], 277.182631),
        ([0x44, 0x7F, 0x7F], 439.998449),
        ([0x78, 0x00, 0x00], 8372.018090),
        ([0x78, 0x00, 0x01], 8372.047605),
        ([0x7F, 0x00, 0x00], 12543.853951),
        ([0x7F, 0x00, 0x01], 12543.898175),
        ([0x7F, 0x7F, 0x7E], 13289.656616),
    ] {
        let decoded = midi_tuning::decode(bytes).unwrap();
        assert_near(decoded, frequency_hz, 1e-6, &format!("{bytes:X?}"));
    }
    assert_eq!(midi_tuning::decode([0x7F, 0x7F, 0x7F]), None, "reserved: no change");
}
