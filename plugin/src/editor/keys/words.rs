//! The key sheet in words, and as text for people.

use std::fmt::Write as _;

use plumbtone_analysis::Stretch;
use plumbtone_analysis::keys::{StretchFound, missing_runs};
use plumbtone_analysis::tuning::{NoteName, Tuning};

use super::super::sound::stretch;
use super::super::steady::{NONE, signed};
use super::super::words::{hertz, note};
use crate::keys::{Declined, KeyAlias, Row};

/// Most runs of missing keys that are listed.
const RUNS_MAX: usize = 8;

/// What is known of the stretch of a row.
pub(super) fn stretch_found(row: &Row) -> Option<StretchFound> {
    let (b, b_sd) = row.inharmonicity_b.zip(row.inharmonicity_sd)?;
    StretchFound::of(b, b_sd)
}

/// A key's name as print has it.
pub(super) fn name(key: u8) -> String {
    note(NoteName::from_midi(i16::from(key)))
}

/// How many keys there are, from which to which.
pub(super) fn compass(rows: &[Row]) -> String {
    match rows {
        [] => String::new(),
        [only] => format!("1 key: {}", name(only.key)),
        [first, .., last] => {
            format!("{} keys, {} to {}", rows.len(), name(first.key), name(last.key))
        }
    }
}

/// The missing keys as runs, from and to.
pub(super) fn missing(rows: &[Row]) -> Vec<(u8, u8)> {
    let keys: Vec<NoteName> = rows.iter().map(Row::note).collect();
    let key = |note: NoteName| u8::try_from(note.midi()).ok();
    let runs = missing_runs(&keys).into_iter();
    runs.filter_map(|(from, to)| Some((key(from)?, key(to)?))).collect()
}

/// A run of keys.
pub(super) fn run((from, to): (u8, u8)) -> String {
    match to - from {
        0 => name(from),
        1 => format!("{}, {}", name(from), name(to)),
        _ => format!("{} to {}", name(from), name(to)),
    }
}

/// Which keys between the lowest and the highest have no row.
pub(super) fn still_to_play(rows: &[Row]) -> Option<String> {
    let runs = missing(rows);
    if runs.is_empty() {
        return None;
    }
    let told: Vec<String> = runs.iter().take(RUNS_MAX).copied().map(run).collect();
    let left: usize = runs.iter().skip(RUNS_MAX).map(|run| usize::from(run.1 - run.0) + 1).sum();
    let more = if left > 0 { format!(" and {left} more") } else { String::new() };
    Some(format!("still to play: {}{more}", told.join(", ")))
}

/// Why the last note has no row.
pub(super) fn declined(declined: &Declined) -> String {
    format!(
        "{}: other keys were held with it, so there is no row. Play one key at a time.",
        name(declined.key)
    )
}

/// Cents with their deviation.
pub(super) fn cents(row: &Row, tuning: &Tuning) -> String {
    if !row.f0_sd_cents.is_finite() {
        return NONE.to_owned();
    }
    // Two digits of the deviation, one where it is small; never less than can be written.
    let digits = match row.f0_sd_cents {
        sd if sd >= 9.95 => 0,
        sd if sd >= 0.995 => 1,
        sd if sd >= 0.0095 => 2,
        _ => 3,
    };
    let sd = row.f0_sd_cents.max(0.001);
    format!("{} \u{b1} {sd:.digits$}", signed(row.cents(tuning), digits))
}

/// A level or a slope, or a dash.
pub(super) fn figure(value: Option<f64>) -> String {
    value.map_or_else(|| NONE.to_owned(), |value| signed(value, 1))
}

/// A time in seconds, or a dash.
pub(super) fn seconds(value: Option<f64>) -> String {
    let value = value.filter(|s| s.is_finite());
    value.map_or_else(|| NONE.to_owned(), |s| format!("{s:.*}", if s < 9.995 { 2 } else { 0 }))
}

