//! Drift checks in a host: the automated parameter marks stretches, each ends in a result that is the engine's own, and a
//! bounce ends in a report.

use std::fs;
use std::path::Path;
use std::process::Command;

use clack_host::events::event_types::NoteOnEvent;
use clack_host::prelude::*;
use plumbtone_analysis::check::{Check, CheckSettings, CheckSink, Outcome, Reference};
use plumbtone_analysis::signals::{
    Motion, MovingTone, Point, Random, Timbre, Tone, Vibrato, narrow, sample_count,
};
use plumbtone_analysis::tuning::Tuning;
use plumbtone_analysis::{Analyzer, Settings};
use plumbtone_plugin::check::{CheckResult, Reports, Stored, VerdictWord};
use plumbtone_tests::clap_host::{Format, Instance};
use plumbtone_tests::take::Take;
use serde_json::Value;
use tempfile::TempDir;

use crate::bundles::{target, there};
use crate::rig::{Log, instance, json, load, set};
use crate::session::{START_S, transport};
use crate::the_program::write_stereo;

const RATE: f64 = 48_000.0;
const LENGTH_S: f64 = 9.0;
/// Where the lane switches Check on and off, in samples: within the tolerance, outside it, under a vibrato.
pub(crate) const LANE: [(usize, usize); 3] =
    [(24_123, 120_000), (131_001, 262_144), (288_000, 416_000)];

/// A3 that is in tune, then 15 cents sharp from 3.5 s to 5 s, then has a vibrato.
pub(crate) fn sound() -> Vec<f32> {
    let mut random = Random::new(77);
    let timbre = Timbre { partials: 12, tilt_db_per_octave: -6.0, ..Timbre::default() };
    let tone = Tone::random(&mut random, RATE, 220.0, 1e-4, &timbre);
    let point = |time_s, cents| Point { time_s, cents };
    let course = vec![point(3.5, 0.0), point(3.5, 15.0), point(5.0, 15.0), point(5.0, 0.0)];
    let still = MovingTone::new(tone.clone(), Motion { course, ..Motion::default() }, LENGTH_S);
    let swing = Vibrato { rate_hz: 5.7, extent_cents: 40.0, phase_rad: 0.0 };
    let motion = Motion { vibrato: Some(swing), ..Motion::default() };
    let mut sound = still.render(sample_count(5.75, RATE));
    sound.extend(MovingTone::new(tone, motion, LENGTH_S).render(sample_count(3.25, RATE)));
    narrow(&sound)
}

/// What a render plays.
#[derive(Clone, Copy)]
struct Played<'a> {
    sound: &'a [f32],
    /// Where Check goes on and off, in samples.
    lane: &'a [(usize, usize)],
    /// Keys that go down, with their samples.
    keys: &'a [(usize, u16)],
}

impl<'a> Played<'a> {
    fn new(sound: &'a [f32], lane: &'a [(usize, usize)]) -> Self {
        Self { sound, lane, keys: &[] }
    }
}

/// Renders a sound offline with Check on over some stretches, and keys going down; the session's time is given for each
/// sample.
fn bounce(
    instance: &mut Instance,
    Played { sound, lane, keys }: Played<'_>,
    block: usize,
    session_s: impl Fn(usize) -> f64,
) {
    let format = Format { sample_rate_hz: RATE, block_max: block, channels: 2, offline: true };
    let mut running = instance.start(format).expect("it starts");
    for (number, part) in sound.chunks(block).enumerate() {
        let from = number * block;
        let mut events = EventBuffer::new();
        for at in from..from + part.len() {
            let offset = u32::try_from(at - from).expect("within the block");
            if lane.iter().any(|&(on, _)| on == at) {
                events.push(&set(instance, "Check", "On", offset));
            }
            if lane.iter().any(|&(_, off)| off == at) {
                events.push(&set(instance, "Check", "Off", offset));
            }
            for &(_, key) in keys.iter().filter(|&&(down, _)| down == at) {
                events.push(&NoteOnEvent::new(offset, Pckn::new(0_u16, 0_u16, key, 1_u32), 0.5));
            }
        }
        let told = transport(session_s(from));
        let events = InputEvents::from_buffer(&events);
        running.process(&[part, part], &events, Some(&told)).expect("it processes");
    }
    instance.stop(running);
}

