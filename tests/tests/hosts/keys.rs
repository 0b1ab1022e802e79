//! Key sheets in a host: notes go to an instrument and to the plugin after it, and each key gets the row that is its own.

use std::path::Path;
use std::process::Command;

use clack_host::events::event_types::{NoteOffEvent, NoteOnEvent};
use clack_host::prelude::*;
use plumbtone_analysis::signals::{Random, Timbre, Tone, narrow, sample_count};
use plumbtone_analysis::tuning::{NoteName, Tuning, ratio};
use plumbtone_plugin::keys::{Row, Stored};
use plumbtone_tests::clap_host::{Format, Instance};
use plumbtone_tests::readings::VARIABLE;
use tempfile::TempDir;

use crate::bundles::{target, there};
use crate::rig::{Log, instance, json, load};

const RATE: f64 = 48_000.0;
/// From one key to the next, how long each is held, and how long it rings on, in seconds.
const EVERY_S: f64 = 0.8;
const HELD_S: f64 = 0.5;
const RELEASE_S: f64 = 0.1;
/// How long after its key the sound begins, in samples: the instrument's own latency.
const LATENCY: usize = 311;
/// Level of the strongest partial, in dBFS, and the noise's standard deviation.
const LEVEL_DBFS: f64 = -14.0;
const NOISE: f64 = 1e-5;

/// Keys with the samples at which they go down and up.
type Played = Vec<(u8, usize, usize)>;

/// How far off a key the instrument plays, in cents: an even stretch, and one key out of order.
fn off_cents(key: u8) -> f64 {
    let stretch = 0.12 * (f64::from(key) - 60.0);
    if key == 55 { stretch - 17.0 } else { stretch }
}

/// A key's sound, from its onset on; it fades in within 4 ms and out after `held`.
fn sound_of(key: u8, held: usize) -> Vec<f64> {
    let tuning = Tuning::default();
    let hz = tuning.frequency_hz(NoteName::from_midi(i16::from(key))) * ratio(off_cents(key));
    let timbre = Timbre {
        partials: 16,
        level_dbfs: LEVEL_DBFS,
        tilt_db_per_octave: -6.0,
        scatter_db: 0.0,
        t60_s: None,
    };
    let tone = Tone::random(&mut Random::new(u64::from(key)), RATE, hz, 2e-4, &timbre);
    let release = sample_count(RELEASE_S, RATE);
    let mut sound = tone.render(held + release);
    for (n, sample) in sound.iter_mut().enumerate() {
        let attack = (n as f64 / 192.0).min(1.0);
        let fade = ((held + release - n) as f64 / release as f64).min(1.0);
        *sample *= attack * fade * fade;
    }
    sound
}

/// The sound of all keys and the keys themselves.
fn sweep(keys: impl Iterator<Item = u8>, held_s: f64) -> (Vec<f32>, Played) {
    let held = sample_count(held_s, RATE);
    let played: Played = keys
        .enumerate()
        .map(|(number, key)| {
            let down = 9_600 + sample_count(number as f64 * EVERY_S, RATE);
            (key, down, down + held)
        })
        .collect();
    let length = played.last().map_or(0, |last| last.2) + 24_000;
    let mut random = Random::new(5);
    let mut sound: Vec<f64> = (0..length).map(|_| NOISE * random.normal()).collect();
    for &(key, down, up) in &played {
        let from = &mut sound[down + LATENCY..];
        from.iter_mut().zip(sound_of(key, up - down)).for_each(|(to, x)| *to += x);
    }
    (narrow(&sound), played)
}

