//! The report as one page: all checks over time, and for each its figures and the heard pitch against the reference.

mod plot;
mod svg;

use super::super::result::{CheckResult, VerdictWord, clock};
use super::{CAUTION, Job};
use svg::{Anchor, Colours, Style, Svg};

/// Width of the page, its margin and that within a card, in points.
const WIDTH: f64 = 842.0;
const MARGIN: f64 = 36.0;
const PAD: f64 = 14.0;
const SIDES: (f64, f64) = (MARGIN, WIDTH - MARGIN);
/// Place and height of the lane of time, and where the cards begin.
const LANE: (f64, f64) = (96.0, 22.0);
const CARDS: f64 = 150.0;
/// Height of a card's lines of text, and space between two cards.
const LINE: f64 = 16.0;
const GAP: f64 = 12.0;
/// Most checks that have a card, and most spans told in one.
const CARDS_MAX: usize = 40;
const SPANS_MAX: usize = 6;
/// Most characters of a line of text.
const LINE_MAX: usize = 118;

/// All of it.
pub(super) fn text(job: &Job) -> String {
    let colours = Colours::new();
    let mut svg = Svg::default();
    head(&mut svg, job, &colours);
    lane(&mut svg, &job.results, &colours);
    let mut y = CARDS;
    for result in job.results.iter().take(CARDS_MAX) {
        y = card(&mut svg, y, result, &colours) + GAP;
    }
    if job.results.len() > CARDS_MAX {
        let more = job.results.len() - CARDS_MAX;
        let text = format!("and {more} more, in the CSV and JSON files");
        svg.text((MARGIN, y + 10.0), &text, Style::new(11.0, colours.dim));
        y += 24.0;
    }
    svg.text((MARGIN, y + 14.0), CAUTION, Style::new(10.0, colours.dim));
    let mut page = Svg::default();
    let height = y + 36.0;
    page.area((0.0, WIDTH), (0.0, height), egui::Color32::WHITE, 1.0);
    page.append(&svg);
    page.finish((WIDTH, height))
}

fn head(svg: &mut Svg, job: &Job, colours: &Colours) {
    svg.text((MARGIN, 50.0), job.place.title(), Style::new(20.0, colours.ink).bold());
    let count = |word| job.results.iter().filter(|r| r.verdict == word).count();
    let summary = format!(
        "Pitch-drift checks: {} within, {} outside, {} unmeasured. Written {}.",
        count(VerdictWord::Within),
        count(VerdictWord::Outside),
        count(VerdictWord::Unmeasured),
        job.place.stamp()
    );
    svg.text((MARGIN, 72.0), &summary, Style::new(12.0, colours.dim));
}

/// The checks over time: a bar each in the colour and with the shape of its verdict, raised where it is outside.
fn lane(svg: &mut Svg, results: &[CheckResult], colours: &Colours) {
    let from = results.iter().map(|r| r.extent.start_s).fold(f64::INFINITY, f64::min);
    let to = results.iter().map(|r| r.extent.end_s).fold(f64::NEG_INFINITY, f64::max);
    let x = |seconds: f64| SIDES.0 + (SIDES.1 - SIDES.0) * (seconds - from) / (to - from).max(1e-3);
    let (top, height) = LANE;
    let foot = top + height;
    svg.line((SIDES.0, foot + 0.5), (SIDES.1, foot + 0.5), 1.0, colours.edge);
    for result in results {
        let (start, end) = (x(result.extent.start_s), x(result.extent.end_s));
        let ends = (start, end.max(start + 1.5) - 0.5);
        match result.verdict {
            VerdictWord::Unmeasured => svg.area(ends, (foot - 2.0, foot), colours.edge, 1.0),
            VerdictWord::Within | VerdictWord::Outside => {
                svg.area(ends, (foot - 6.0, foot), colours.within, 1.0);
            }
        }
        for span in &result.spans {
            let (start, end) = (x(span.extent.start_s), x(span.extent.end_s));
            svg.area((start, end.max(start + 1.0)), (top, foot), colours.outside, 1.0);
        }
    }
    let style = Style::new(10.0, colours.dim);
    svg.text((SIDES.0, foot + 14.0), &clock(from), style);
    svg.text((SIDES.1, foot + 14.0), &clock(to), style.anchored(Anchor::End));
}

