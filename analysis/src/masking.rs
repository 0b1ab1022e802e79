//! Whether a line can be heard beside others: the spread of excitation along the critical bands.
//!
//! Spreading function of M. Schroeder, B. Atal & J. Hall, JASA 66(6):1647-1652, 1979:
//! `15.81 + 7.5 (dz + 0.474) - 17.5 sqrt(1 + (dz + 0.474)^2)` dB at `dz` Bark above the masker. A tone masks what lies
//! `14.5 + z` dB under its excitation, z its own place in Bark (J. Johnston, IEEE J. Sel. Areas Commun. 6(2):314-323, 1988).
//! Bark: H. Traunmueller, JASA 88(1):97-100, 1990. Threshold in quiet: E. Terhardt, Hearing Research 1(2):155-182, 1979;
//! how loud dBFS is, is the listener's business: a full-scale sine is taken for 100 dB SPL, which is loud.

use crate::stiff::quadrature;

/// Critical-band rate in Bark.
#[must_use]
pub fn bark(hz: f64) -> f64 {
    26.81 * hz / (1960.0 + hz) - 0.53
}

/// Excitation at `dz` Bark above a masker, in dB relative to it.
#[must_use]
pub fn spreading_db(dz: f64) -> f64 {
    let x = dz + 0.474;
    15.81 + 7.5 * x - 17.5 * quadrature(1.0, x)
}

/// Sound pressure of a full-scale sine, in dB SPL.
const FULL_SCALE_DB_SPL: f64 = 100.0;

/// Level in dBFS under which a tone at a frequency is not heard in quiet.
#[must_use]
pub fn quiet_below_dbfs(hz: f64) -> f64 {
    let khz = hz / 1000.0;
    let bump = 6.5 * (-0.6 * (khz - 3.3) * (khz - 3.3)).exp();
    let threshold_db_spl = 3.64 * khz.powf(-0.8) - bump + 1e-3 * khz.powi(4);
    threshold_db_spl - FULL_SCALE_DB_SPL
}

/// Level in dBFS under which a tone at a frequency is not heard: in quiet, or beside others, given as (frequency in Hz,
/// level in dBFS).
#[must_use]
pub fn unheard_below_dbfs(hz: f64, maskers: impl IntoIterator<Item = (f64, f64)>) -> f64 {
    quiet_below_dbfs(hz).max(masked_below_dbfs(hz, maskers))
}

/// Level in dBFS under which a tone at a frequency is masked by others, given as (frequency in Hz, level in dBFS): the sum of
/// their powers there. Negative infinity beside nothing.
#[must_use]
pub fn masked_below_dbfs(hz: f64, maskers: impl IntoIterator<Item = (f64, f64)>) -> f64 {
    let at = bark(hz);
    let power: f64 = maskers
        .into_iter()
        .map(|(masker_hz, level_dbfs)| {
            let from = bark(masker_hz);
            let threshold = level_dbfs + spreading_db(at - from) - (14.5 + from.max(0.0));
            10f64.powf(threshold / 10.0)
        })
        .sum();
    10.0 * power.log10()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_spreading_function_is_the_published_one() {
        // Its peak is 0 dB at the masker, and its slopes tend to +25 and -10 dB per Bark.
        assert!(spreading_db(0.0).abs() < 0.02, "{}", spreading_db(0.0));
        let below = spreading_db(-7.0) - spreading_db(-8.0);
        let above = spreading_db(9.0) - spreading_db(8.0);
        assert!((below - 25.0).abs() < 0.2, "{below} dB per Bark below");
        assert!((above + 10.0).abs() < 0.2, "{above} dB per Bark above");
    }

    #[test]
    fn the_threshold_in_quiet_is_the_published_one() {
        // Values of the formula, worked out by hand, in dB SPL.
        for (hz, db_spl) in [(100.0, 22.95), (1000.0, 3.37), (3300.0, -4.98), (10_000.0, 10.58)] {
            let found = quiet_below_dbfs(hz) + FULL_SCALE_DB_SPL;
            assert!((found - db_spl).abs() < 0.01, "{found} dB SPL at {hz} Hz");
        }
        assert!(quiet_below_dbfs(20_000.0) > 0.0, "nothing at full scale is heard there");
        assert!(quiet_below_dbfs(19.0) > -20.0, "nor much there");
    }

    #[test]
    fn a_near_line_is_masked_and_a_far_one_is_not() {
        let tone = [(1000.0, -10.0)];
        let near = masked_below_dbfs(1040.0, tone);
        let far = masked_below_dbfs(6000.0, tone);
        assert!((-36.0..-30.0).contains(&near), "{near} dBFS beside the tone");
        assert!(far < -90.0, "{far} dBFS far above it");
        assert!(masked_below_dbfs(500.0, []) < -1e9, "beside nothing");
    }
}
