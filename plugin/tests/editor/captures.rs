//! Captures: kept, named, compared, forgotten, taken in and out.

use egui::{Event, Key};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use plumbtone_analysis::State;
use plumbtone_plugin::captures::{CAPTURES_MAX, Capture, Snapshot};
use plumbtone_plugin::editor::Theme;

use crate::open;
use crate::scenes::Scene;

type Editor = Harness<'static, Scene>;

fn editor(scene: Scene) -> Editor {
    let mut editor = open(scene);
    editor.get_by_label("Captures").click();
    editor.run_steps(3);
    editor
}

fn kept(editor: &Editor) -> Vec<Capture> {
    let mut snapshot = Snapshot::default();
    editor.state().parameters.captures.look(&mut snapshot);
    snapshot.captures
}

/// Presses a button of the panel, which may have to be scrolled to.
fn press(editor: &mut Editor, label: &str) {
    editor.get_by_label(label).scroll_to_me();
    // Scrolling takes its time.
    editor.run_steps(40);
    editor.get_by_label(label).click();
    editor.run_steps(1);
}

/// Draws frames until a text is there, which is another thread's; false when it never comes.
fn comes(editor: &mut Editor, text: &str) -> bool {
    (0..2_000).any(|_| {
        editor.step();
        std::thread::sleep(core::time::Duration::from_millis(5));
        editor.query_all_by_label_contains(text).next().is_some()
    })
}

#[test]
fn one_action_keeps_what_is_shown() {
    let mut editor = open(Scene::string(Theme::Dark));
    editor.get_by_label("Capture").click();
    editor.run_steps(3);
    assert!(editor.query_by_label("Captured: A3 1.").is_some(), "it is told");
    let found = kept(&editor);
    let reading = &editor.state().readout.reading;
    assert_eq!(found.len(), 1);
    assert_eq!(found[0].reading().partials, reading.partials, "as they are shown");
    assert!(editor.state().gestures.is_empty(), "no parameter was touched");
    editor.state_mut().time_s += 10.0;
    editor.run_steps(2);
    assert!(editor.query_by_label("Captured: A3 1.").is_none(), "it was told long enough");
}

#[test]
fn without_a_pitch_and_without_room_nothing_is_kept_and_it_is_said() {
    let mut scene = Scene::string(Theme::Dark);
    let reading = scene.readout.reading.clone();
    scene.readout.reading.pitch = None;
    scene.readout.reading.state = State::Several;
    let mut editor = open(scene);
    editor.get_by_label("Capture").click();
    editor.run_steps(3);
    assert!(editor.query_by_label_contains("no single pitch.").is_some(), "it is told");
    editor.state_mut().readout.reading = reading;
    for _ in 0..=CAPTURES_MAX {
        editor.run_steps(2);
        editor.get_by_label("Capture").click();
        editor.run_steps(2);
    }
    assert_eq!(kept(&editor).len(), CAPTURES_MAX);
    assert!(editor.query_by_label_contains("24 are kept already").is_some(), "it is told");
}

#[test]
fn two_are_compared_and_the_plumb_view_comes_back() {
    let mut editor = editor(Scene::captured(Theme::Dark));
    assert!(editor.query_by_label_contains("Plumb view").is_some());
    editor.get_by_label("A: Pluck, first idea").click();
    editor.run_steps(3);
    assert!(editor.query_by_label_contains("Difference view").is_some(), "against what is heard");
    let row = "partial 7, only in live";
    assert!(editor.query_by_label_contains(row).is_some(), "the capture lacks partial 7");
    let noise = editor.query_by_label_contains("partial 4, ").map(|row| format!("{row:?}"));
    assert!(noise.is_some_and(|row| row.contains("dB")), "a row tells its figures");
    editor.get_by_label("B: Pluck, softer").click();
    editor.run_steps(3);
    let row = "partial 20, only in Pluck, first idea";
    assert!(editor.query_by_label_contains(row).is_some(), "the softer one has 14");
    editor.get_by_label("A: Pluck, first idea").click();
    editor.run_steps(3);
    assert!(editor.query_by_label_contains("Plumb view").is_some(), "nothing is compared");
}