/// One check from `top` on; gives where it ends.
fn card(svg: &mut Svg, top: f64, result: &CheckResult, colours: &Colours) -> f64 {
    let lines = lines(result);
    let text = PAD + LINE * (1 + lines.len()) as f64 + 2.0;
    let plot = result.curve.as_ref().map_or(0.0, |curve| plot::height(curve) + 8.0);
    let bottom = top + text + plot + 8.0;
    svg.card(SIDES, (top, bottom), colours);
    let x = (SIDES.0 + PAD, SIDES.1 - PAD);
    let mut y = top + PAD + 9.0;
    title(svg, (x, y), result, colours);
    for (line, colour) in lines {
        y += LINE;
        let colour = if colour { colours.ink } else { colours.dim };
        svg.text((x.0, y), &cut(&line), Style::new(10.0, colour));
    }
    if let Some(curve) = &result.curve {
        plot::draw(svg, result, curve, x, top + text + 8.0);
    }
    bottom
}

/// The verdict with its shape, the place, and what it was compared with.
fn title(svg: &mut Svg, (x, y): ((f64, f64), f64), result: &CheckResult, colours: &Colours) {
    let at = (x.0 + 5.0, y - 4.0);
    let colour = match result.verdict {
        VerdictWord::Within => colours.within,
        VerdictWord::Outside => colours.outside,
        VerdictWord::Unmeasured => colours.dim,
    };
    match result.verdict {
        VerdictWord::Within => svg.disc(at, 4.5, colour, true),
        VerdictWord::Outside => {
            let corners =
                [(-5.5, 4.5), (0.0, -5.5), (5.5, 4.5)].map(|(dx, dy)| (at.0 + dx, at.1 + dy));
            svg.shape(&corners, colour, 1.0);
        }
        VerdictWord::Unmeasured => svg.disc(at, 4.0, colour, false),
    }
    svg.text((x.0 + 16.0, y), result.verdict.name(), Style::new(12.0, colour).bold());
    let (start, end) = result.extent.ends();
    let told = format!("{start} \u{2013} {end}");
    svg.text((x.0 + 120.0, y), &told, Style::new(12.0, colours.ink));
    let against = format!(
        "check {}, against {} \u{b1} {} ct",
        result.number, result.reference, result.tolerance_cents
    );
    svg.text((x.1, y), &against, Style::new(10.0, colours.dim).anchored(Anchor::End));
}

/// What there is to say of a check; true where it is the first thing to read.
fn lines(result: &CheckResult) -> Vec<(String, bool)> {
    let mut lines = Vec::new();
    if let Some(reason) = &result.reason {
        lines.push((reason.clone(), true));
    }
    let mut figures = Vec::new();
    for (name, value) in [("worst", result.worst_cents), ("mean", result.mean_cents)] {
        figures.extend(value.map(|cents| format!("{name} {} ct", signed(cents, 1))));
    }
    if let (Some(drift), Some(sd)) = (result.drift_cents_per_s, result.drift_sd) {
        figures.push(format!("drift {} \u{b1} {sd:.2} ct/s", signed(drift, 2)));
    }
    if let (Some(rate), Some(extent)) = (result.vibrato_hz, result.vibrato_extent_cents) {
        figures.push(format!("vibrato {rate:.1} Hz \u{b1} {extent:.0} ct"));
    }
    if let Some(share) = result.measured_share {
        figures.push(format!("{:.0} % of what sounds measured", 100.0 * share));
    }
    if result.lost_samples > 0 {
        figures.push(format!("{} samples lost", result.lost_samples));
    }
    if !figures.is_empty() {
        lines.push((figures.join(" \u{b7} "), true));
    }
    if !result.spans.is_empty() {
        lines.push((spans(result), false));
    }
    if !result.comment.is_empty() {
        lines.push((format!("\u{201c}{}\u{201d}", result.comment), false));
    }
    lines
}

/// The first spans outside, and how many more there are.
fn spans(result: &CheckResult) -> String {
    let told: Vec<String> = result
        .spans
        .iter()
        .take(SPANS_MAX)
        .map(|span| {
            let (start, end) = span.extent.ends();
            format!("{start} \u{2013} {end} ({})", signed(span.worst_cents, 1))
        })
        .collect();
    let more = result.spans.len() as u64 + result.spans_left_out - told.len() as u64;
    let rest = if more > 0 { format!(" and {more} more") } else { String::new() };
    format!("outside {}{rest}", told.join(", "))
}

/// A line as far as it fits.
fn cut(line: &str) -> String {
    if line.chars().count() <= LINE_MAX {
        return line.to_owned();
    }
    line.chars().take(LINE_MAX - 1).chain(['\u{2026}']).collect()
}

/// A number with its sign, a true minus; zero has none.
fn signed(value: f64, decimals: usize) -> String {
    let text = format!("{value:+.decimals$}");
    let zero = text.chars().all(|c| matches!(c, '+' | '-' | '0' | '.'));
    if zero { text[1..].to_owned() } else { text.replace('-', "\u{2212}") }
}
