//! What the partials of the two compared sounds say together, side by side.

use egui::{Align2, Sense, Stroke, Ui, pos2, vec2};

use super::super::difference::Comparison;
use super::super::ink;
use super::super::steady::{NONE, signed};
use super::super::theme::{FIGURE, Palette, SMALL, mono, sans};

/// Height of a line.
const LINE: f32 = 21.0;

/// Draws it.
pub(super) fn show(ui: &mut Ui, comparison: &Comparison, palette: &Palette) {
    let figures = comparison.figures();
    let height = LINE * (figures.len() + 1) as f32 + 10.0;
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), height), Sense::hover());
    ui.painter().hline(rect.x_range(), rect.top() + 3.0, Stroke::new(1.0, palette.edge));
    let columns = [0.0, 1.0, 2.0].map(|k| rect.right() - (2.0 - k) * 0.235 * rect.width());
    let mut y = rect.top() + 6.0 + LINE / 2.0;
    for (side, x) in comparison.sides().iter().zip(columns) {
        ui.painter().add(side.mark.shape(pos2(x - 6.0, y), 4.5, palette));
    }
    let at = (pos2(columns[2], y), Align2::RIGHT_CENTER);
    ink::text(ui, at, "B \u{2212} A", sans(SMALL), palette.dim);
    for pair in figures {
        y += LINE;
        let caption = format!("{}, {}", pair.caption, pair.unit);
        let at = (pos2(rect.left(), y), Align2::LEFT_CENTER);
        let room = columns[0] - rect.left() - 40.0;
        ink::text_within(ui, at, (pair.caption, room), sans(SMALL), palette.dim)
            .on_hover_text(caption);
        let [a, b] = pair.values;
        let difference = a.zip(b).map(|(a, b)| b - a);
        for (value, (x, with_sign)) in
            [a, b, difference].into_iter().zip(columns.into_iter().zip([false, false, true]))
        {
            let text = value.map_or_else(|| NONE.to_owned(), |value| figure(value, with_sign));
            let colour = if with_sign { palette.ink } else { palette.dim };
            ink::text(ui, (pos2(x, y), Align2::RIGHT_CENTER), &text, mono(FIGURE - 1.0), colour);
        }
    }
}

fn figure(value: f64, with_sign: bool) -> String {
    let decimals = if value.abs() < 100.0 { 1 } else { 0 };
    let text = signed(value, decimals);
    if with_sign { text } else { text.trim_start_matches('+').to_owned() }
}
