//! The editor without a host or a window: what is shown, what is done to the parameters, and its pictures.
#![expect(clippy::print_stdout, reason = "what is skipped has to be said")]

mod captures;
mod checks;
mod controls;
mod hostile;
mod keys;
mod pictures;
mod scenes;
mod views;

use egui::{Vec2, vec2};
use egui_kittest::Harness;
use scenes::Scene;

/// The size that the window opens with.
const SIZE: Vec2 = vec2(1120.0, 760.0);

/// An editor of the usual size that has drawn a few frames.
fn open(scene: Scene) -> Harness<'static, Scene> {
    let mut harness = scene.open(SIZE, 1.0);
    harness.run_steps(3);
    harness
}
