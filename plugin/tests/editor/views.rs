//! What is shown, by label.

use egui::accesskit::Role;
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use plumbtone_analysis::{Pitch, State};
use plumbtone_plugin::editor::Theme;
use plumbtone_plugin::readout::{Condition, Missing};

use crate::open;
use crate::scenes::Scene;

fn shows(harness: &Harness<'_, Scene>, text: &str) {
    assert!(harness.query_all_by_label_contains(text).next().is_some(), "{text} is shown");
}

fn shows_not(harness: &Harness<'_, Scene>, text: &str) {
    assert!(harness.query_all_by_label_contains(text).next().is_none(), "{text} is not shown");
}

#[test]
fn a_pitch_is_told_with_its_deviation_and_state() {
    let harness = open(Scene::string(Theme::Dark));
    for text in ["A3", "+3.1 ct", "\u{b1} 0.1", "220.40 Hz", "steady for 32 s"] {
        shows(&harness, text);
    }
}

#[test]
fn no_pitch_is_told_as_plainly() {
    for (state, word) in [
        (State::Several, "several pitches"),
        (State::Unpitched, "unpitched"),
        (State::Silent, "silent"),
        (State::Steady, "no sure pitch"),
    ] {
        let mut scene = Scene::string(Theme::Dark);
        let unsure = Pitch { f0_hz: 220.0, f0_sd_cents: 5.0, confidence: 0.3 };
        scene.readout.reading.state = state;
        scene.readout.reading.pitch = (state == State::Steady).then_some(unsure);
        let harness = open(scene);
        shows(&harness, word);
        shows_not(&harness, "A3");
        shows_not(&harness, "partial 1:");
    }
}

#[test]
fn gaps_and_failures_are_told() {
    let mut scene = Scene::string(Theme::Dark);
    let end = scene.readout.reading.centre + 2_400;
    scene.readout.last_gap = Some(Missing { samples: 1_024, end });
    scene.readout.gaps.overrun = 1_024;
    scene.lost_samples = 2_048;
    scene.unsound = vec!["the stored zoom cannot be used".to_owned()];
    let harness = open(scene);
    for text in ["gap", "1024 samples", "2048 samples", "the stored zoom cannot be used"] {
        shows(&harness, text);
    }
    let mut failed = Scene::string(Theme::Dark);
    failed.readout.condition = Condition::Failed;
    let harness = open(failed);
    shows(&harness, "analysis failed");
    shows(&harness, "defect of this program");
}

#[test]
fn every_partial_and_stray_has_its_figures() {
    let harness = open(Scene::string(Theme::Dark));
    for text in [
        "partial 7: 1\u{202f}547.",
        "partial 20:",
        "alias of partial 204",
        "mains 2 \u{d7} 50 Hz",
        "unexplained",
        "(1.60 \u{b1} 0.02)\u{b7}10\u{207b}\u{2074}",
        "constant",
    ] {
        shows(&harness, text);
    }
}

#[test]
fn a_click_pins_a_partial_and_another_lets_it_go() {
    let mut harness = open(Scene::string(Theme::Dark));
    harness.get_by_label_contains("partial 7:").click();
    harness.run_steps(3);
    shows(&harness, "cents off the series");
    harness.get_by_label("Unpin").click();
    harness.run_steps(3);
    assert!(harness.query_by_label("Unpin").is_none(), "no partial is pinned");
}

#[test]
fn a_pinned_partial_shows_its_past() {
    let mut harness = open(Scene::string(Theme::Dark));
    harness.state_mut().screen.pin(Some(7));
    harness.run_steps(2);
    let before = harness.output().shapes.len();
    for _ in 0..30 {
        harness.state_mut().advance();
        harness.step();
    }
    shows(&harness, "partial 7");
    assert!(harness.output().shapes.len() > before, "lines grow from nothing");
    harness.state_mut().screen.pin(Some(99));
    harness.run_steps(2);
    shows(&harness, "partial 99");
}

#[test]
fn all_figures_of_a_row_are_told_under_the_pointer() {
    let mut harness = open(Scene::string(Theme::Dark));
    harness.get_by_label_contains("partial 3:").hover();
    harness.run_steps(60);
    shows(&harness, "dB over the noise");
}

#[test]
fn settings_change_the_look() {
    let mut harness = open(Scene::string(Theme::Dark));
    for (label, check) in [
        ("Settings", None),
        ("theme: light", Some(Theme::Light)),
        ("theme: dark", Some(Theme::Dark)),
    ] {
        harness.get_by_label(label).click();
        harness.run_steps(3);
        if let Some(theme) = check {
            assert_eq!(harness.state().screen.theme(), theme, "{label}");
        }
    }
    harness.get_by_label("levels: to strongest").click();
    harness.run_steps(3);
    shows(&harness, "level, to strongest");
    harness.get_by_label("zoom, %: 150").click();
    harness.run_steps(2);
    assert!(
        (harness.state().screen.zoom() - 1.5).abs() < 1e-6,
        "{}",
        harness.state().screen.zoom()
    );
}

#[test]
fn figures_are_copied_as_text_csv_and_picture() {
    let mut harness = open(Scene::string(Theme::Dark));
    for (label, expected) in [
        ("Copy all figures as text", "A3 +3.1"),
        ("Copy all figures as CSV", "partial,7,1547."),
        ("Copy what you see as an SVG picture", "</svg>"),
    ] {
        harness.get_by_label_contains(label).click();
        let mut copied = String::new();
        for _ in 0..4 {
            harness.step();
            for command in &harness.output().platform_output.commands {
                if let egui::OutputCommand::CopyText(text) = command {
                    copied.clone_from(text);
                }
            }
        }
        assert!(copied.contains(expected), "{label}: {copied:.300}");
    }
}

#[test]
fn every_control_has_a_name() {
    let harness = open(Scene::string(Theme::Dark));
    let interactive = [Role::Button, Role::SpinButton, Role::ComboBox, Role::RadioButton];
    let mut count = 0;
    for role in interactive {
        for node in harness.query_all_by_role(role) {
            let named = node.accesskit_node().label().is_some_and(|label| !label.is_empty());
            assert!(named, "a {role:?} has no name");
            count += 1;
        }
    }
    assert!(count > 25, "{count} controls");
}
