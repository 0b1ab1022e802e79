//! The results of drift checks: what is shown of them and what is done with them.

use egui::{Event, Key, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use plumbtone_plugin::check::{CheckResult, Reports, Snapshot};
use plumbtone_plugin::editor::{Gesture, Knob, Theme};

use crate::open;
use crate::scenes::Scene;

type Editor = Harness<'static, Scene>;

fn editor() -> Editor {
    let mut editor = open(Scene::checked(Theme::Dark));
    editor.get_by_label("Checks").click();
    editor.run_steps(3);
    editor
}

fn results(editor: &Editor) -> Vec<CheckResult> {
    let mut snapshot = Snapshot::default();
    editor.state().parameters.results.look(&mut snapshot);
    snapshot.stored.results
}

/// Draws frames until a text is there, which is another thread's; false when it never comes.
fn comes(editor: &mut Editor, text: &str) -> bool {
    (0..2_000).any(|_| {
        editor.step();
        std::thread::sleep(core::time::Duration::from_millis(5));
        editor.query_by_label_contains(text).is_some()
    })
}

#[test]
fn each_result_says_its_verdict_and_where() {
    let editor = editor();
    for text in [
        "check 1: within, 2|1.00 to 5|1.00",
        "check 2: outside, 9|1.00 to 12|1.00",
        "check 3: unmeasured, 13|1.00 to 15|1.00",
        "1 outside, 1 within, 1 unmeasured",
        "acceptance limits are the session's own",
    ] {
        assert!(editor.query_by_label_contains(text).is_some(), "{text}");
    }
}

#[test]
fn a_result_opens_and_leads_to_its_place() {
    let mut editor = editor();
    editor.get_by_label_contains("check 1: within, 2|1.00").click();
    editor.run_steps(3);
    assert!(editor.query_by_label("now").is_none(), "the trace follows the newest reading");
    editor.get_by_label("show in the trace").click();
    editor.run_steps(4);
    assert!(editor.query_by_label("now").is_some(), "the trace has gone back");
    let told = editor.query_all_by_label("check 1: within, worst +2.1 ct").count();
    assert_eq!(told, 2, "at its line, and as the verdict of what is shown");
}

#[test]
fn a_comment_is_kept() {
    let mut editor = editor();
    editor.get_by_label_contains("check 2: outside, 9|1.00").click();
    editor.run_steps(3);
    editor.get_by_label("comment").focus();
    editor.run_steps(2);
    editor.event(Event::Text("second verse".to_owned()));
    editor.run_steps(2);
    editor.key_press(Key::Enter);
    editor.run_steps(2);
    assert_eq!(results(&editor)[1].comment, "second verse");
}

#[test]
fn what_is_sent_while_outside_is_chosen_from_a_list() {
    let mut editor = Scene::checked(Theme::Dark).open(vec2(1120.0, 1200.0), 1.0);
    editor.run_steps(2);
    editor.get_by_label("Checks").click();
    editor.run_steps(3);
    assert!(editor.query_by_label_contains("channel:").is_none(), "off: nothing else to be set");
    let at = editor.get_by_label("MIDI when outside: Off").rect().center();
    editor.hover_at(at);
    editor.step();
    editor.event(Event::MouseWheel {
        unit: egui::MouseWheelUnit::Line,
        delta: vec2(0.0, -1.0),
        phase: egui::TouchPhase::Move,
        modifiers: egui::Modifiers::NONE,
        source: egui::MouseWheelSource::Unknown,
    });
    editor.run_steps(2);
    assert_eq!(editor.state().gestures, [], "the wheel scrolls the panel");
    editor.get_by_label("MIDI when outside: Off").click();
    editor.run_steps(2);
    editor.get_by_label("Controller").click();
    editor.run_steps(2);
    let chosen = Gesture::Set(Knob::MidiOutput, 1.0);
    assert!(editor.state().gestures.contains(&chosen), "{:?}", editor.state().gestures);
}

#[test]
fn nothing_is_forgotten_without_being_asked_twice() {
    let mut editor = editor();
    editor.get_by_label("forget all results").click();
    editor.run_steps(3);
    assert_eq!(results(&editor).len(), 3, "asked once");
    editor.get_by_label("keep them").click();
    editor.run_steps(3);
    editor.get_by_label("forget all results").click();
    editor.run_steps(3);
    editor.get_by_label("forget 3, for good").click();
    editor.run_steps(3);
    assert_eq!(results(&editor), [], "asked twice");
    assert!(editor.query_by_label_contains("Switch Check on").is_some(), "what to do is told");
}

#[test]
fn a_report_is_written_or_the_reason_said() {
    let mut editor = editor();
    editor.get_by_label("write report").click();
    assert!(comes(&mut editor, "No report was written: no folder is set"), "it is said");
    assert_eq!(results(&editor).len(), 3, "the results are still there");
    let folder = tempfile::tempdir().unwrap();
    let reports = |folder: &std::path::Path| Reports {
        automatic: false,
        folder: folder.display().to_string(),
        name: "Bass".to_owned(),
    };
    let results = editor.state().parameters.results.clone();
    results.set_reports(reports(&folder.path().join("gone")));
    editor.run_steps(2);
    editor.get_by_label("write report").click();
    assert!(comes(&mut editor, "gone is not there"), "it is said");
    results.set_reports(reports(folder.path()));
    editor.run_steps(2);
    editor.get_by_label("write report").click();
    assert!(comes(&mut editor, ".csv, .json, .svg"), "it is said");
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 3, "CSV, JSON and SVG");
}