/// What the instance keeps of its checks.
fn kept(instance: &mut Instance) -> Stored {
    let state = json(&instance.save().expect("a state"));
    let text = state["fields"]["checks"].as_str().expect("the checks are kept");
    serde_json::from_str(text).expect("in their form")
}

/// Changes what the instance keeps of its checks, by way of its state.
fn keep(instance: &mut Instance, stored: &Stored) {
    let mut state = json(&instance.save().expect("a state"));
    state["fields"]["checks"] = serde_json::to_string(stored).expect("JSON").into();
    load(instance, &state);
}

fn rendered(block: usize) -> Vec<CheckResult> {
    let mut instance = instance();
    bounce(&mut instance, Played::new(&sound(), &LANE), block, |at| START_S + at as f64 / RATE);
    kept(&mut instance).results
}

/// The check alone, over the samples of one stretch.
pub(crate) fn alone(sound: &[f32], lane: (usize, usize)) -> Outcome {
    alone_into(sound, lane, &mut ())
}

/// The same, with what it tells on the way.
pub(crate) fn alone_into(
    sound: &[f32],
    (on, off): (usize, usize),
    sink: &mut impl CheckSink,
) -> Outcome {
    let settings = Settings::new(RATE);
    let mut analyzer = Analyzer::new(&settings).expect("an engine");
    let mut take = Take::default();
    analyzer.skip(on as u64, &mut take);
    analyzer.push(&sound[on..off], &mut take);
    analyzer.finish(&mut take);
    let settings =
        CheckSettings { tolerance_cents: 5.0, ..CheckSettings::new(RATE, analyzer.hop()) };
    let reference = Reference::Nearest(Tuning::default());
    let mut check = Check::new(&settings, reference).expect("a check");
    take.readings.iter().for_each(|reading| check.reading(reading, sink));
    check.finish(sink);
    check.outcome()
}

#[test]
fn an_automated_lane_ends_in_the_verdicts_of_its_stretches() {
    let results = rendered(512);
    let verdicts: Vec<VerdictWord> = results.iter().map(|result| result.verdict).collect();
    let expected = [VerdictWord::Within, VerdictWord::Outside, VerdictWord::Within];
    assert_eq!(verdicts, expected, "{results:#?}");
    for (result, (on, off)) in results.iter().zip(LANE) {
        let extent = result.extent;
        let session = |at: usize| START_S + at as f64 / RATE;
        let near = |a: f64, b: f64| (a - b).abs() < 1e-3;
        assert!(
            near(extent.start_s, session(on)) && near(extent.end_s, session(off)),
            "{extent:?}"
        );
        // At 90 quarter notes a minute in 3/4 a bar lasts two seconds.
        let (bar, beat) = (extent.start_bar.expect("a bar"), extent.start_beat.expect("a beat"));
        let beats = 3.0 * (bar - 1) as f64 + beat - 1.0;
        assert!(near(beats * 60.0 / 90.0, session(on)), "{bar}|{beat} at {} s", session(on));
        let outcome = alone(&sound(), (on, off));
        assert_eq!(result.worst_cents, outcome.worst_cents, "as the check alone has it");
        assert_eq!(result.mean_cents, outcome.mean_cents, "as the check alone has it");
        let starts: Vec<i64> = result.spans.iter().map(|span| span.extent.start_sample).collect();
        let shift = extent.start_sample - i64::try_from(on).expect("a position");
        let alone: Vec<i64> = outcome
            .spans
            .iter()
            .map(|span| i64::try_from(span.start).expect("a position") + shift)
            .collect();
        assert_eq!(starts, alone, "spans as the check alone has them");
    }
    let span = results[1].spans[0];
    let (from, to) = (span.extent.start_s - START_S, span.extent.end_s - START_S);
    assert!((from - 3.5).abs() < 0.03 && (to - 5.0).abs() < 0.03, "outside from {from} to {to} s");
    assert!((span.mean_cents - 15.0).abs() < 0.5, "{span:?}");
    let vibrato = results[2].vibrato_extent_cents.expect("a vibrato");
    assert!((vibrato - 40.0).abs() < 2.0, "{vibrato}");
}

