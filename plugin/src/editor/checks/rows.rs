//! The list of results, newest first; the one that is clicked opens.

use egui::{Role, Sense, Stroke, TextEdit, Ui, WidgetInfo, vec2};

use super::super::parts::{act, say, write};
use super::super::steady::{NONE, signed};
use super::super::theme::{FIGURE, Palette, SMALL, sans};
use super::{Checks, colour, shape};
use crate::check::{CheckResult, Extent, InTrail, Results};

/// Height of a row.
const ROW: f32 = 42.0;
/// Most spans that an opened result lists.
const SPANS: usize = 12;

/// What is done with a result.
enum Deed {
    Open,
    Close,
    Show(f64, f64),
    Forget,
    Comment(String),
}

/// Draws the list and does what is asked for.
pub(super) fn show(ui: &mut Ui, checks: &mut Checks, results: &Results, palette: &Palette) {
    let mut done = None;
    for result in checks.snapshot.stored.results.iter().rev() {
        let opened = checks.opened == Some(result.number);
        if row(ui, result, opened, palette) {
            done = Some((result.number, if opened { Deed::Close } else { Deed::Open }));
        }
        if opened && let Some(deed) = details(ui, result, palette) {
            done = Some((result.number, deed));
        }
    }
    match done {
        Some((number, Deed::Open)) => checks.opened = Some(number),
        Some((_, Deed::Close)) => checks.opened = None,
        Some((_, Deed::Show(from, to))) => checks.jump = Some((from, to)),
        Some((number, Deed::Forget)) => results.remove(number),
        Some((number, Deed::Comment(text))) => {
            results.comment(number, &text);
            let mut all = checks.snapshot.stored.results.iter_mut();
            if let Some(result) = all.find(|result| result.number == number) {
                result.comment = text;
            }
        }
        None => {}
    }
}

/// One result in two lines; true when it is clicked.
fn row(ui: &mut Ui, result: &CheckResult, opened: bool, palette: &Palette) -> bool {
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let response = ui.interact(rect, ui.scope_id().with(("result", result.number)), Sense::click());
    let (start, end) = result.extent.ends();
    let word = result.verdict.name();
    let name = format!("check {}: {word}, {start} to {end}", result.number);
    response.widget_info(|| WidgetInfo::selected(Role::Button, true, opened, &name));
    let fill = if response.hovered() || opened { palette.lit } else { palette.ground };
    let edge = if response.has_focus() { palette.pitch } else { palette.edge };
    ui.painter().rect(rect, 4.0, fill, Stroke::new(1.0, edge), egui::StrokeKind::Inside);
    let (left, upper, lower) = (rect.left() + 26.0, rect.top() + 13.0, rect.bottom() - 12.0);
    let at = egui::pos2(rect.left() + 14.0, upper);
    ui.painter().add(shape(at, result.verdict, palette));
    write(ui, (left, upper), word, FIGURE, colour(result.verdict, palette));
    write(ui, (left + 82.0, upper), &format!("{start} \u{2013} {end}"), FIGURE, palette.ink);
    let figure = |cents: Option<f64>| cents.map_or_else(|| NONE.to_owned(), |c| signed(c, 1));
    let figures =
        format!("worst {} ct, mean {} ct", figure(result.worst_cents), figure(result.mean_cents));
    let second = result.reason.as_ref().unwrap_or(&figures);
    write(ui, (left, lower), second, SMALL, palette.dim);
    response.on_hover_text(second).clicked()
}

fn details(ui: &mut Ui, result: &CheckResult, palette: &Palette) -> Option<Deed> {
    for line in lines(result) {
        say(ui, &line, palette);
    }
    let mut deed = None;
    for span in result.spans.iter().take(SPANS) {
        let (start, end) = span.extent.ends();
        let text = format!("{start} \u{2013} {end}: worst {} ct", signed(span.worst_cents, 1));
        match &result.in_trail {
            Some(in_trail) if act(ui, &text, palette) => {
                deed = Some(jump(in_trail, &result.extent, &span.extent));
            }
            Some(_) => {}
            None => say(ui, &text, palette),
        }
    }
    let more = result.spans.len().saturating_sub(SPANS) as u64 + result.spans_left_out;
    if more > 0 {
        say(ui, &format!("and {more} more spans"), palette);
    }
    ui.horizontal(|ui| {
        if let Some(in_trail) = &result.in_trail
            && act(ui, "show in the trace", palette)
        {
            deed = Some(jump(in_trail, &result.extent, &result.extent));
        }
        if act(ui, "forget this one", palette) {
            deed = Some(Deed::Forget);
        }
    });
    let mut text = result.comment.clone();
    let edit = TextEdit::singleline(&mut text).hint_text("comment").desired_width(f32::INFINITY);
    let response = ui.add(edit.font(sans(FIGURE)));
    response.widget_info(|| WidgetInfo::labeled(Role::TextInput, true, "comment"));
    if response.changed() {
        deed = Some(Deed::Comment(text));
    }
    ui.add_space(4.0);
    deed
}

fn jump(in_trail: &InTrail, whole: &Extent, part: &Extent) -> Deed {
    let (from, to) = in_trail.of(whole, part);
    Deed::Show(from, to)
}

/// What there is to say of a result, a line each.
fn lines(result: &CheckResult) -> Vec<String> {
    let Extent { start_s, end_s, .. } = result.extent;
    let whose = if result.in_session { "session" } else { "stream" };
    let mut lines = vec![
        format!("{start_s:.3} s to {end_s:.3} s of the {whose}"),
        format!("against {} \u{b1} {} ct", result.reference, result.tolerance_cents),
    ];
    if let (Some(drift), Some(sd)) = (result.drift_cents_per_s, result.drift_sd) {
        lines.push(format!("drift {} \u{b1} {sd:.2} ct/s", signed(drift, 2)));
    }
    if let (Some(rate), Some(extent)) = (result.vibrato_hz, result.vibrato_extent_cents) {
        lines.push(format!("vibrato {rate:.1} Hz, \u{b1} {extent:.0} ct"));
    }
    if let Some(share) = result.measured_share {
        lines.push(format!("{:.0} % of what sounds was measured", 100.0 * share));
    }
    if result.lost_samples > 0 {
        lines.push(format!("{} samples were lost", result.lost_samples));
    }
    lines
}
