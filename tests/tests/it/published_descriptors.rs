//! Descriptors of the standard waves against closed forms of their Fourier series. THD: D. Shmilovitz, IEEE Trans. Power
//! Delivery 20(1):526-528, 2005.

use std::f64::consts::PI;

use plumbtone_analysis::signals::{Random, Timbre, Tone, add_noise, narrow};
use plumbtone_analysis::{Descriptors, Settings};
use plumbtone_tests::take::Take;

/// Partials of a wave: the number and the amplitude that a Fourier series gives for it.
fn wave(partials: u32, amplitude: fn(f64) -> f64) -> impl Iterator<Item = (u32, f64)> + Clone {
    (1..=partials).map(move |n| (n, amplitude(f64::from(n))))
}

fn saw(n: f64) -> f64 {
    2.0 / (PI * n)
}

fn square(n: f64) -> f64 {
    if n % 2.0 > 0.5 { 2.0 * saw(n) } else { 0.0 }
}

fn triangle(n: f64) -> f64 {
    square(n) * 2.0 / (PI * n)
}

/// 1 for the share D of the period, else 0.
fn pulse<const PERCENT: u32>(n: f64) -> f64 {
    (saw(n) * (n * PI * f64::from(PERCENT) / 100.0).sin()).abs()
}

/// Full-wave rectified sine, over twice the sine's frequency.
fn rectified(n: f64) -> f64 {
    4.0 / (PI * (4.0 * n * n - 1.0))
}

fn assert_near(value: Option<f64>, expected: f64, tolerance: f64, what: &str) {
    let near = value.is_some_and(|value| (value - expected).abs() <= tolerance);
    assert!(near, "{what}: {value:?} for {expected}");
}

#[test]
fn thd_of_ideal_waves() {
    // Whole series; the tail that a million partials leave out lies below the last printed digit.
    for (what, amplitude, thd_f, thd_r) in [
        ("square", square as fn(f64) -> f64, 48.3426, Some(43.5236)),
        ("saw", saw, 80.3078, Some(62.6157)),
        ("triangle", triangle, 12.1153, Some(12.0274)),
        ("pulse of 25 %", pulse::<25>, 92.225, None),
        ("pulse of 10 %", pulse::<10>, 191.076, None),
        ("rectified sine", rectified, 22.727, None),
    ] {
        let all = Descriptors::of(wave(1_000_000, amplitude), None);
        assert_near(all.thd_f_percent, thd_f, 1e-3, what);
        if let Some(thd_r) = thd_r {
            assert_near(all.thd_r_percent, thd_r, 1e-3, what);
        }
    }
}

#[test]
fn distortion_against_the_total_is_sinad() {
    // IEEE Std 1241: signal, noise and distortion over noise and distortion, which is 1 / THD_R without noise.
    for (what, amplitude, sinad_db) in [
        ("square", square as fn(f64) -> f64, 7.2255),
        ("saw", saw, 4.0663),
        ("triangle", triangle, 18.3966),
    ] {
        let all = Descriptors::of(wave(1_000_000, amplitude), None);
        let found_db = all.thd_r_percent.map(|percent| -20.0 * (percent / 100.0).log10());
        assert_near(found_db, sinad_db, 1e-3, what);
    }
}

#[test]
fn thd_of_the_first_harmonics() {
    for (what, amplitude, first_20, first_40) in [
        ("saw", saw as fn(f64) -> f64, 77.2116, 78.7556),
        ("square", square, 45.6860, 47.0322),
        ("triangle", triangle, 12.1067, 12.1142),
    ] {
        for (partials, expected) in [(20, first_20), (40, first_40)] {
            let found = Descriptors::of(wave(partials, amplitude), None).thd_f_percent;
            assert_near(found, expected, 1e-3, &format!("{what}, {partials} partials"));
        }
    }
}

#[test]
fn balance_of_a_saw() {
    let d = Descriptors::of(wave(20, saw), None);
    let tristimulus = d.tristimulus.unwrap();
    for (part, expected) in tristimulus.into_iter().zip([0.277952, 0.301115, 0.420933]) {
        assert_near(Some(part), expected, 1e-6, &format!("tristimulus {tristimulus:?}"));
    }
    assert_near(d.centroid_partial, 5.55905, 1e-5, "centroid of amplitudes");
    assert_near(d.odd_even_db, 4.9412, 1e-4, "odd over even, 1 included");
    // An endless saw: odd partials hold pi^2/8, even ones pi^2/24 of the same unit, a ratio of 3.
    let endless = Descriptors::of(wave(1_000_000, saw), None);
    assert_near(endless.odd_even_db, 4.7712, 1e-4, "odd over even of an endless saw");
}

#[test]
fn tristimulus_of_a_square() {
    let tristimulus = Descriptors::of(wave(19, square), None).tristimulus.unwrap();
    for (part, expected) in tristimulus.into_iter().zip([0.468767, 0.156256, 0.374977]) {
        assert_near(Some(part), expected, 1e-6, &format!("{tristimulus:?}"));
    }
}

#[test]
fn slopes_of_ideal_waves() {
    let tilt = |amplitude| Descriptors::of(wave(40, amplitude), None).tilt_db_per_octave;
    assert_near(tilt(saw), -6.0206, 1e-4, "saw");
    assert_near(tilt(square), -6.0206, 1e-4, "square");
    assert_near(tilt(triangle), -12.0412, 1e-4, "triangle");
}

#[test]
fn harmonicity_in_terms_of_the_correlation() {
    // Boersma 1993: a sound whose normalised autocorrelation peaks at r is periodic to the share r of its power.
    for (r, expected_db) in [(0.5_f64, 0.0), (0.9, 9.5424), (0.99, 19.9564)] {
        let amplitude = (2.0 * r).sqrt();
        let d = Descriptors::of([(1, amplitude)], Some(1.0 - r));
        assert_near(d.hnr_db, expected_db, 1e-4, &format!("r = {r}"));
    }
}

#[test]
fn harmonicity_of_a_reading_is_that_of_the_sound() {
    // From 60 dB on the partials' own skirts reach into what is left between them.
    for (seed, f0_hz, snr_db, tolerance_db) in [
        (1, 110.0, 20.0, 0.5),
        (2, 220.0, 40.0, 0.5),
        (3, 1000.0, 50.0, 0.7),
        (4, 440.0, 60.0, 1.2),
    ] {
        let mut random = Random::new(seed);
        let timbre = Timbre { partials: 12, ..Timbre::default() };
        let tone = Tone::random(&mut random, 48_000.0, f0_hz, 0.0, &timbre);
        let mut sound = tone.render(96_000);
        add_noise(&mut random, &mut sound, snr_db);
        let take = Take::of(&Settings::new(48_000.0), &narrow(&sound)).unwrap();
        let found: Vec<f64> = (take.readings.iter().skip(40).take(100))
            .filter_map(|reading| Descriptors::of_reading(reading).hnr_db)
            .collect();
        assert_eq!(found.len(), 100, "every reading has partials and noise");
        let mean = found.iter().sum::<f64>() / 100.0;
        assert!((mean - snr_db).abs() < tolerance_db, "{f0_hz} Hz: {mean:.2} dB, not {snr_db}");
        let worst = found.iter().map(|db| (db - mean).abs()).fold(0.0, f64::max);
        assert!(worst < 1.5, "{f0_hz} Hz: {worst:.2} dB from the mean");
    }
}