#[test]
fn a_bounce_and_its_file_have_the_same_spans() {
    let what = "the comparison of a bounce with its file";
    let program = target().join("debug/plumbtone").with_extension(std::env::consts::EXE_EXTENSION);
    let Some(program) = there(program, what) else { return };
    let folder = TempDir::new().expect("a temporary folder");
    let file = folder.path().join("bounce.wav");
    let sound = sound();
    write_stereo(&file, &[sound.clone(), sound.clone()]);
    let arguments = ["drift", "--json", "--tolerance", "5"];
    let output = Command::new(program).args(arguments).arg(&file).output().expect("it runs");
    let said: Value = serde_json::from_slice(&output.stdout).expect("JSON");
    let mut instance = instance();
    // Check is never switched off: the end of the bounce ends it.
    let lane = [(0, usize::MAX)];
    bounce(&mut instance, Played::new(&sound, &lane), 512, |at| at as f64 / RATE);
    let results = kept(&mut instance).results;
    assert_eq!(results.len(), 1, "{results:#?}");
    let found = serde_json::to_value(&results[0]).expect("JSON");
    let figures = ["verdict", "worst_cents", "mean_cents", "drift_cents_per_s", "measured_share"];
    for field in figures {
        assert_eq!(found[field], said[field], "{field}");
    }
    let spans = |of: &Value| of["spans"].as_array().map_or(0, Vec::len);
    assert_eq!((spans(&found), spans(&said)), (1, 1), "{found} {said}");
    for field in ["start_s", "end_s", "worst_cents", "mean_cents"] {
        assert_eq!(found["spans"][0][field], said["spans"][0][field], "{field} of the span");
    }
}

#[test]
fn blocks_and_repetition_change_nothing() {
    let first = rendered(512);
    for block in [64, 480, 4096, 512, 512] {
        assert_eq!(rendered(block), first, "blocks of {block}");
    }
    // With a log, all of the sound is measured, as with an open editor.
    let _log = Log::open();
    assert_eq!(rendered(512), first, "measured beside the checks too");
}

#[test]
fn the_played_note_is_the_reference_from_its_sample_on() {
    let sound = sound();
    let lane = [(24_000, 148_800)];
    for (key, verdict) in [(57, VerdictWord::Within), (58, VerdictWord::Outside)] {
        let mut instance = instance();
        let mut state = json(&instance.save().expect("a state"));
        state["params"]["reference"] = serde_json::json!({ "string": "played" });
        load(&mut instance, &state);
        assert_eq!(instance.shown("Reference").expect("a text"), "Played notes");
        let keys = [(24_000, 57), (72_000, key)];
        bounce(&mut instance, Played { keys: &keys, ..Played::new(&sound, &lane) }, 480, |at| {
            START_S + at as f64 / RATE
        });
        let results = kept(&mut instance).results;
        assert_eq!(results.len(), 1, "{results:#?}");
        assert_eq!(results[0].verdict, verdict, "key {key}: {results:#?}");
        if verdict == VerdictWord::Outside {
            let start_s = results[0].spans[0].extent.start_s - START_S;
            assert!((start_s - 1.5).abs() < 0.02, "it is outside from the key on: {start_s} s");
        }
    }
}

