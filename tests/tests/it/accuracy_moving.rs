//! The project's figures on moving pitch and on the first reading after an onset.

use plumbtone_tests::figures::{self, Draw, Errors};

use crate::verdicts::Verdicts;

#[test]
fn moving_pitch_is_followed() {
    let mut all = Errors::default();
    let mut verdicts = Verdicts::default();
    for f in figures::moving(Draw { seed: 10_000, count: 20 }).unwrap() {
        let kind = f.kind;
        verdicts.at_least_percent(&format!("{kind}: readings within 50 cents"), &f.right, 100.0);
        verdicts.at_least_percent(&format!("{kind}: readings with a pitch"), &f.answered, 99.0);
        all.append(f.cents);
    }
    verdicts.at_most("f0 of readings, median, cents", all.median(), 0.1, &all);
    verdicts.at_most("f0 of readings, 95th, cents", all.percentile(95.0), 1.0, &all);
    verdicts.assert_all_reached();
}

#[test]
fn the_first_right_reading_comes_soon_after_the_onset() {
    for figure in figures::live(5).unwrap() {
        assert!(figure.reached_ms <= figure.due_ms, "{figure:?}");
    }
}
