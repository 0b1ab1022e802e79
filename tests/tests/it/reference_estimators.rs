//! Two independent pitch estimators from the registry on the same tones.

use plumbtone_analysis::Settings;
use plumbtone_analysis::signals::{Random, Timbre, Tone, add_noise, narrow};
use plumbtone_tests::estimators::{mcleod, median, probabilistic_yin};
use plumbtone_tests::take::{Take, cents};

/// Farthest that an estimator's median and the engine's note may lie apart, in cents: the estimators' own errors. The
/// first interpolates the lag by a parabola, the second answers on a grid of 10 cents.
const AGREE_CENTS: (f64, f64) = (3.0, 10.0);

#[test]
fn the_engine_agrees_with_independent_estimators() {
    let mut random = Random::new(31);
    for case in 0..12 {
        let f0 = random.log_between(90.0, 1000.0);
        // Without stiffness: the estimators know no other period than a harmonic one.
        let timbre = Timbre { partials: 12, ..Timbre::default() };
        let tone = Tone::random(&mut random, 48_000.0, f0, 0.0, &timbre);
        let mut sound = tone.render(48_000);
        add_noise(&mut random, &mut sound, 40.0);
        let take = Take::of(&Settings::new(48_000.0), &narrow(&sound)).unwrap();
        let own = take.longest_note().map(|note| note.f0_hz);
        let own = own.unwrap_or_else(|| panic!("case {case}: no note at {f0} Hz"));
        let others = [
            ("McLeod", median(mcleod(&sound, 48_000)), AGREE_CENTS.0),
            ("pYIN", median(probabilistic_yin(&sound, 48_000)), AGREE_CENTS.1),
        ];
        for (name, other, most) in others {
            let other = other.unwrap_or_else(|| panic!("case {case}: {name} silent at {f0} Hz"));
            let apart = cents(own, other);
            assert!(apart.abs() < most, "case {case}, {f0} Hz: {apart} cents from {name}");
            let (ours, theirs) = (cents(own, f0).abs(), cents(other, f0).abs());
            assert!(ours < theirs, "case {case}, {f0} Hz: off by {ours} cents, {name} by {theirs}");
        }
    }
}
