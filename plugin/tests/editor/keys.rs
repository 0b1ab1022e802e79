//! The key sheet: what is shown of it, over the keyboard and key by key, and what is done with it.

use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use plumbtone_plugin::check::Reports;
use plumbtone_plugin::editor::Theme;
use plumbtone_plugin::keys::{Declined, Row, Snapshot, Stored};

use crate::open;
use crate::scenes::{Scene, key_row};

type Editor = Harness<'static, Scene>;

fn editor(scene: Scene) -> Editor {
    let mut editor = open(scene);
    editor.get_by_label("Keys").click();
    editor.run_steps(3);
    editor
}

fn kept(editor: &Editor) -> Stored {
    let mut snapshot = Snapshot::default();
    editor.state().parameters.sheet.look(&mut snapshot);
    snapshot.stored
}

fn told(editor: &Editor, text: &str) -> usize {
    editor.query_all_by_label_contains(text).count()
}

#[test]
fn each_key_has_its_figures_in_sheet_and_picture() {
    let editor = editor(Scene::keyboard(Theme::Dark));
    for text in [
        "44 keys, C2 to C6",
        "still to play: C\u{266f}3, D4 to E4, E5",
        "C4, the newest: +",
        "C4 in the picture: +",
        "D4 in the picture: still to play",
        "C6 in the picture",
        "the pitch never settles",
        "the nearest note, no key was held",
    ] {
        assert!(told(&editor, text) > 0, "{text}");
    }
    let row = key_row(50);
    let level = format!("level \u{2212}{:.1} dBFS", row.level_dbfs.unwrap().abs());
    let said = editor.query_all_by_label_contains(&level).count();
    assert!(said >= 2, "in the sheet and in the picture: {said}");
}

#[test]
fn only_the_tab_brings_the_picture() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    assert_eq!(told(&editor, "Plumb view"), 0, "the picture stands in its place");
    editor.get_by_label("Sound").click();
    editor.run_steps(3);
    assert_eq!((told(&editor, "in the picture"), told(&editor, "Plumb view")), (0, 1), "and back");
}

#[test]
fn without_keys_it_is_told_what_to_do() {
    let editor = editor(Scene::string(Theme::Dark));
    assert_eq!(told(&editor, "Play notes from the host"), 1, "in the panel");
    assert_eq!(told(&editor, "play notes from the host, and"), 1, "in the picture");
    assert!(editor.query_by_label_contains("forget all").is_none(), "there is nothing to forget");
}

#[test]
fn a_note_with_several_keys_is_told() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    editor.state().parameters.sheet.decline(Declined { key: 63 });
    editor.run_steps(2);
    assert_eq!(told(&editor, "E\u{266d}4: other keys were held with it"), 1, "it is told");
    editor.state().parameters.sheet.take(key_row(63));
    editor.run_steps(2);
    assert_eq!(told(&editor, "other keys were held"), 0, "until the next row");
    assert_eq!(told(&editor, "still to play: C\u{266f}3, D4, E4, E5"), 1, "one less");
}

#[test]
fn the_switch_is_kept() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    assert!(!kept(&editor).unplayed, "off at first");
    for on in [true, false] {
        editor.get_by_label("rows without played keys").click();
        editor.run_steps(2);
        assert_eq!(kept(&editor).unplayed, on, "clicked");
    }
}

#[test]
fn nothing_is_forgotten_without_being_asked_twice() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    editor.get_by_label("forget all keys").click();
    editor.run_steps(3);
    assert_eq!(kept(&editor).rows.len(), 44, "asked once");
    editor.get_by_label("keep them").click();
    editor.run_steps(3);
    editor.get_by_label("forget all keys").click();
    editor.run_steps(3);
    editor.get_by_label("forget 44, for good").click();
    editor.run_steps(3);
    assert_eq!(kept(&editor).rows, [], "asked twice");
    assert_eq!(told(&editor, "Play notes from the host"), 1, "what to do is told");
}