/// B to two digits, or what it is below.
pub(super) fn b_short(row: &Row) -> String {
    match stretch_found(row) {
        None => NONE.to_owned(),
        Some(StretchFound::Below(_)) => "0".to_owned(),
        Some(StretchFound::Measured { b, .. }) => format!("{b:.1e}"),
    }
}

/// The figures of a key in one line.
pub(super) fn line(row: &Row, tuning: &Tuning) -> String {
    let alias = row.worst_alias.and_then(|alias| alias.over_mask_db).map_or_else(
        || "no alias".to_owned(),
        |over| format!("alias {} dB over mask", signed(over, 1)),
    );
    let settling = match row.settling_s {
        Some(_) => format!("settles in {} s", seconds(row.settling_s)),
        None => "never settles".to_owned(),
    };
    let (level, tilt) = (figure(row.level_dbfs), figure(row.tilt_db_per_octave));
    format!("{} ct, {level} dBFS, {tilt} dB/oct, {alias}, {settling}", cents(row, tuning))
}

/// All figures of a key, a line each.
pub(super) fn lines(row: &Row, tuning: &Tuning) -> Vec<String> {
    let level =
        row.level_dbfs.map_or_else(|| NONE.to_owned(), |l| format!("{} dBFS", signed(l, 1)));
    let tilt = row
        .tilt_db_per_octave
        .map_or_else(|| NONE.to_owned(), |tilt| format!("{} dB/octave", signed(tilt, 1)));
    let b = match stretch_found(row) {
        None => NONE.to_owned(),
        Some(StretchFound::Below(most)) => format!("none found, below {most:.0e}"),
        Some(StretchFound::Measured { b, b_sd }) => stretch(Stretch { b, b_sd }),
    };
    let settling = row.settling_s.map_or_else(
        || "the pitch never settles".to_owned(),
        |s| format!("the pitch settles in {s:.2} s"),
    );
    let whose = if row.told { "played by the host" } else { "the nearest note, no key was held" };
    vec![
        format!("{} ct, {} Hz", cents(row, tuning), hertz(row.f0_hz, 2)),
        format!("level {level}"),
        format!("tilt {tilt}"),
        row.worst_alias.as_ref().map_or_else(|| "no alias found".to_owned(), alias),
        settling,
        format!("stretch B {b}"),
        format!("{:.1} s long, {whose}", row.length_s),
    ]
}

fn alias(alias: &KeyAlias) -> String {
    let over = alias.over_mask_db.map_or_else(String::new, |over| {
        let heard = if over > 0.0 { "may be heard" } else { "not heard" };
        format!(", {} dB over what hides it: {heard}", signed(over, 1))
    });
    format!("worst alias: partial {} at {} Hz{over}", alias.partial, hertz(alias.frequency_hz, 0))
}

/// The sheet as lines of text.
pub(super) fn text(rows: &[Row], tuning: &Tuning) -> String {
    let concert = tuning.concert_pitch_hz();
    let mut out = format!("key sheet; concert pitch {concert:.2} Hz, {}\n", tuning.temperament());
    if rows.is_empty() {
        out.push_str("no key yet\n");
        return out;
    }
    // Writing to a string cannot fail.
    let _ = writeln!(
        out,
        "{:<5}{:>16}{:>8}{:>11}{:>12}{:>11}{:>9}",
        "key", "ct", "dBFS", "dB/octave", "alias, dB", "settles, s", "B"
    );
    for row in rows {
        let alias = row.worst_alias.and_then(|alias| alias.over_mask_db);
        let _ = writeln!(
            out,
            "{:<5}{:>16}{:>8}{:>11}{:>12}{:>11}{:>9}",
            name(row.key),
            cents(row, tuning),
            figure(row.level_dbfs),
            figure(row.tilt_db_per_octave),
            figure(alias),
            seconds(row.settling_s),
            b_short(row)
        );
    }
    if let Some(missing) = still_to_play(rows) {
        let _ = writeln!(out, "{missing}");
    }
    out
}