/// Plays a sound with its keys through an instance.
fn play(instance: &mut Instance, sound: &[f32], played: &Played, block: usize) {
    let format = Format { sample_rate_hz: RATE, block_max: block, channels: 2, offline: true };
    let mut running = instance.start(format).expect("it starts");
    for (number, part) in sound.chunks(block).enumerate() {
        let within = number * block..number * block + part.len();
        let mut edges: Vec<(usize, bool, u8)> = played
            .iter()
            .flat_map(|&(key, down, up)| [(down, true, key), (up, false, key)])
            .filter(|(at, ..)| within.contains(at))
            .collect();
        edges.sort_unstable();
        let mut events = EventBuffer::new();
        for (at, down, key) in edges {
            let offset = u32::try_from(at - within.start).expect("within the block");
            let pckn = Pckn::new(0_u16, 0_u16, u16::from(key), 1_u32);
            if down {
                events.push(&NoteOnEvent::new(offset, pckn, 0.8));
            } else {
                events.push(&NoteOffEvent::new(offset, pckn, 0.0));
            }
        }
        running
            .process(&[part, part], &InputEvents::from_buffer(&events), None)
            .expect("processes");
    }
    instance.stop(running);
}

/// What the instance keeps of the keys.
fn kept(instance: &mut Instance) -> Stored {
    let state = json(&instance.save().expect("a state"));
    let text = state["fields"]["keys"].as_str().expect("the keys are kept");
    serde_json::from_str(text).expect("in their form")
}

/// The rows that a sweep ends in. The log has the plugin measure, as an open editor would.
fn rows(sound: &[f32], played: &Played, block: usize) -> Vec<Row> {
    let _log = Log::open();
    let mut instance = instance();
    play(&mut instance, sound, played, block);
    kept(&mut instance).rows
}

/// Checks that every key has its row, with the figures that it was made with.
fn check(rows: &[Row], keys: &[u8]) {
    let found: Vec<u8> = rows.iter().map(|row| row.key).collect();
    assert_eq!(found, keys, "one row per key");
    for row in rows {
        let off = row.cents(&Tuning::default()) - off_cents(row.key);
        let allowed = 4.0 * row.f0_sd_cents + 1e-3;
        assert!(off.abs() < allowed, "{}: {off} cents off, {allowed} allowed: {row:?}", row.note());
        assert!(row.f0_sd_cents < 1.0 && row.told, "{row:?}");
        let settling_s = row.settling_s.expect("it settles");
        assert!(settling_s < 0.12, "it holds from the start: {row:?}");
        let level = row.level_dbfs.expect("a level");
        assert!(
            (level - rows[0].level_dbfs.unwrap_or(0.0)).abs() < 1.0,
            "all are as loud: {row:?}"
        );
    }
    // A partial too many, found in the noise, bends the slope of a key, but not of most.
    let mut tilts: Vec<f64> = rows.iter().filter_map(|row| row.tilt_db_per_octave).collect();
    tilts.sort_by(f64::total_cmp);
    assert!((tilts[tilts.len() / 2] + 6.0).abs() < 0.1, "{tilts:?}");
}

#[test]
fn a_sweep_gives_one_row_per_key_whatever_the_block() {
    let keys: Vec<u8> = (45..=79).step_by(2).collect();
    let (sound, played) = sweep(keys.iter().copied(), HELD_S);
    let first = rows(&sound, &played, 512);
    check(&first, &keys);
    for block in [64, 480, 4096] {
        assert_eq!(rows(&sound, &played, block), first, "blocks of {block}");
    }
}

#[test]
fn a_scale_played_in_a_vst3_host_gives_the_sheet_of_its_instrument() {
    let what = "the key sheet in dawdreamer";
    let bundle = there(target().join("bundled/Plumbtone.vst3"), what);
    let python = there(target().join("vst3-hosts/bin/python"), what);
    let (Some(bundle), Some(python)) = (bundle, python) else { return };
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("hosts/keys_host.py");
    let folder = TempDir::new().expect("a temporary folder");
    // Far above, the aliases of a naive saw may lie on a series of their own.
    let keys: Vec<u8> = (36..=87).step_by(3).collect();
    let mut sheets = Vec::new();
    for block in ["512", "480"] {
        let output = Command::new(&python)
            .arg(&script)
            .arg(&bundle)
            .args(["36", "87", "3", block])
            .env(VARIABLE, folder.path())
            .output()
            .expect("the host starts");
        let said = String::from_utf8_lossy(&output.stdout);
        let errors = String::from_utf8_lossy(&output.stderr);
        assert!(output.status.success(), "{said}{errors}");
        let line = said.lines().last().expect("a sheet");
        let stored: Stored = serde_json::from_str(line).expect("in its form");
        let found: Vec<u8> = stored.rows.iter().map(|row| row.key).collect();
        assert_eq!(found, keys, "blocks of {block}: one row per key");
        sheets.push(stored.rows);
    }
    for row in &sheets[0] {
        let stretched = 3.0 * (f64::from(row.key) - 69.0) / 12.0;
        let off = row.cents(&Tuning::default()) - stretched;
        let allowed = 4.0 * row.f0_sd_cents + 2e-3;
        assert!(off.abs() < allowed, "{}: {off} cents off: {row:?}", row.note());
        assert!(row.told && row.settling_s.is_some_and(|s| s < 0.2), "{row:?}");
    }
    // A naive saw folds: the higher the key, the more of it is heard.
    let over = |row: &Row| row.worst_alias.and_then(|alias| alias.over_mask_db);
    let high: Vec<Option<f64>> = sheets[0].iter().rev().take(3).map(over).collect();
    assert!(high.iter().all(|over| over.is_some_and(|over| over > 0.0)), "{high:?}");
}

