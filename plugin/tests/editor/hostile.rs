//! Data that should never come, in windows that nobody would open: everything is drawn, nothing breaks.

use egui::{Vec2, vec2};
use egui_kittest::kittest::Queryable as _;
use plumbtone_analysis::{Partial, Pitch, Stray, StrayKind, Stretch};
use plumbtone_plugin::editor::Theme;
use plumbtone_plugin::keys::Row;

use crate::scenes::{Scene, key_row, strays, string_partials};

const SIZES: [Vec2; 5] = [
    vec2(60.0, 40.0),
    vec2(480.0, 320.0),
    vec2(700.0, 900.0),
    vec2(1120.0, 760.0),
    vec2(3840.0, 2160.0),
];

/// Draws a scene in windows of all sizes, and as a picture.
fn draw(what: &str, scene: impl Fn() -> Scene) {
    for size in SIZES {
        let mut harness = scene().open(size, 1.0);
        harness.run_steps(3);
        let shapes = harness.output().shapes.len();
        assert!(shapes > 3, "{what} at {size}: {shapes} shapes");
        let svg = harness.state().svg(size);
        assert!(svg.ends_with("</svg>\n") && !svg.contains("NaN"), "{what} at {size}");
    }
}

fn with(change: impl Fn(&mut Scene)) -> impl Fn() -> Scene {
    move || {
        let mut scene = Scene::string(Theme::Dark);
        change(&mut scene);
        scene
    }
}

#[test]
fn nothing_at_all() {
    draw("nothing heard", || Scene::empty(Theme::Light));
    draw("no partials", with(|scene| scene.readout.reading.partials.clear()));
}

#[test]
fn partials_of_all_kinds() {
    draw("128 partials", with(|scene| scene.readout.reading.partials = string_partials(128)));
    for value in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 1e300, -1e300, 0.0] {
        draw(
            &format!("partials of {value}"),
            with(move |scene| {
                let change = |p: &mut Partial| {
                    p.cents_from_harmonic = value;
                    p.cents_sd = value;
                    p.level_dbfs = value;
                    p.frequency_hz = value;
                };
                scene.readout.reading.partials.iter_mut().skip(3).for_each(change);
            }),
        );
    }
    let number = |number| with(move |scene| scene.readout.reading.partials[0].number = number);
    draw("partial 0", number(0));
    draw("partial 4 billion", number(u32::MAX));
}

#[test]
fn figures_that_are_no_numbers() {
    for value in [f64::NAN, f64::INFINITY, -1.0, 0.0] {
        draw(
            &format!("a reading of {value}"),
            with(move |scene| {
                let reading = &mut scene.readout.reading;
                reading.pitch = Some(Pitch { f0_hz: 220.0, f0_sd_cents: value, confidence: 1.0 });
                reading.stretch = Some(Stretch { b: value, b_sd: value });
                reading.level_dbfs = value;
            }),
        );
        draw(
            &format!("a pitch of {value} Hz"),
            with(move |scene| {
                let pitch = Pitch { f0_hz: value, f0_sd_cents: 0.1, confidence: 1.0 };
                scene.readout.reading.pitch = Some(pitch);
            }),
        );
    }
    draw("no sample rate", with(|scene| scene.readout.sample_rate_hz = 0.0));
}

#[test]
fn comparisons_of_all_kinds() {
    let compared = |change: fn(&mut Scene)| {
        move || {
            let mut scene = Scene::captured(Theme::Dark);
            change(&mut scene);
            scene.screen.compare(Some(1), None);
            scene
        }
    };
    draw("128 partials", compared(|s| s.readout.reading.partials = string_partials(128)));
    draw("no partials", compared(|s| s.readout.reading.partials.clear()));
    draw("no pitch", compared(|s| s.readout.reading.pitch = None));
    draw(
        "no numbers",
        compared(|scene| {
            let partials = &mut scene.readout.reading.partials;
            for (p, value) in partials.iter_mut().zip([f64::NAN, f64::INFINITY, 1e30, -1e30]) {
                (p.level_dbfs, p.cents_from_harmonic, p.phase_rad) = (value, value, value);
                (p.level_sd_db, p.cents_sd) = (value, value);
            }
        }),
    );
}

#[test]
fn strays_by_the_hundred() {
    let stray = |k: u32| Stray {
        frequency_hz: 30.0 + 17.3 * f64::from(k),
        level_dbfs: -40.0 - f64::from(k) / 4.0,
        kind: StrayKind::Alias { partial: k, folds: 1 },
    };
    draw(
        "200 strays",
        with(move |scene| scene.readout.reading.strays = (0..200).map(stray).collect()),
    );
    draw(
        "strays of no frequency",
        with(|scene| {
            for value in [f64::NAN, 0.0, -5.0, f64::INFINITY] {
                let mut more = strays();
                more.iter_mut().for_each(|stray| stray.frequency_hz = value);
                more.iter_mut().for_each(|stray| stray.level_dbfs = value);
                scene.readout.reading.strays.extend(more);
            }
        }),
    );
}

/// Draws the key sheet of a scene in windows of all sizes.
fn draw_keys(what: &str, rows: impl Fn() -> Vec<Row>) {
    for size in SIZES {
        let scene = Scene::string(Theme::Light);
        rows().into_iter().for_each(|row| scene.parameters.sheet.take(row));
        let mut harness = scene.open(size, 1.0);
        harness.run_steps(2);
        // A window that is too narrow for the side panel has no key sheet.
        if let Some(tab) = harness.query_by_label("Keys") {
            tab.click();
        }
        harness.run_steps(3);
        let svg = harness.state().svg(size);
        assert!(svg.ends_with("</svg>\n") && !svg.contains("NaN"), "{what} at {size}");
    }
}

#[test]
fn keys_of_all_kinds() {
    draw_keys("all keys", || (0..128).map(key_row).collect());
    draw_keys("the outermost keys", || vec![key_row(0), key_row(127)]);
    draw_keys("one key", || vec![key_row(127)]);
    for value in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 1e300, -1e300, 0.0] {
        draw_keys(&format!("keys of {value}"), || {
            let mut rows: Vec<Row> = (50..60).map(key_row).collect();
            for row in rows.iter_mut().skip(3) {
                row.f0_hz = value;
                row.f0_sd_cents = value;
                row.length_s = value;
                row.inharmonicity_b = Some(value);
                row.inharmonicity_sd = Some(value);
                row.tilt_db_per_octave = Some(value);
                row.level_dbfs = Some(value);
                row.settling_s = Some(value);
                if let Some(alias) = &mut row.worst_alias {
                    alias.frequency_hz = value;
                    alias.over_mask_db = Some(value);
                }
            }
            rows
        });
    }
    draw_keys("an octave off", || {
        let mut rows: Vec<Row> = (50..60).map(key_row).collect();
        rows[4].f0_hz *= 2.0;
        rows
    });
}

#[test]
fn histories_of_all_kinds() {
    let played = |readings, cents: fn(f64) -> Option<f64>| {
        move || {
            let mut scene = Scene::empty(Theme::Dark);
            scene.play(readings, cents, &string_partials(40), &strays());
            scene
        }
    };
    draw("one reading", played(1, |_| Some(0.0)));
    draw("silence", played(500, |_| None));
    draw("leaps", played(500, |t| Some(2_000.0 * (t * 31.0).sin())));
    draw("half an hour", played(200_000, |t| Some(5.0 * t.sin())));
}
