//! Pictures of every view from fixed data, compared with those under `tests/snapshots`: a software rasteriser draws them,
//! and a few pixels may differ between its versions. `UPDATE_SNAPSHOTS=1 cargo test` makes them anew: look at each.

use std::panic::{AssertUnwindSafe, catch_unwind};

use egui::{Vec2, vec2};
use egui_kittest::kittest::Queryable as _;
use egui_kittest::{Harness, SnapshotOptions};
use plumbtone_analysis::State;
use plumbtone_plugin::editor::Theme;

use crate::SIZE;
use crate::scenes::Scene;

/// Largest difference of a pixel that is none, and most pixels that may differ more: lettering and slanted edges.
const PIXEL: f32 = 2.0;
const PIXELS: usize = 1_500;

fn picture(name: &str, scene: Scene, size: Vec2) {
    let mut harness = scene.open(size, 1.0);
    harness.run_steps(4);
    compare(name, &mut harness);
}

fn compare(name: &str, harness: &mut Harness<'_, Scene>) {
    // Without any graphics driver the toolkit panics instead of drawing.
    let drawn = catch_unwind(AssertUnwindSafe(|| harness.render()));
    if !drawn.is_ok_and(|image| image.is_ok()) {
        assert!(std::env::var_os("CI").is_none(), "{name}: nothing draws here");
        println!(
            "skipped: the picture {name}; it needs a Vulkan driver (mesa-vulkan-drivers has one)"
        );
        return;
    }
    let options = SnapshotOptions::new()
        .threshold(PIXEL)
        .max_failed_pixels(PIXELS)
        .output_path(concat!(env!("CARGO_MANIFEST_DIR"), "/tests/snapshots"));
    harness.snapshot_options(name, &options);
}

#[test]
fn whole_editor_dark() {
    picture("editor-dark", Scene::string(Theme::Dark), SIZE);
}

#[test]
fn whole_editor_light() {
    picture("editor-light", Scene::string(Theme::Light), SIZE);
}

#[test]
fn smallest_window() {
    picture("smallest", Scene::string(Theme::Dark), vec2(480.0, 320.0));
}

#[test]
fn no_single_pitch() {
    let mut scene = Scene::string(Theme::Dark);
    scene.readout.reading.state = State::Several;
    scene.readout.reading.pitch = None;
    picture("several-pitches", scene, vec2(800.0, 560.0));
}

#[test]
fn detuned_voices() {
    picture("detuned", Scene::detuned(Theme::Dark), SIZE);
}

#[test]
fn difference_dark() {
    difference("difference-dark", Theme::Dark, (1, None));
}

#[test]
fn difference_light() {
    difference("difference-light", Theme::Light, (3, Some(2)));
}

/// A capture against another, or against what is heard.
fn difference(name: &str, theme: Theme, (first, second): (u64, Option<u64>)) {
    let mut scene = Scene::captured(theme);
    scene.screen.compare(Some(first), second);
    let mut harness = scene.open(SIZE, 1.0);
    harness.run_steps(3);
    harness.get_by_label("Captures").click();
    harness.run_steps(4);
    compare(name, &mut harness);
}

#[test]
fn checks_dark() {
    checks("checks-dark", Theme::Dark);
}

#[test]
fn checks_light() {
    checks("checks-light", Theme::Light);
}

#[test]
fn keys_dark() {
    keys("keys-dark", Scene::keyboard(Theme::Dark), SIZE);
}

#[test]
fn keys_light() {
    keys("keys-light", Scene::keyboard(Theme::Light), SIZE);
}

#[test]
fn keys_in_a_small_window() {
    keys("keys-small", Scene::keyboard(Theme::Dark), vec2(800.0, 480.0));
}

#[test]
fn keys_none_yet() {
    keys("keys-none", Scene::string(Theme::Dark), SIZE);
}

fn keys(name: &str, scene: Scene, size: Vec2) {
    let mut harness = scene.open(size, 1.0);
    harness.run_steps(3);
    harness.get_by_label("Keys").click();
    harness.run_steps(3);
    if let Some(column) = harness.query_by_label_contains("F4 in the picture") {
        column.hover();
    }
    harness.run_steps(4);
    compare(name, &mut harness);
}

fn checks(name: &str, theme: Theme) {
    let mut harness = Scene::checked(theme).open(SIZE, 1.0);
    harness.run_steps(3);
    harness.get_by_label("Checks").click();
    harness.run_steps(3);
    harness.get_by_label_contains("check 2: outside, 9|1.00").click();
    harness.run_steps(4);
    compare(name, &mut harness);
}