#[test]
fn legato_keys_lap_over_each_other_and_are_told_apart() {
    let keys = [60, 62, 64, 65, 67];
    // Each key sounds until the next one comes, and is let go 40 ms after that.
    let (mut sound, _) = sweep(keys.into_iter(), EVERY_S - RELEASE_S);
    let step = sample_count(EVERY_S, RATE);
    let played: Played = (0..keys.len())
        .map(|number| (keys[number], 9_600 + number * step, 9_600 + (number + 1) * step + 1_920))
        .collect();
    sound.truncate(9_600 + keys.len() * step + 24_000);
    check(&rows(&sound, &played, 512), &keys);
}

#[test]
fn without_keys_rows_are_made_only_where_that_is_set() {
    let (sound, _) = sweep([57, 60, 64].into_iter(), HELD_S);
    for (unplayed, expected) in [(false, &[][..]), (true, &[57, 60, 64])] {
        let _log = Log::open();
        let mut instance = instance();
        let mut state = json(&instance.save().expect("a state"));
        let stored = Stored { unplayed, ..Stored::default() };
        state["fields"]["keys"] = serde_json::to_string(&stored).expect("JSON").into();
        load(&mut instance, &state);
        play(&mut instance, &sound, &Vec::new(), 480);
        let kept = kept(&mut instance);
        let found: Vec<u8> = kept.rows.iter().map(|row| row.key).collect();
        assert_eq!((kept.unplayed, &found[..]), (unplayed, expected), "{:?}", kept.rows);
        assert!(kept.rows.iter().all(|row| !row.told), "no key was played: {:?}", kept.rows);
    }
}

#[test]
fn a_chord_gives_no_row_and_the_sheet_survives_a_reload() {
    let (sound, mut played) = sweep([57, 60, 64].into_iter(), HELD_S);
    // Another key is held beside the second one.
    let (_, down, up) = played[1];
    played.push((72, down, up));
    let _log = Log::open();
    let mut first = instance();
    play(&mut first, &sound, &played, 512);
    let before = kept(&mut first);
    let keys: Vec<u8> = before.rows.iter().map(|row| row.key).collect();
    assert_eq!(keys, [57, 64], "{:?}", before.rows);
    let saved = first.save().expect("a state");
    let mut second = instance();
    second.load(saved.as_slice()).expect("it loads");
    assert_eq!(kept(&mut second), before, "all rows, bit for bit");
    let mut state = json(&saved);
    let text = state["fields"]["keys"].as_str().expect("the keys").to_owned();
    state["fields"]["keys"] = text.replacen("\"key\":57", "\"key\":157", 1).into();
    let mut third = instance();
    load(&mut third, &state);
    assert_eq!(kept(&mut third).rows, before.rows[1..], "all but the damaged one");
    play(&mut third, &sound, &played, 512);
    let again = kept(&mut third);
    assert_eq!(again.rows.len(), 2, "played again: {:?}", again.rows);
    assert!(again.rows.iter().all(|row| row.take > before.rows[1].take), "newer takes: {again:?}");
}
