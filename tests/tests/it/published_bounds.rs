//! Cramer-Rao bounds against the published formulas. D. Rife and R. Boorstyn, IEEE Trans. IT 20(5):591-598, 1974;
//! M. Christensen, A. Jakobsson and S. Jensen, IEEE Trans. ASLP 15(5):1635-1644, 2007.

use plumbtone_analysis::signals::Tone;
use plumbtone_tests::bounds::{self, Observation};

const SAMPLE_RATE_HZ: f64 = 48_000.0;

fn assert_relative(value: f64, expected: f64, tolerance: f64, what: &str) {
    let error = (value / expected - 1.0).abs();
    assert!(error <= tolerance, "{what}: {value:e} for {expected:e}, off by {error:e}");
}

/// Noise under a sine of amplitude 1 with A^2 / (2 sigma^2) at this many dB.
fn at_snr(samples: usize, snr_db: f64) -> Observation {
    let noise_sd = (0.5 / 10f64.powf(snr_db / 10.0)).sqrt();
    Observation { samples, noise_sd }
}

/// A tone of partials falling by 6 dB per octave from amplitude 1, with phases that have no pattern.
fn falling(f0_hz: f64, b: f64, partials: u32) -> Tone {
    let mut tone = Tone::new(SAMPLE_RATE_HZ, f0_hz, b, partials, |n| 1.0 / f64::from(n));
    for partial in &mut tone.partials {
        partial.phase_rad = (2.4 * f64::from(partial.number).powi(2)) % 6.0;
    }
    tone
}

#[test]
fn single_sinusoid() {
    // The Rife-Boorstyn formula worked out for 20 dB at 48 kHz.
    for (samples, expected_hz) in [(4096, 1.0095e-2), (48000, 2.5165e-4)] {
        let bound = bounds::sinusoid(SAMPLE_RATE_HZ, 1.0, &at_snr(samples, 20.0));
        assert_relative(bound.frequency_sd_hz, expected_hz, 1e-3, &format!("{samples} samples"));
    }
}

#[test]
fn exact_information_meets_the_formula_of_a_lone_sinusoid() {
    let observation = at_snr(512, 20.0);
    let formula = bounds::sinusoid(SAMPLE_RATE_HZ, 1.0, &observation);
    for (f0_hz, phase_rad) in [(3000.0, 0.0), (5021.7, 1.0), (12345.6, -2.0)] {
        let mut tone = falling(f0_hz, 0.0, 1);
        tone.partials[0].phase_rad = phase_rad;
        let exact = bounds::partials(&tone, &observation).unwrap()[0];
        let what = format!("{f0_hz} Hz");
        assert_relative(exact.frequency_sd_hz, formula.frequency_sd_hz, 4e-3, &what);
        assert_relative(exact.amplitude_sd, formula.amplitude_sd, 4e-3, &what);
        assert_relative(exact.phase_sd_rad, formula.phase_sd_rad, 4e-3, &what);
        let f0_sd_hz = bounds::f0_hz(&tone, &observation).unwrap();
        assert_relative(f0_sd_hz, exact.frequency_sd_hz, 1e-9, &what);
    }
}

#[test]
fn harmonics_of_a_sawtooth_sharpen_f0_by_the_root_of_their_number() {
    // Christensen 2007: var(f0) goes with 1 / sum(l^2 A^2), and every l * A is 1 here.
    let observation = at_snr(48000, 40.0);
    let alone = bounds::sinusoid(SAMPLE_RATE_HZ, 1.0, &observation).frequency_sd_hz;
    for count in [1, 4, 20] {
        let bound = bounds::f0_hz(&falling(220.0, 0.0, count), &observation).unwrap();
        assert_relative(bound, alone / f64::from(count).sqrt(), 2e-3, &format!("{count} partials"));
    }
}

#[test]
fn f0_and_inharmonicity_together() {
    // 20 partials of 220 Hz at -6 dB per octave, B = 1e-4, the fundamental 40 dB over the noise, one second at 48 kHz.
    let observation = at_snr(48000, 40.0);
    let tone = falling(220.0, 1e-4, 20);
    let bound = bounds::stiff(&tone, &observation).unwrap();
    assert_relative(bound.f0_sd_hz, 8.56e-6, 0.02, "f0 in Hz");
    assert_relative(bound.b_sd, 4.18e-10, 0.02, "B");
    assert_relative(bound.correlation, -0.762, 0.02, "correlation");
    assert_relative(bounds::f0_hz(&tone, &observation).unwrap(), 5.55e-6, 0.02, "f0 with B known");
}

#[test]
fn one_partial_cannot_tell_stretch_from_pitch() {
    assert_eq!(bounds::stiff(&falling(220.0, 0.0, 1), &at_snr(4096, 40.0)), None);
}
