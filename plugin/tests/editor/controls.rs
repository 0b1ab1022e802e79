//! What is done to the parameters: each change a gesture that begins, sets and ends, so that a host can undo it.

use egui::accesskit::Role;
use egui::{Event, Key, Modifiers, MouseWheelUnit, PointerButton, Pos2, Vec2, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use plumbtone_plugin::editor::{Gesture, Knob, Theme};

use crate::open;
use crate::scenes::Scene;

type Editor = Harness<'static, Scene>;

fn editor() -> Editor {
    open(Scene::string(Theme::Dark))
}

fn centre(editor: &Editor, label: &str) -> Pos2 {
    editor.get_by_label_contains(label).rect().center()
}

fn button(editor: &Editor, pos: Pos2, button: PointerButton, pressed: bool) {
    editor.event(Event::PointerButton { pos, button, pressed, modifiers: Modifiers::NONE });
}

/// Checks that changes are whole and gives what was set.
fn sets(editor: &Editor, knob: Knob) -> Vec<f32> {
    let mut open = false;
    let mut values = Vec::new();
    for gesture in &editor.state().gestures {
        match *gesture {
            Gesture::Begin(k) => {
                assert!(!open && k == knob, "{gesture:?} while open: {open}");
                open = true;
            }
            Gesture::Set(k, value) => {
                assert!(open && k == knob, "{gesture:?} while open: {open}");
                assert!(value >= 0.0 && value <= 1.0, "{gesture:?}");
                values.push(value);
            }
            Gesture::End(k) => {
                assert!(open && k == knob, "{gesture:?} while open: {open}");
                open = false;
            }
        }
    }
    assert!(!open, "the last gesture ended");
    values
}

#[test]
fn a_drag_is_one_gesture() {
    let mut editor = editor();
    let at = centre(&editor, "concert pitch");
    editor.hover_at(at);
    editor.step();
    button(&editor, at, PointerButton::Primary, true);
    editor.step();
    for step in 1..=10 {
        editor.hover_at(at + vec2(0.0, -4.0 * step as f32));
        editor.step();
    }
    button(&editor, at + vec2(0.0, -40.0), PointerButton::Primary, false);
    editor.run_steps(2);
    let values = sets(&editor, Knob::ConcertPitch);
    assert!(values.len() > 3 && values.windows(2).all(|pair| pair[1] >= pair[0]), "{values:?}");
    let begun = editor.state().gestures.iter().filter(|g| matches!(g, Gesture::Begin(_))).count();
    assert_eq!(begun, 1, "one gesture for the whole drag");
}

#[test]
fn a_double_click_types_a_value() {
    let mut editor = editor();
    let at = centre(&editor, "concert pitch");
    editor.hover_at(at);
    for _ in 0..2 {
        button(&editor, at, PointerButton::Primary, true);
        button(&editor, at, PointerButton::Primary, false);
    }
    editor.run_steps(6);
    editor.event(Event::Text("442".to_owned()));
    editor.step();
    editor.key_press(Key::Enter);
    editor.run_steps(3);
    let values = sets(&editor, Knob::ConcertPitch);
    let shown: Vec<String> =
        values.iter().map(|&v| shown(&editor.state().parameters.tuning.concert_pitch, v)).collect();
    assert_eq!(shown, ["442.00 Hz"], "{values:?}");
}

#[test]
fn escape_and_nonsense_change_nothing() {
    for (text, key) in [("442", Key::Escape), ("loud", Key::Enter)] {
        let mut editor = editor();
        let at = centre(&editor, "concert pitch");
        editor.hover_at(at);
        for _ in 0..2 {
            button(&editor, at, PointerButton::Primary, true);
            button(&editor, at, PointerButton::Primary, false);
        }
        editor.run_steps(6);
        assert!(editor.query_by_role(Role::TextInput).is_some(), "a text field is open");
        editor.event(Event::Text(text.to_owned()));
        editor.step();
        editor.key_press(key);
        editor.run_steps(3);
        assert_eq!(sets(&editor, Knob::ConcertPitch), [] as [f32; 0], "{text} {key:?}");
    }
}

#[test]
fn the_wheel_turns_by_notches() {
    let mut editor = editor();
    let at = centre(&editor, "integration");
    editor.hover_at(at);
    editor.step();
    for _ in 0..3 {
        editor.event(Event::MouseWheel {
            unit: MouseWheelUnit::Line,
            delta: vec2(0.0, 1.0),
            phase: egui::TouchPhase::Move,
            modifiers: Modifiers::NONE,
            source: egui::MouseWheelSource::Unknown,
        });
        editor.run_steps(2);
    }
    let values = sets(&editor, Knob::Integration);
    assert_eq!(values.len(), 3, "a gesture for each notch: {values:?}");
}

#[test]
fn a_right_click_sets_the_default() {
    let mut editor = editor();
    let at = centre(&editor, "integration");
    editor.hover_at(at);
    button(&editor, at, PointerButton::Secondary, true);
    button(&editor, at, PointerButton::Secondary, false);
    editor.run_steps(2);
    let values = sets(&editor, Knob::Integration);
    let text = shown(&editor.state().parameters.analysis.integration, values[0]);
    assert_eq!((values.len(), text.as_str()), (1, "400 ms"));
}

#[test]
fn choices_open_as_a_list() {
    let mut editor = editor();
    editor.get_by_label_contains("listening to").click();
    editor.run_steps(2);
    editor.get_by_label("Side").click();
    editor.run_steps(2);
    assert_eq!(sets(&editor, Knob::Channel), [1.0], "the last of four");
}

#[test]
fn switches_are_whole_gestures() {
    for (label, knob) in [("Freeze", Knob::Freeze), ("Check", Knob::Check)] {
        let mut editor = editor();
        editor.get_by_label(label).click();
        editor.run_steps(2);
        assert_eq!(sets(&editor, knob), [1.0], "{label}");
    }
}

#[test]
fn the_keyboard_reaches_and_changes_a_field() {
    let mut editor = editor();
    editor.get_by_label_contains("tolerance").focus();
    editor.run_steps(2);
    editor.key_press(Key::ArrowUp);
    editor.run_steps(2);
    editor.key_press(Key::Delete);
    editor.run_steps(2);
    let values = sets(&editor, Knob::Tolerance);
    assert_eq!(values.len(), 2, "a step and the default: {values:?}");
}

#[test]
fn the_drift_trace_scrolls_back_and_returns() {
    let mut editor = editor();
    let at = centre(&editor, "Drift: cents");
    drag(&mut editor, at, vec2(300.0, 0.0));
    editor.get_by_label("now").click();
    editor.run_steps(3);
    assert!(editor.query_by_label("now").is_none(), "it follows the newest reading again");
    assert_eq!(editor.state().gestures, [], "no parameter was touched");
}

fn drag(editor: &mut Editor, at: Pos2, by: Vec2) {
    editor.hover_at(at);
    editor.step();
    button(editor, at, PointerButton::Primary, true);
    editor.step();
    for step in 1..=5 {
        editor.hover_at(at + by * (step as f32 / 5.0));
        editor.step();
    }
    button(editor, at + by, PointerButton::Primary, false);
    editor.run_steps(2);
}

fn shown(parameter: &impl nice_plug::prelude::Param, normalized: f32) -> String {
    parameter.normalized_value_to_string(normalized, true)
}