#[test]
fn b_alone_is_compared_with_the_newest_other() {
    let mut editor = editor(Scene::captured(Theme::Dark));
    editor.get_by_label("B: Saw").click();
    editor.run_steps(3);
    let row = "partial 20, only in Saw";
    assert!(editor.query_by_label_contains(row).is_some(), "against the softer pluck");
}

#[test]
fn silence_has_nothing_to_compare() {
    let mut scene = Scene::captured(Theme::Dark);
    scene.readout.reading.pitch = None;
    scene.screen.compare(Some(1), None);
    let editor = open(scene);
    assert!(editor.query_by_label_contains("live has no single pitch").is_some());
}

#[test]
fn a_capture_is_named_painted_and_forgotten() {
    let mut editor = editor(Scene::captured(Theme::Dark));
    editor.get_by_label("capture 2: Pluck, softer").click();
    editor.run_steps(3);
    editor.get_by_label("name").focus();
    editor.run_steps(2);
    editor.key_press(Key::End);
    editor.event(Event::Text(" still".to_owned()));
    editor.run_steps(2);
    editor.get_by_label("colour 5").click();
    editor.run_steps(2);
    let found = kept(&editor);
    assert_eq!((found[1].name.as_str(), found[1].colour), ("Pluck, softer still", 4));
    press(&mut editor, "forget this one");
    editor.run_steps(3);
    let names: Vec<String> = kept(&editor).into_iter().map(|capture| capture.name).collect();
    assert_eq!(names, ["Pluck, first idea", "Saw"]);
}

#[test]
fn captures_go_out_and_come_in_through_the_clipboard() {
    let mut editor = editor(Scene::captured(Theme::Dark));
    editor.get_by_label("capture 1: Pluck, first idea").click();
    editor.run_steps(3);
    press(&mut editor, "copy recipe as CSV");
    let csv = copied(&editor);
    assert_eq!(csv.lines().count(), 20, "a head and nineteen partials: {csv}");
    press(&mut editor, "copy all as JSON");
    let json = copied(&editor);
    editor.get_by_label("captures' file").focus();
    editor.run_steps(2);
    editor.event(Event::Paste(json));
    editor.run_steps(3);
    assert!(editor.query_all_by_label("3 taken in.").next().is_some(), "it is told");
    let found = kept(&editor);
    assert_eq!(found.len(), 6);
    assert_eq!(found[3].partials, found[0].partials, "figure for figure");
}

fn copied(editor: &Editor) -> String {
    let commands = editor.output().platform_output.commands.iter();
    let mut texts = commands.filter_map(|command| match command {
        egui::OutputCommand::CopyText(text) => Some(text.clone()),
        _ => None,
    });
    texts.next_back().unwrap_or_default()
}

#[test]
fn captures_go_through_files_and_what_stands_in_the_way_is_said() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("patch.json").display().to_string();
    let mut editor = editor(Scene::captured(Theme::Dark));
    press(&mut editor, "save all");
    assert!(comes(&mut editor, "Nothing was saved: no file is named"), "it is said");
    editor.get_by_label("captures' file").focus();
    editor.run_steps(2);
    editor.event(Event::Paste(path.clone()));
    editor.run_steps(2);
    press(&mut editor, "save all");
    assert!(comes(&mut editor, "Saved: "), "it is said");
    press(&mut editor, "take in");
    assert!(comes(&mut editor, "3 taken in"), "it is said");
    assert_eq!(kept(&editor).len(), 6);
    std::fs::write(&path, "{\"plumbtone_captures\":1,\"captures\":[{}]}").unwrap();
    press(&mut editor, "take in");
    assert!(comes(&mut editor, "1 of 1 captures were damaged"), "it is said");
    assert_eq!(kept(&editor).len(), 6, "the others are as they were");
}
