//! The heard pitch of one check against its reference: tolerance, curve with its deviation, what is outside.

use super::super::super::curve::Curve;
use super::super::super::result::{CheckResult, OutsideSpan, clock};
use super::signed;
use super::svg::{Anchor, Colours, Style, Svg};

/// Height of the plot, of the labels of time below it, and of those of bars below these.
const HEIGHT: f64 = 118.0;
const TIME: f64 = 18.0;
const BARS: f64 = 13.0;
/// Room for the cents on its left.
const LEFT: f64 = 50.0;
/// Deviations that the shade spans each way.
const SHADE_SDS: f64 = 2.0;
/// How much of the plot the tolerance takes at most, and the least cents from its middle to its edge.
const ROOM: f64 = 1.6;
const HALF_LEAST: f64 = 1.0;
/// Shortest time without a pitch that is told, in seconds.
const GAP_S: f64 = 0.1;
/// Steps of the axes: cents, and seconds.
const CENTS: [f64; 12] =
    [0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1000.0, 5000.0];
const SECONDS: [f64; 15] =
    [0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 15.0, 30.0, 60.0, 120.0, 300.0, 600.0, 1800.0, 3600.0];
/// Most labels of time; points between two labels of bars; the least width of a word within the plot.
const TIMES: f64 = 9.0;
const BAR_APART: f64 = 46.0;
const WORD: f64 = 64.0;
const SMALL: f64 = 9.0;
/// Distance of an axis's caption from the frame: half of a time's width and more.
const CAPTION: f64 = 24.0;

/// From seconds and cents to points.
struct Frame {
    x: (f64, f64),
    y: (f64, f64),
    start_s: f64,
    end_s: f64,
    half: f64,
}

impl Frame {
    fn x(&self, seconds: f64) -> f64 {
        let share = (seconds - self.start_s) / (self.end_s - self.start_s).max(1e-3);
        self.x.0 + share.clamp(0.0, 1.0) * (self.x.1 - self.x.0)
    }

    fn y(&self, cents: f64) -> f64 {
        let middle = (self.y.0 + self.y.1) / 2.0;
        middle - (cents / self.half).clamp(-1.0, 1.0) * (self.y.1 - self.y.0) / 2.0
    }
}

/// How high it is.
pub(super) fn height(curve: &Curve) -> f64 {
    HEIGHT + TIME + if curve.bars.is_empty() { 0.0 } else { BARS }
}

/// Draws it from `top` on between two places.
pub(super) fn draw(svg: &mut Svg, result: &CheckResult, curve: &Curve, x: (f64, f64), top: f64) {
    let colours = Colours::new();
    let ends = curve.pieces.iter().flatten().flat_map(|[_, _, sd, low, high]| {
        [low - SHADE_SDS * sd, high + SHADE_SDS * sd].map(f64::abs)
    });
    let most = ends.fold(ROOM * result.tolerance_cents, f64::max);
    let frame = Frame {
        x: (x.0 + LEFT, x.1),
        y: (top, top + HEIGHT),
        start_s: result.extent.start_s,
        end_s: result.extent.end_s,
        half: (1.06 * most).max(HALF_LEAST),
    };
    shades(svg, &frame, result, &colours);
    cents(svg, &frame, result.tolerance_cents, &colours);
    spans(svg, &frame, result, &colours);
    gaps(svg, &frame, curve, &colours);
    pitch(svg, &frame, curve, &colours);
    times(svg, &frame, curve, result.in_session, &colours);
}

/// The tolerance, and the lines of cents.
fn cents(svg: &mut Svg, frame: &Frame, tolerance: f64, colours: &Colours) {
    let within = (frame.y(tolerance), frame.y(-tolerance));
    svg.area(frame.x, within, colours.within_ground, 1.0);
    let step = *CENTS.iter().find(|step| frame.half / **step <= 2.5).unwrap_or(&CENTS[11]);
    let count = crate::convert::floor(frame.half / step);
    for k in -count..=count {
        let cents = k as f64 * step;
        let y = frame.y(cents);
        let colour = if k == 0 { colours.dim } else { colours.grid };
        svg.line((frame.x.0, y), (frame.x.1, y), if k == 0 { 0.8 } else { 0.6 }, colour);
        let style = Style::new(SMALL, colours.dim).anchored(Anchor::End);
        let text = if k == 0 { "0 ct".to_owned() } else { signed(cents, usize::from(step < 1.0)) };
        svg.text((frame.x.0 - 6.0, y + 3.2), &text, style);
    }
    for y in [within.0, within.1] {
        svg.line((frame.x.0, y), (frame.x.1, y), 0.8, colours.within);
    }
}

/// Where a span begins and ends, in points.
fn ends(frame: &Frame, span: &OutsideSpan) -> (f64, f64) {
    let (from, to) = (frame.x(span.extent.start_s), frame.x(span.extent.end_s));
    (from, to.max(from + 1.0))
}

/// A shade behind all, over the time of what is outside.
fn shades(svg: &mut Svg, frame: &Frame, result: &CheckResult, colours: &Colours) {
    for span in &result.spans {
        svg.area(ends(frame, span), frame.y, colours.outside, 0.12);
    }
}