#[test]
fn a_new_pass_replaces_the_old_one_unless_both_are_kept() {
    let sound = sound();
    let part = Played::new(&sound[..144_000], &[(0, 143_999)]);
    // A loop of one second, from the second second of the session on, three times.
    let looped = |at: usize| START_S + (at % 48_000) as f64 / RATE;
    for (every_pass, expected) in [(false, 1), (true, 3)] {
        let mut instance = instance();
        keep(&mut instance, &Stored { every_pass, ..Stored::default() });
        bounce(&mut instance, part, 480, looped);
        let results = kept(&mut instance).results;
        assert_eq!(results.len(), expected, "every pass kept: {every_pass}; {results:#?}");
        for result in &results {
            let start_s = result.extent.start_s;
            assert!((start_s - START_S).abs() < 1e-3, "each begins with the loop: {start_s}");
        }
    }
}

#[test]
fn results_survive_a_reload_and_damage_costs_what_is_damaged() {
    let mut first = instance();
    bounce(&mut first, Played::new(&sound(), &LANE), 512, |at| START_S + at as f64 / RATE);
    let saved = first.save().expect("a state");
    let before = kept(&mut first);
    let mut second = instance();
    second.load(saved.as_slice()).expect("it loads");
    assert_eq!(kept(&mut second), before, "all results, bit for bit");
    let mut state = json(&saved);
    let text = state["fields"]["checks"].as_str().expect("the checks").to_owned();
    state["fields"]["checks"] = text.replacen("\"within\"", "\"wi\u{fffd}\"", 1).into();
    let mut third = instance();
    load(&mut third, &state);
    assert_eq!(kept(&mut third).results, before.results[1..], "all but the damaged one");
}

#[test]
fn a_bounce_writes_one_report_and_the_same_again() {
    let folder = TempDir::new().expect("a temporary folder");
    let reports = |folder: &Path| Reports {
        automatic: true,
        folder: folder.display().to_string(),
        name: "Bass".to_owned(),
    };
    let sound = sound();
    for pass in 1..=2 {
        let mut instance = instance();
        let stored = Stored { reports: reports(folder.path()), ..Stored::default() };
        keep(&mut instance, &stored);
        bounce(&mut instance, Played::new(&sound, &LANE), 512 * pass, |at| {
            START_S + at as f64 / RATE
        });
        // An instance waits for its reports when it goes.
        drop(instance);
        assert_eq!(texts(folder.path()).len(), 3 * pass, "three files for each of {pass}");
    }
    let texts = texts(folder.path());
    for pair in texts.chunks(2) {
        assert_eq!(pair[0], pair[1], "the same but for the time");
    }
    let mut lost = instance();
    let gone = folder.path().join("gone");
    keep(&mut lost, &Stored { reports: reports(&gone), ..Stored::default() });
    bounce(&mut lost, Played::new(&sound, &LANE), 512, |at| START_S + at as f64 / RATE);
    assert_eq!(kept(&mut lost).results.len(), 3, "without a folder the results stay");
    assert!(!gone.exists(), "no folder is made up");
}

/// All files by their ending, without their time stamps.
pub(crate) fn texts(folder: &Path) -> Vec<String> {
    let mut files: Vec<_> = fs::read_dir(folder)
        .expect("a folder")
        .map(|entry| entry.expect("an entry").path())
        .collect();
    files.sort_by_key(|path| path.extension().map(ToOwned::to_owned));
    files.iter().map(|path| without_time(&fs::read_to_string(path).expect("text"))).collect()
}

/// Takes out what looks like `2026-12-01T18:13:06Z`.
fn without_time(text: &str) -> String {
    let mut out = text.to_owned();
    while let Some(end) = out.find("Z").filter(|&end| end >= 19 && out.as_bytes()[end - 9] == b'T')
    {
        out.replace_range(end - 19..=end, "");
    }
    out
}