#[test]
fn the_sheet_is_copied_as_text_and_csv() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    for (label, lines, expected) in [
        ("Copy the key sheet as text", 47, "still to play: C\u{266f}3"),
        ("Copy the key sheet as CSV", 45, "C4,60,true,1.2,"),
    ] {
        editor.get_by_label_contains(label).click();
        let mut copied = String::new();
        for _ in 0..4 {
            editor.step();
            for command in &editor.output().platform_output.commands {
                if let egui::OutputCommand::CopyText(text) = command {
                    copied.clone_from(text);
                }
            }
        }
        assert!(copied.contains(expected), "{label}: {copied:.300}");
        assert_eq!(copied.lines().count(), lines, "{label}: {copied}");
    }
}

#[test]
fn cents_follow_the_tuning_that_is_set() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    let row = Row { f0_hz: 440.0, f0_sd_cents: 0.01, ..key_row(69) };
    editor.state().parameters.sheet.take(row);
    editor.run_steps(2);
    assert_eq!(told(&editor, "A4, the newest: 0.00 \u{b1} 0.01 ct"), 1, "at 440 Hz");
    let tuning = plumbtone_analysis::tuning::Tuning::new(442.0, Default::default()).unwrap();
    editor.state_mut().readout.tuning = tuning;
    editor.run_steps(2);
    assert_eq!(told(&editor, "A4, the newest: \u{2212}7.85 \u{b1} 0.01 ct"), 1, "at 442 Hz");
}

#[test]
fn a_click_on_a_column_scrolls_to_its_row() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    let top = |editor: &Editor| editor.get_by_label_contains("C2: +").rect().top();
    let before = top(&editor);
    editor.get_by_label_contains("C6 in the picture").click();
    editor.run_steps(40);
    assert!(top(&editor) < before - 300.0, "the lowest key's row has moved up");
}

#[test]
fn the_key_under_the_pointer_is_told_at_once() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    editor.get_by_label_contains("F4 in the picture").hover();
    editor.run_steps(2);
    assert_eq!(told(&editor, "F4  +"), 1, "above the picture");
    editor.get_by_label_contains("D4 in the picture").hover();
    editor.run_steps(2);
    assert_eq!(told(&editor, "D4  still to play"), 1, "a missing one too");
    editor.get_by_label_contains("E\u{266d}2: +").hover();
    editor.run_steps(3);
    assert_eq!(told(&editor, "E\u{266d}2  +"), 1, "a row of the sheet lights its column");
}

#[test]
fn the_sheet_is_written_as_a_file_or_the_reason_said() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    let comes = |editor: &mut Editor, text: &str| {
        (0..2_000).any(|_| {
            editor.step();
            std::thread::sleep(core::time::Duration::from_millis(5));
            told(editor, text) > 0
        })
    };
    editor.get_by_label("write CSV").click();
    assert!(comes(&mut editor, "No report was written: no folder is set"), "it is said");
    assert!(told(&editor, "files into the folder") > 0, "and asked for");
    let folder = tempfile::tempdir().unwrap();
    let results = editor.state().parameters.results.clone();
    results.set_reports(Reports {
        folder: folder.path().display().to_string(),
        name: "Pad".to_owned(),
        ..Reports::default()
    });
    editor.run_steps(2);
    editor.get_by_label("write CSV").click();
    let written = format!("written: {}", folder.path().display());
    assert!(comes(&mut editor, &written), "it is said");
    let files: Vec<_> =
        std::fs::read_dir(folder.path()).unwrap().map(|f| f.unwrap().path()).collect();
    assert_eq!(files.len(), 1, "{files:?}");
    let name = files[0].file_name().unwrap().to_string_lossy().into_owned();
    assert!(name.starts_with("Pad keys ") && name.ends_with(".csv"), "{name}");
    let text = std::fs::read_to_string(&files[0]).unwrap();
    assert_eq!(text.lines().count(), 45, "a head and a line for each key");
}

#[test]
fn the_key_just_played_is_scrolled_to() {
    let mut editor = editor(Scene::keyboard(Theme::Dark));
    let top = |editor: &Editor| editor.get_by_label_contains("C2: +").rect().top();
    let before = top(&editor);
    editor.state().parameters.sheet.take(key_row(84));
    editor.run_steps(40);
    assert!(top(&editor) < before - 300.0, "the lowest key's row has moved up");
    editor.state().parameters.sheet.take(key_row(36));
    editor.run_steps(40);
    let moved = editor.get_by_label_contains("C2, the newest").rect().top() - before;
    assert!(moved.abs() < 40.0, "and back: {moved}");
}