/// What is outside: a bar at the foot, and the word with its worst where there is room.
fn spans(svg: &mut Svg, frame: &Frame, result: &CheckResult, colours: &Colours) {
    for span in &result.spans {
        let x = ends(frame, span);
        svg.area(x, (frame.y.1 - 3.0, frame.y.1), colours.outside, 1.0);
        let worst = signed(span.worst_cents, 1);
        let text = if x.1 - x.0 > 1.6 * WORD {
            format!("outside, {worst} ct")
        } else if x.1 - x.0 > 0.6 * WORD {
            worst
        } else {
            continue;
        };
        // On the side where the curve is not.
        let y = if span.worst_cents > 0.0 { frame.y.1 - 8.0 } else { frame.y.0 + 11.0 };
        let style = Style::new(SMALL, colours.outside).bold().anchored(Anchor::Middle);
        svg.text(((x.0 + x.1) / 2.0, y), &text, style);
    }
}

/// Where nothing was heard, in words where there is room: the curve is not drawn on.
fn gaps(svg: &mut Svg, frame: &Frame, curve: &Curve, colours: &Colours) {
    let mut heard_s = frame.start_s;
    let firsts = curve.pieces.iter().filter_map(|piece| Some(piece.first()?[0]));
    let lasts = curve.pieces.iter().filter_map(|piece| Some(piece.last()?[0]));
    for (first_s, last_s) in firsts.zip(lasts).chain([(frame.end_s, frame.end_s)]) {
        if first_s - heard_s > GAP_S {
            gap(svg, frame, (frame.x(heard_s), frame.x(first_s)), colours);
        }
        heard_s = last_s;
    }
}

fn gap(svg: &mut Svg, frame: &Frame, x: (f64, f64), colours: &Colours) {
    svg.area(x, frame.y, colours.grid, 0.75);
    if x.1 - x.0 > WORD {
        let style = Style::new(SMALL, colours.dim).anchored(Anchor::Middle);
        svg.text(((x.0 + x.1) / 2.0, frame.y.0 + 11.0), "no pitch", style);
    }
}

/// The curve: the shade of its deviation, its spread within a column, and the line of its mean.
fn pitch(svg: &mut Svg, frame: &Frame, curve: &Curve, colours: &Colours) {
    for piece in &curve.pieces {
        let ribbon = |sds: f64| -> Vec<(f64, f64)> {
            let edge = |at: f64, cents: f64| (frame.x(at), frame.y(cents));
            let upper = piece.iter().map(|[at, _, sd, _, high]| edge(*at, high + sds * sd));
            let lower = piece.iter().rev().map(|[at, _, sd, low, _]| edge(*at, low - sds * sd));
            upper.chain(lower).collect()
        };
        let line: Vec<_> =
            piece.iter().map(|[at, mean, ..]| (frame.x(*at), frame.y(*mean))).collect();
        if let [only] = line[..] {
            svg.disc(only, 1.0, colours.pitch, true);
            continue;
        }
        svg.shape(&ribbon(SHADE_SDS), colours.pitch, 0.22);
        svg.shape(&ribbon(0.0), colours.pitch, 0.4);
        svg.trace(&line, 1.4, colours.pitch);
    }
}

/// The axes of time: seconds, and bars where the transport told them.
fn times(svg: &mut Svg, frame: &Frame, curve: &Curve, in_session: bool, colours: &Colours) {
    let bottom = frame.y.1;
    svg.line((frame.x.0, bottom), (frame.x.1, bottom), 0.8, colours.edge);
    let middle = Style::new(SMALL, colours.dim).anchored(Anchor::Middle);
    let end = Style::new(SMALL, colours.dim).anchored(Anchor::End);
    svg.text((frame.x.0 - CAPTION, bottom + 13.0), if in_session { "time" } else { "stream" }, end);
    let length_s = frame.end_s - frame.start_s;
    let step = *SECONDS.iter().find(|step| length_s / **step <= TIMES).unwrap_or(&SECONDS[14]);
    let mut k = (frame.start_s / step).ceil();
    while k * step <= frame.end_s && k * step - frame.start_s <= 2.0 * TIMES * step {
        let x = frame.x(k * step);
        svg.line((x, bottom), (x, bottom + 4.0), 0.8, colours.edge);
        let text = clock(k * step);
        let text = if step < 1.0 { &text[..text.len() - 1] } else { &text[..text.len() - 3] };
        svg.text((x, bottom + 13.0), text, middle);
        k += 1.0;
    }
    if curve.bars.is_empty() {
        return;
    }
    svg.text((frame.x.0 - CAPTION, bottom + 26.0), "bar", end);
    let mut last = f64::NEG_INFINITY;
    for (bar, at_s) in &curve.bars {
        let x = frame.x(*at_s);
        svg.line((x, bottom - 4.0), (x, bottom), 0.8, colours.dim);
        if x - last >= BAR_APART {
            last = x;
            svg.text((x, bottom + 26.0), &format!("{bar}|1"), middle);
        }
    }
}
