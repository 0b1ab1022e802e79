//! The panel beside the plumb view: what the partials say together, and the strays in figures.

use super::canvas::{Canvas, Pen, Side, Type};
use super::theme::{DIM, GRID, HEAD, INK, MARGIN, PANEL, SOUND_LEFT, STRAY, WIDTH};
use crate::output::records::NoteRecord;
use crate::output::words::{explanation, inharmonicity, plain, signed, with_unit};
use anyhow::Result;

const PADDING: f64 = 14.0;
const FACT_STEP: f64 = 24.0;
const STRAY_STEP: f64 = 18.0;

/// Draws the panel, as high as the plumb view.
pub(super) fn draw(canvas: &Canvas<'_>, note: &NoteRecord, height: f64) -> Result<()> {
    let top = HEAD + MARGIN;
    let bottom = top + height;
    let (left, right) = (SOUND_LEFT + PADDING, WIDTH - MARGIN - PADDING);
    canvas.panel((SOUND_LEFT, top), (WIDTH - MARGIN, bottom), PANEL)?;
    let mut y = top + 22.0;
    for (label, figure) in facts(note) {
        canvas.text(left, y, label, Type::sans(12.0, DIM))?;
        canvas.text(right, y, &figure, Type::mono(12.0, INK).at(Side::Right))?;
        y += FACT_STEP;
    }
    canvas.line((left, y - 4.0), (right, y - 4.0), Pen::new(1.0, GRID))?;
    y += 14.0;
    let heading = if note.strays.is_empty() {
        "every peak belongs to a partial"
    } else {
        "belongs to no partial"
    };
    canvas.text(left, y, heading, Type::sans(11.0, DIM))?;
    y += 20.0;
    strays(canvas, note, (left, right), (y, bottom - 12.0))
}

fn facts(note: &NoteRecord) -> Vec<(&'static str, String)> {
    let percent = |value| with_unit(&plain(value, 2), "%");
    let tristimulus =
        note.tristimulus.map(|three| three.map(|part| format!("{part:.2}")).join("  "));
    vec![
        ("stretch B", inharmonicity(note)),
        ("tilt", with_unit(&signed(note.tilt_db_per_octave, 1), "dB/octave")),
        ("odd − even", with_unit(&signed(note.odd_even_db, 1), "dB")),
        ("THD (to partial 1)", percent(note.thd_f_percent)),
        ("THD (to the whole)", percent(note.thd_r_percent)),
        ("harmonic to noise", with_unit(&plain(note.hnr_db, 1), "dB")),
        ("tristimulus", tristimulus.unwrap_or_else(|| plain(None, 0))),
        ("centroid at partial", plain(note.centroid_partial, 1)),
        ("sounds from … to", format!("{:.3} … {:.3} s", note.start_s, note.end_s)),
    ]
}

/// The strongest strays, as many as there is room for.
fn strays(
    canvas: &Canvas<'_>,
    note: &NoteRecord,
    (left, right): (f64, f64),
    (top, bottom): (f64, f64),
) -> Result<()> {
    let lines = crate::convert::index(crate::convert::samples_in((bottom - top) / STRAY_STEP, 1.0));
    let all = note.strays.len() + note.strays_left_out;
    // The last line is needed to say how many are not listed.
    let listed = if all > lines { lines.saturating_sub(1) } else { all };
    let mut y = top;
    for stray in note.strays.iter().take(listed) {
        canvas.diamond((left + 4.0, y), 4.0, Pen::new(1.4, STRAY))?;
        canvas.text(
            left + 82.0,
            y,
            &plain(stray.frequency_hz, 1),
            Type::mono(11.0, INK).at(Side::Right),
        )?;
        canvas.text(left + 92.0, y, &explanation(stray.explanation), Type::sans(10.0, DIM))?;
        let level = with_unit(&plain(stray.level_dbfs, 1), "dB");
        canvas.text(right, y, &level, Type::mono(11.0, INK).at(Side::Right))?;
        y += STRAY_STEP;
    }
    if all > listed {
        canvas.text(
            left + 92.0,
            y,
            &format!("and {} weaker", all - listed),
            Type::sans(10.0, DIM),
        )?;
    }
    Ok(())
}
