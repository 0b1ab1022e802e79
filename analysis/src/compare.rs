//! Two sounds side by side: per partial the difference in level, cents and phase, each with what chance alone would make of it.

use core::f64::consts::TAU;

use crate::convert::nearest;
use crate::reading::Partial;
use crate::stiff::{CENTS_PER_NEPER, quadrature};

/// Differences, in deviations, from which they are more than noise: by chance one in 370.
pub const SIGNIFICANT: f64 = 3.0;

/// Turns of a partial against the fundamental, in Hz, from which its phase is that of a moment and says nothing of the sound.
const LOCKED_HZ: f64 = 0.1;

/// A difference and its standard deviation, in the same unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Difference {
    /// Second less first.
    pub value: f64,
    /// Its standard deviation.
    pub sd: f64,
}

impl Difference {
    fn of((first, first_sd): (f64, f64), (second, second_sd): (f64, f64)) -> Self {
        Self { value: second - first, sd: quadrature(first_sd, second_sd) }
    }

    /// Whether it is more than noise.
    #[must_use]
    pub fn is_significant(self) -> bool {
        self.value.abs() > SIGNIFICANT * self.sd
    }
}

/// One partial in two sounds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PartialDifference {
    /// Partial number, from 1.
    pub number: u32,
    /// Level in dB, each relative to the strongest partial of its sound; `None` when one of them has no such partial.
    pub level_db: Option<Difference>,
    /// Distance from the harmonic series in cents: it compares sounds of different pitch.
    pub cents: Option<Difference>,
    /// Phase in radians, -pi to pi, after the shift in time that brings the fundamentals together; `None` also when one of
    /// the sounds has no fundamental, or when the partial turns against it in one of them: there is no phase to compare then.
    pub phase_rad: Option<Difference>,
    /// Whether the first sound has the partial, and the second.
    pub present: (bool, bool),
}

/// Compares partials by number, also when the notes differ. Both lists rise by number; so does the result.
#[must_use]
pub fn compare(first: &[Partial], second: &[Partial]) -> Vec<PartialDifference> {
    let loudest = [first, second]
        .map(|partials| partials.iter().map(|p| p.level_dbfs).fold(f64::NEG_INFINITY, f64::max));
    let fundamentals = (fundamental(first), fundamental(second));
    let mut numbers: Vec<u32> = first.iter().chain(second).map(|p| p.number).collect();
    numbers.sort_unstable();
    numbers.dedup();
    let find = |partials: &[Partial], number| partials.iter().find(|p| p.number == number).copied();
    numbers
        .into_iter()
        .map(|number| {
            let pair = (find(first, number), find(second, number));
            let both = pair.0.zip(pair.1);
            PartialDifference {
                number,
                level_db: both.map(|(a, b)| {
                    let level = |p: &Partial, loudest| (p.level_dbfs - loudest, p.level_sd_db);
                    Difference::of(level(&a, loudest[0]), level(&b, loudest[1]))
                }),
                cents: both.map(|(a, b)| {
                    let cents = |p: &Partial| (p.cents_from_harmonic, p.cents_sd);
                    Difference::of(cents(&a), cents(&b))
                }),
                phase_rad: both.zip(fundamentals.0.zip(fundamentals.1)).and_then(
                    |((a, b), (f, g))| {
                        let mut off = Difference::of(phase(&a, &f)?, phase(&b, &g)?);
                        off.value -= TAU * nearest(off.value / TAU);
                        Some(off)
                    },
                ),
                present: (pair.0.is_some(), pair.1.is_some()),
            }
        })
        .collect()
}

fn fundamental(partials: &[Partial]) -> Option<Partial> {
    partials.iter().find(|p| p.number == 1).copied()
}

