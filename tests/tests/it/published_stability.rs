//! Frequency stability against published values: W. J. Riley, Handbook of Frequency Stability Analysis, NIST Special
//! Publication 1065, 2008, section 12.4, and the NBS 9-point set quoted there.

use core::f64::consts::{PI, TAU};

use plumbtone_analysis::check::OverlappingAllan;

#[expect(clippy::expect_used, reason = "a test's helper fails it as it should")]
fn deviation(m: usize, values: impl IntoIterator<Item = f64>) -> f64 {
    let mut allan = OverlappingAllan::new(m);
    values.into_iter().for_each(|value| allan.push(value));
    allan.deviation().expect("enough values")
}

/// The 1000 points of the handbook's generator.
fn thousand() -> Vec<f64> {
    let mut n: u64 = 1_234_567_890;
    let mut points = Vec::new();
    for _ in 0..1000 {
        points.push(n as f64 / 2_147_483_647.0);
        n = 16_807 * n % 2_147_483_647;
    }
    assert_eq!(n, 424_573_294, "the generator's state after 1000 steps");
    points
}

#[test]
fn the_thousand_points_have_their_published_deviation() {
    for (m, published) in [(1, 2.922319e-1), (10, 9.159953e-2), (100, 3.241343e-2)] {
        let found = deviation(m, thousand());
        assert!((found / published - 1.0).abs() < 5e-7, "m = {m}: {found}, published {published}");
    }
}

#[test]
fn the_nine_points_have_their_published_deviation() {
    let points = [892.0, 809.0, 823.0, 798.0, 671.0, 644.0, 883.0, 903.0, 677.0];
    for (m, published) in [(1, 91.22945), (2, 85.95287)] {
        let found = deviation(m, points);
        assert!((found / published - 1.0).abs() < 1e-6, "m = {m}: {found}, published {published}");
    }
}

#[test]
fn linear_drift_gives_its_rate_times_the_averaging_time_over_root_two() {
    for m in [1, 10, 128, 1024] {
        let found = deviation(m, (0..4096).map(|i| 0.001 * f64::from(i)));
        let exact = 0.001 * m as f64 / 2.0_f64.sqrt();
        assert!((found / exact - 1.0).abs() < 1e-9, "m = {m}: {found}, exactly {exact}");
    }
}

#[test]
fn a_vibrato_gives_the_closed_form_of_sinusoidal_modulation() {
    let frequency = 0.05;
    let found = deviation(7, (0..200_000).map(|i| (TAU * frequency * f64::from(i)).sin()));
    // The closed form is that of continuous time; averages over discrete samples have sin(pi f) for pi f in the divisor.
    let x = 7.0 * PI * frequency;
    let continuous = x.sin().powi(2) / x;
    assert!((continuous - 0.72201).abs() < 2e-5, "closed form {continuous}");
    let discrete = continuous * (PI * frequency) / (PI * frequency).sin();
    assert!((found / discrete - 1.0).abs() < 1e-3, "{found}, closed form {discrete}");
}

#[test]
fn decimated_phases_of_long_averages_lose_next_to_nothing() {
    // White noise: the deviation falls with the root of the averaging time, whatever the stride.
    let points: Vec<f64> = thousand().into_iter().cycle().take(1000).collect();
    let whole: f64 = {
        // The defining sum, with every term.
        let m = 256;
        let mut phase = vec![0.0];
        for y in &points {
            phase.push(phase[phase.len() - 1] + y);
        }
        let terms: Vec<f64> = (0..phase.len() - 2 * m)
            .map(|i| (phase[i + 2 * m] - 2.0 * phase[i + m] + phase[i]).powi(2))
            .collect();
        (terms.iter().sum::<f64>() / terms.len() as f64 / 2.0).sqrt() / m as f64
    };
    let found = deviation(256, points);
    assert!((found / whole - 1.0).abs() < 0.02, "{found}, with every term {whole}");
}

#[test]
fn no_average_reaches_over_an_interruption() {
    let mut allan = OverlappingAllan::new(4);
    for value in [0.0; 20] {
        allan.push(value);
    }
    allan.interrupt();
    for value in [100.0; 20] {
        allan.push(value);
    }
    assert_eq!((allan.deviation(), allan.terms()), (Some(0.0), 26), "two constant stretches");
}
