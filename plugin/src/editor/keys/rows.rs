//! The sheet in the side panel: a row per key, its figures in two lines.

use egui::{Align2, Rect, Role, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2};
use plumbtone_analysis::tuning::Tuning;

use super::super::ink;
use super::super::theme::{FIGURE, Palette, SMALL, bold, mono, sans};
use super::words;
use crate::keys::{Row, Stored};

/// Heights of a row and of the heading, and of a line in them.
const ROW: f32 = 38.0;
const HEADING: f32 = 32.0;
/// Where the two lines lie from the top.
const LINES: (f32, f32) = (12.0, 27.0);
/// Right edges of the figures as shares of the width: of the upper line, and of the lower one.
const UPPER: [f32; 2] = [0.7, 1.0];
const LOWER: [f32; 4] = [0.25, 0.5, 0.75, 1.0];
/// Space at both ends of a row.
const INSET: f32 = 8.0;

const UPPER_HEADS: [(&str, &str); 2] = [
    ("cents off", "How far the pitch lies off the key in the tuning, with one standard deviation."),
    ("dBFS", "Mean level of the partials together."),
];
const LOWER_HEADS: [(&str, &str); 4] = [
    ("tilt", "Slope of the partials' levels, in dB per octave."),
    (
        "alias",
        "The alias that stands out most, in dB over what hides it there, the measured partials or the ear's own threshold: above 0 it may be heard.",
    ),
    (
        "settles",
        "Time from the onset until the pitch stays, in seconds; a dash when it never does.",
    ),
    ("B", "Inharmonicity of a stiff string; 0 where none can be told from noise."),
];

/// The heads of the columns.
pub(super) fn heading(ui: &mut Ui, width: f32, palette: &Palette) {
    let (rect, _) = ui.allocate_exact_size(vec2(width, HEADING), Sense::hover());
    let mut head = |share: f32, y: f32, (text, help): (&str, &str)| {
        let at = (pos2(edge(rect, share), rect.top() + y), Align2::RIGHT_CENTER);
        ink::text(ui, at, text, sans(SMALL), palette.dim).on_hover_text(help);
    };
    let (upper, lower) = (6.0, 20.0);
    UPPER.into_iter().zip(UPPER_HEADS).for_each(|(share, told)| head(share, upper, told));
    LOWER.into_iter().zip(LOWER_HEADS).for_each(|(share, told)| head(share, lower, told));
    let at = (pos2(rect.left() + INSET, rect.top() + upper), Align2::LEFT_CENTER);
    ink::text(ui, at, "key", sans(SMALL), palette.dim);
}

/// Draws all rows, the one of a key lit, and scrolls to one if it is sought. Gives the key under the pointer.
pub(super) fn show(
    ui: &mut Ui,
    stored: &Stored,
    (lit, sought): (Option<u8>, Option<u8>),
    tuning: &Tuning,
    palette: &Palette,
) -> Option<u8> {
    ui.spacing_mut().item_spacing.y = 3.0;
    let newest = stored.newest().map(|row| row.key);
    let mut under_pointer = None;
    for row in &stored.rows {
        let (rect, response) =
            ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::CLICK);
        let is_newest = newest == Some(row.key);
        let lines = || words::lines(row, tuning);
        response.widget_info(|| {
            let mark = if is_newest { ", the newest" } else { "" };
            let said = format!("{}{mark}: {}", words::name(row.key), lines().join(", "));
            WidgetInfo::labeled(Role::Button, true, said)
        });
        if sought == Some(row.key) {
            response.scroll_to_me(Some(egui::Align::Center));
        }
        if response.hovered() || response.has_focus() {
            under_pointer = Some(row.key);
        }
        if ui.is_rect_visible(rect) {
            let lit = under_pointer == Some(row.key) || lit == Some(row.key);
            paint(ui, rect, row, (is_newest, lit, response.has_focus()), tuning, palette);
        }
        response.on_hover_ui(|ui| {
            lines().iter().for_each(|line| {
                ui.label(line);
            });
        });
    }
    under_pointer
}

fn paint(
    ui: &Ui,
    rect: Rect,
    row: &Row,
    (newest, lit, focused): (bool, bool, bool),
    tuning: &Tuning,
    palette: &Palette,
) {
    let fill = if lit { palette.lit } else { palette.ground };
    let edge = if focused || newest { palette.pitch } else { palette.edge };
    ui.painter().rect(rect, 4.0, fill, Stroke::new(1.0, edge), StrokeKind::Inside);
    let right = |share: f32, y: f32| pos2(self::edge(rect, share), rect.top() + y);
    let (upper, lower) = LINES;
    let at = pos2(rect.left() + INSET, rect.top() + upper);
    ink::mark(ui, at, Align2::LEFT_CENTER, &words::name(row.key), bold(12.5), palette.ink);
    if newest {
        ui.painter().circle_filled(pos2(rect.left(), rect.top() + upper), 3.0, palette.pitch);
    }
    let figures = [words::cents(row, tuning), words::figure(row.level_dbfs)];
    for (share, text) in UPPER.into_iter().zip(figures) {
        let at = right(share, upper);
        ink::mark(ui, at, Align2::RIGHT_CENTER, &text, mono(FIGURE), palette.ink);
    }
    let over = row.worst_alias.and_then(|alias| alias.over_mask_db);
    let heard = over.is_some_and(|over| over > 0.0);
    let figures = [
        (words::figure(row.tilt_db_per_octave), palette.dim),
        (words::figure(over), if heard { palette.stray } else { palette.dim }),
        (words::seconds(row.settling_s), palette.dim),
        (words::b_short(row), palette.dim),
    ];
    for (share, (text, colour)) in LOWER.into_iter().zip(figures) {
        ink::mark(ui, right(share, lower), Align2::RIGHT_CENTER, &text, mono(SMALL), colour);
    }
}

/// The right edge of a column.
fn edge(rect: Rect, share: f32) -> f32 {
    rect.left() + INSET + share * (rect.width() - 2.0 * INSET)
}
