//! The test sounds' stated truth against published values: stiff strings, Fourier series, folding. Whatever is measured on
//! these sounds rests on it.

use std::f64::consts::{FRAC_PI_2, PI};

use plumbtone_analysis::signals::{NaiveWave, Shape, Tone, WavePartial};
use plumbtone_analysis::tuning::cents;

const SAMPLE_RATE_HZ: f64 = 48_000.0;

fn assert_near(value: f64, expected: f64, tolerance: f64, what: &str) {
    let error = (value - expected).abs();
    assert!(error <= tolerance, "{what}: {value} for {expected}, off by {error:e}");
}

fn wave(shape: Shape, f0_hz: f64) -> NaiveWave {
    NaiveWave { sample_rate_hz: SAMPLE_RATE_HZ, shape, f0_hz, peak: 1.0, start_turns: 0.0 }
}

fn numbered(partials: &[WavePartial], number: u32) -> Option<WavePartial> {
    partials.iter().find(|partial| partial.number == number).copied()
}

#[test]
fn stiff_string_partials() {
    // H. Fletcher, JASA 36(1):203-209, 1964: 600 log2(1 + B n^2) cents over n f0.
    for (b, number, expected) in [
        (1e-4, 1, 0.0866),
        (1e-4, 2, 0.3462),
        (1e-4, 5, 2.1613),
        (1e-4, 10, 8.6132),
        (1e-4, 20, 33.9501),
        (1e-3, 10, 82.5021),
        (1e-2, 10, 600.0),
    ] {
        let harmonic = f64::from(number) * 220.0;
        let over = cents(Tone::frequency_of(220.0, b, number) / harmonic);
        assert_near(over, expected, 1e-4, &format!("B {b}, partial {number} over n f0"));
    }
    // Over the first partial, which is not f0.
    let first = Tone::frequency_of(220.0, 3e-4, 1);
    let over = cents(Tone::frequency_of(220.0, 3e-4, 10) / (10.0 * first));
    assert_near(over, 25.3270, 1e-4, "B 3e-4, partial 10 over 10 f1");
}

#[test]
fn fundamentals_of_unit_waves() {
    for (shape, expected_dbfs) in [(Shape::Square, 2.0982), (Shape::Saw, -3.9224)] {
        let first = wave(shape, 100.0).partials(-40.0)[0];
        assert_near(20.0 * first.amplitude.log10(), expected_dbfs, 1e-4, &format!("{shape:?}"));
    }
}

#[test]
fn fourier_series_of_standard_waves() {
    // Cosine phases at the start of the period. A saw rising from -1: 2/(pi n), +pi/2. A square starting at 1: 4/(pi n) for
    // odd n, -pi/2. A pulse of 25 % centred at 0: 2 sin(pi n / 4) / (pi n), phase 0, and n times pi/4 later if it starts
    // there.
    let partials = |shape| wave(shape, 100.0).partials(-30.0);
    let (saw, square) = (partials(Shape::Saw), partials(Shape::Square));
    let pulse = partials(Shape::Pulse(0.25));
    for n in [1, 2, 3, 5, 7, 10] {
        let x = f64::from(n);
        let partial = numbered(&saw, n).unwrap();
        assert_near(partial.amplitude, 2.0 / (PI * x), 1e-12, "saw");
        assert_near(partial.phase_rad, FRAC_PI_2, 1e-9, "saw, phase");
        if n % 2 == 1 {
            let partial = numbered(&square, n).unwrap();
            assert_near(partial.amplitude, 4.0 / (PI * x), 1e-12, "square");
            assert_near(partial.phase_rad, -FRAC_PI_2, 1e-9, "square, phase");
        }
        let partial = numbered(&pulse, n).unwrap();
        let centred = 2.0 * (PI * x / 4.0).sin() / (PI * x);
        let (size, phase) = (partial.amplitude, partial.phase_rad + PI * x / 4.0);
        assert_near(size * phase.cos(), centred, 1e-9, &format!("pulse, {n}"));
        assert_near(size * phase.sin(), 0.0, 1e-9, &format!("pulse, {n}"));
    }
    assert!(square.iter().all(|partial| partial.number % 2 == 1), "even partials in a square");
    assert!(pulse.iter().all(|partial| partial.number % 4 != 0), "fourth partials in a pulse");
}

#[test]
fn folded_partials() {
    // A partial sampled without band limit folds to |f - fs round(f / fs)| at its full amplitude.
    let partials = wave(Shape::Saw, 1234.5).partials(-40.0);
    for (number, frequency_hz, level_dbfs) in [(20, 23_310.0, -29.943), (40, 1_380.0, -35.964)] {
        let alias = numbered(&partials, number).unwrap();
        assert_near(alias.frequency_hz, frequency_hz, 1e-9, &format!("partial {number}"));
        assert_near(20.0 * alias.amplitude.log10(), level_dbfs, 1e-3, &format!("partial {number}"));
    }
}
