//! The drift trace: cents against the reference over session time, with the tolerance and what lies outside it.

mod columns;
mod paint;
mod reference;
mod spans;
mod ticks;

use std::sync::{Mutex, TryLockError};

use egui::{Align2, Key, Pos2, Rect, Response, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use self::columns::{Column, columns};
use self::paint::{Frame, grid, outside, times, trace};
use self::reference::Target;
use self::spans::spans;
use self::ticks::{Tick, ticks};
use super::checks::{Checks, colour};
use super::field::{self, Bench, Field, Place};
use super::ink;
use super::knob::Knob;
use super::plumb::{CENTS, Calm};
use super::screen::Shown;
use super::steady::signed;
use super::theme::{CORNER, PAD, Palette, bold};
use crate::convert::{index, nearest, single};
use crate::parameters::Reference;
use crate::readout::Condition;
use crate::trail::{Kind, Trail};

/// Height of the captions, and of the time axis.
const HEAD: f32 = 30.0;
const FOOT: f32 = 26.0;
/// Width of the figures on the left.
const FIGURES: f32 = 46.0;
/// Shortest, longest and first span shown, in seconds.
const SPAN_S: (f64, f64) = (2.0, 2_400.0);
const SPAN_FIRST_S: f64 = 20.0;
/// Points that a column is wide.
const COLUMN_WIDTH: f64 = 1.5;
/// Points between two labels of time.
const LABELS_APART: f64 = 76.0;
/// The scale is at least this many tolerances each way.
const TOLERANCES: f64 = 1.6;
/// A pitch that holds for less than this many seconds is passed over when the scale and the worst are found.
const LASTING_S: f64 = 0.25;
/// A stretch that is jumped to is shown with this many times its length, and at least so many seconds.
const JUMP_ROOM: f64 = 1.25;
const JUMP_LEAST_S: f64 = 4.0;
/// Share of the span that an arrow key moves by.
const KEY_SHARE: f64 = 0.25;

const FIELDS: [(Field, f32); 3] = [
    (
        Field {
            knob: Knob::Reference,
            caption: "drift against",
            help: "Where the pitch should be: the nearest note, the notes played into the plugin, the first steady pitch, or one pitch.",
            place: Place::After,
        },
        190.0,
    ),
    (
        Field {
            knob: Knob::Tolerance,
            caption: "tolerance \u{b1}",
            help: "How far from the reference is still within. Drag, scroll, or double-click to type.",
            place: Place::After,
        },
        118.0,
    ),
    (
        Field {
            knob: Knob::ReferencePitch,
            caption: "at",
            help: "The reference pitch, as a note or in Hz.",
            place: Place::After,
        },
        92.0,
    ),
];

/// How the view is set, and what it drew last.
#[derive(Debug, Clone)]
pub(crate) struct Drift {
    span_s: f64,
    /// Right edge, as an index of the trail; `None` follows the newest reading.
    end: Option<f64>,
    calm: Calm,
    half: f64,
    picture: Picture,
}

/// All that is drawn.
#[derive(Debug, Clone, Default)]
pub(crate) struct Picture {
    columns: Vec<Column>,
    ticks: Vec<Tick>,
    start: f64,
    end: f64,
    /// Indices that the trail still knows, and seconds between two.
    known: (f64, f64),
    step_s: f64,
}

impl Default for Drift {
    fn default() -> Self {
        Self {
            span_s: SPAN_FIRST_S,
            end: None,
            calm: Calm::default(),
            half: 10.0,
            picture: Picture::default(),
        }
    }
}

impl Drift {
    /// Shows so many seconds.
    pub(crate) fn span(&mut self, seconds: f64) {
        self.span_s = seconds.clamp(SPAN_S.0, SPAN_S.1);
    }

    /// Shows a stretch, given by indices of the trail, with some room around it.
    pub(crate) fn jump(&mut self, (from, to): (f64, f64)) {
        let step_s = self.picture.step_s.max(1e-6);
        self.span(((to - from) * step_s * JUMP_ROOM).max(JUMP_LEAST_S));
        self.end = Some(0.5 * (from + to) + 0.5 * self.span_s / step_s);
    }

    /// Looks at the trail for a picture this many points wide. When the worker holds the trail just now, the last picture
    /// stays for a frame.
    pub(crate) fn update(&mut self, trail: &Mutex<Trail>, width: f32, shown: &Shown<'_>) {
        let trail = match trail.try_lock() {
            Ok(trail) => trail,
            Err(TryLockError::Poisoned(poisoned)) => poisoned.into_inner(),
            Err(TryLockError::WouldBlock) => return,
        };
        let step_s = trail.step_s();
        let newest = match shown.readout.condition {
            Condition::Frozen => shown.readout.trail_end,
            _ => trail.next(),
        } as f64;
        let span = self.span_s / step_s;
        let end = self
            .end
            .map_or(newest, |end| end.clamp(newest.min(trail.first() as f64 + span), newest));
        if self.end.is_some() {
            self.end = (end < newest).then_some(end);
        }
        let start = end - span;
        let width = f64::from(width.max(1.0));
        let step = nearest(COLUMN_WIDTH * span / width).max(1);
        let from = nearest(start.max(trail.first() as f64));
        let target = target(shown, &trail);
        self.picture = Picture {
            columns: columns(&trail, (from, nearest(end)), step, &target),
            ticks: ticks(&trail, start, end, LABELS_APART * span / width),
            start,
            end,
            known: (trail.first() as f64, newest),
            step_s,
        };
        drop(trail);
        self.rescale(shown);
    }

    fn rescale(&mut self, shown: &Shown<'_>) {
        let tolerance = f64::from(shown.parameters.check.tolerance.value());
        let far = self.lasting().map(|c| f64::from(c.mean.abs())).fold(0.0, f64::max);
        let need = (TOLERANCES * tolerance).max(1.15 * far);
        self.half = self.calm.update(need, shown.time_s, &CENTS);
    }

    /// Draws it.
    pub(crate) fn show(
        &mut self,
        ui: &mut Ui,
        rect: Rect,
        (shown, checks): (&Shown<'_>, &Checks),
        bench: &mut Bench<'_>,
    ) {
        let palette = bench.palette;
        ui.painter().rect_filled(rect, CORNER, palette.card);
        let plot = Rect::from_min_max(
            pos2(rect.left() + FIGURES, rect.top() + HEAD),
            pos2(rect.right() - PAD, rect.bottom() - FOOT),
        );
        let tolerance = shown.parameters.check.tolerance.value();
        self.navigate(ui, plot);
        let frame = Frame {
            plot,
            start: self.picture.start,
            end: self.picture.end,
            half: single(self.half),
        };
        grid(ui, &frame, tolerance, palette);
        times(ui, &frame, &self.picture.ticks, palette);
        trace(ui, &frame, &self.picture.columns, palette);
        outside(ui, &frame, &self.picture.columns, tolerance, palette);
        spans(ui, &frame, checks.snapshot(), palette);
        self.head(ui, rect, (shown, checks), bench);
    }

    fn head(
        &mut self,
        ui: &mut Ui,
        rect: Rect,
        (shown, checks): (&Shown<'_>, &Checks),
        bench: &mut Bench<'_>,
    ) {
        let mut x = rect.left() + 12.0;
        let fixed = shown.parameters.check.reference.value() == Reference::Pitch;
        for (field, width) in FIELDS {
            if (field.knob == Knob::ReferencePitch && !fixed) || x + width > rect.right() - 12.0 {
                continue;
            }
            let place = Rect::from_min_size(pos2(x, rect.top() + 6.0), vec2(width, 18.0));
            field::field(ui, place, &field, bench);
            x += width + 14.0;
        }
        let palette = bench.palette;
        let mut right = rect.right() - PAD;
        if self.end.is_some() {
            let place = Rect::from_min_size(pos2(right - 52.0, rect.top() + 5.0), vec2(52.0, 20.0));
            let help = "Follow the newest reading again";
            if field::button(ui, place, "now", palette).on_hover_text(help).clicked() {
                self.end = None;
            }
            right -= 64.0;
        }
        if right - x > 170.0 {
            self.verdict(ui, pos2(right, rect.top() + 15.0), (shown, checks), palette);
        }
    }

    /// What a check says of the stretch shown; without one, what is seen in it.
    fn verdict(
        &self,
        ui: &mut Ui,
        at: Pos2,
        (shown, checks): (&Shown<'_>, &Checks),
        palette: &Palette,
    ) {
        let at = (at, Align2::RIGHT_CENTER);
        if let Some((verdict, text)) = checks.verdict((self.picture.start, self.picture.end)) {
            ink::text(ui, at, &text, bold(12.0), colour(verdict, palette));
            return;
        }
        let Some(worst) = self.worst() else { return };
        let beyond = worst.abs() > shown.parameters.check.tolerance.value();
        let (word, colour) =
            if beyond { ("outside", palette.stray) } else { ("within", palette.within) };
        let text = format!("{word}: worst {} ct here", signed(f64::from(worst), 1));
        ink::text(ui, at, &text, bold(12.0), colour)
            .on_hover_text("The drift line's largest distance from the reference in the stretch shown, vibrato left aside.");
    }

    /// The drift line's farthest point in the stretch shown.
    fn worst(&self) -> Option<f32> {
        self.lasting().map(|column| column.drift).max_by(|a, b| a.abs().total_cmp(&b.abs()))
    }

    /// Columns in the stretch shown whose pitch lasts: what passes within an onset says nothing about drift.
    fn lasting(&self) -> impl Iterator<Item = &Column> {
        let Picture { columns, start, step_s, .. } = &self.picture;
        let same = |a: &Column, b: &Column| a.kind == b.kind && a.note == b.note;
        columns
            .chunk_by(same)
            .filter(move |run| {
                let lasts = (run[run.len() - 1].at - run[0].at) * step_s;
                run[0].kind == Kind::Steady && lasts >= LASTING_S
            })
            .flatten()
            .filter(move |column| column.at >= *start)
    }

    /// Zoom by wheel, scroll by dragging, and both by keys.
    fn navigate(&mut self, ui: &Ui, plot: Rect) {
        let response = ui.interact(plot, ui.scope_id().with("drift"), Sense::click_and_drag());
        let name = "Drift: cents against the reference over time";
        response.widget_info(|| WidgetInfo::labeled(Role::GenericContainer, true, name));
        let Picture { start, end, known, step_s, .. } = self.picture;
        let a_point = (end - start) / f64::from(plot.width().max(1.0));
        let (scroll, zoom, pointer) = ui.input(|input| {
            (input.smooth_scroll_delta(), input.zoom_delta(), input.pointer.hover_pos())
        });
        let mut by = -f64::from(response.drag_delta().x) * a_point;
        if response.hovered() {
            by -= f64::from(scroll.x) * a_point;
            let factor = f64::from(zoom) * f64::from(scroll.y / 200.0).exp();
            if (factor - 1.0).abs() > 1e-4 {
                let share = pointer.map_or(1.0, |p| f64::from((p.x - plot.left()) / plot.width()));
                self.zoom(1.0 / factor, share);
            }
        }
        field::keep_arrows(ui, &response);
        if response.has_focus() {
            by += self.keys(ui, end - start);
        }
        if by.abs() > 1e-9 {
            let span = self.span_s / step_s.max(1e-6);
            let target =
                (self.end.unwrap_or(known.1) + by).max(known.0 + span.min(known.1 - known.0));
            self.end = (target < known.1).then_some(target);
        }
        if response.double_clicked() {
            self.end = None;
            self.span_s = SPAN_FIRST_S;
        }
        outline(ui, &response, plot);
    }

    /// Changes the span by a factor about a place, as a share of the width.
    fn zoom(&mut self, factor: f64, share: f64) {
        let Picture { start, end, known, step_s, .. } = self.picture;
        let before = end - start;
        self.span_s = (self.span_s * factor).clamp(SPAN_S.0, SPAN_S.1);
        if self.end.is_some() {
            let at = start + share * before;
            let after = self.span_s / step_s.max(1e-6);
            let target = at + (1.0 - share) * after;
            self.end = (target < known.1).then_some(target);
        }
    }

    /// Readings to move by.
    fn keys(&mut self, ui: &Ui, span: f64) -> f64 {
        let pressed = |key| ui.input(|input| input.key_pressed(key));
        if pressed(Key::Plus) || pressed(Key::Equals) {
            self.zoom(0.5, 1.0);
        }
        if pressed(Key::Minus) {
            self.zoom(2.0, 1.0);
        }
        if pressed(Key::End) {
            self.end = None;
        }
        let moves = [(Key::ArrowLeft, -1.0), (Key::ArrowRight, 1.0)];
        moves
            .into_iter()
            .filter(|(key, _)| pressed(*key))
            .map(|(_, by)| by * KEY_SHARE * span)
            .sum()
    }
}

fn outline(ui: &Ui, response: &Response, plot: Rect) {
    if response.has_focus() {
        let stroke = ui.visuals().selection.stroke;
        ui.painter().rect_stroke(plot.expand(2.0), 3.0, stroke, egui::StrokeKind::Outside);
    }
}

/// Where the pitch should be by the parameters.
fn target(shown: &Shown<'_>, trail: &Trail) -> Target {
    let check = &shown.parameters.check;
    let tuning = &shown.readout.tuning;
    match check.reference.value() {
        Reference::NearestNote => Target::nearest(tuning),
        Reference::PlayedNotes => shown
            .readout
            .played
            .map_or_else(|| Target::nearest(tuning), |key| Target::fixed(tuning.frequency_hz(key))),
        Reference::FirstPitch => (trail.first()..trail.next())
            .step_by(index(trail.cell_length()))
            .filter_map(|at| trail.cell(at))
            .find(|cell| cell.mean.kind() == Kind::Steady)
            .map_or_else(|| Target::nearest(tuning), |cell| Target::Fixed(cell.mean.cents())),
        Reference::Pitch => Target::fixed(f64::from(check.reference_pitch.value())),
    }
}