/// Phase against the fundamental's, and its deviation: that of an amplitude's logarithm is that of its phase in radians
/// (D. Rife & R. Boorstyn, IEEE Trans. Inf. Theory 20(5):591-598, 1974). `None` when they do not stay together.
fn phase(partial: &Partial, fundamental: &Partial) -> Option<(f64, f64)> {
    let n = f64::from(partial.number);
    let turns_hz = (partial.frequency_hz - n * fundamental.frequency_hz).abs();
    let turns_sd_hz = quadrature(partial.frequency_sd_hz, n * fundamental.frequency_sd_hz);
    if turns_hz > LOCKED_HZ + 2.0 * turns_sd_hz {
        return None;
    }
    let sd = |p: &Partial| (0.5 * 10f64.powf(-p.snr_db / 10.0)).sqrt();
    let own = if partial.number == 1 { 0.0 } else { quadrature(sd(partial), n * sd(fundamental)) };
    Some((partial.phase_rad - n * fundamental.phase_rad, own))
}

/// Distance of one fundamental from another in cents, with its deviation, from (Hz, deviation in cents).
#[must_use]
pub fn pitch_difference(first: (f64, f64), second: (f64, f64)) -> Difference {
    let cents = CENTS_PER_NEPER * (second.0 / first.0).ln();
    Difference { value: cents, sd: quadrature(first.1, second.1) }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn partial(number: u32, level_dbfs: f64, cents: f64, phase_rad: f64) -> Partial {
        Partial {
            number,
            frequency_hz: 100.0 * f64::from(number),
            frequency_sd_hz: 0.01,
            cents_from_harmonic: cents,
            cents_sd: 0.1,
            level_dbfs,
            level_sd_db: 0.1,
            phase_rad,
            snr_db: 60.0,
        }
    }

    #[test]
    fn a_shift_in_time_and_a_gain_make_no_difference() {
        let first: Vec<_> = (1..=5).map(|n| partial(n, -6.0 * f64::from(n), 0.0, 0.4)).collect();
        let moved = |p: &Partial| {
            partial(p.number, p.level_dbfs - 9.0, 0.0, p.phase_rad + 1.7 * f64::from(p.number))
        };
        let second: Vec<_> = first.iter().map(moved).collect();
        for d in compare(&first, &second) {
            let (level, phase) = (d.level_db.expect("both"), d.phase_rad.expect("both"));
            assert!(level.value.abs() < 1e-9 && !level.is_significant(), "{d:?}");
            assert!(phase.value.abs() < 1e-9 && !phase.is_significant(), "{d:?}");
        }
    }

    #[test]
    fn what_differs_is_told_from_what_could_be_noise() {
        let first = [partial(1, -6.0, 0.0, 0.0), partial(2, -12.0, 0.0, 0.0)];
        let second =
            [partial(1, -6.0, 0.0, 0.0), partial(2, -12.2, 2.0, 0.5), partial(3, -20.0, 0.0, 0.0)];
        let found = compare(&first, &second);
        assert_eq!(found.len(), 3, "by number");
        let [_, changed, new] = &found[..] else { panic!("three") };
        assert!(!changed.level_db.expect("both").is_significant(), "0.2 dB: {changed:?}");
        assert!(changed.cents.expect("both").is_significant(), "2 cents: {changed:?}");
        assert!(changed.phase_rad.expect("both").is_significant(), "0.5 rad: {changed:?}");
        assert_eq!((new.level_db, new.present), (None, (false, true)), "only in the second");
    }

    #[test]
    fn a_partial_that_turns_has_no_phase_to_compare() {
        let first = [partial(1, -6.0, 0.0, 0.0), partial(2, -12.0, 0.0, 0.0)];
        let mut second = first;
        second[1].frequency_hz += 0.4;
        let found = compare(&first, &second);
        assert!(found[0].phase_rad.is_some() && found[1].phase_rad.is_none(), "{found:?}");
        second[1].frequency_sd_hz = 0.2;
        assert!(compare(&first, &second)[1].phase_rad.is_some(), "it may as well hold");
    }

    #[test]
    fn pitches_differ_in_cents() {
        let off = pitch_difference((440.0, 0.3), (441.0, 0.4));
        assert!((off.value - 3.930_16).abs() < 1e-4, "{off:?}");
        assert!((off.sd - 0.5).abs() < 1e-12, "{off:?}");
    }
}
