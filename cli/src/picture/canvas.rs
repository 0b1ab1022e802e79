//! Drawing in fractions of a pixel on plotters' SVG backend, whose coordinates are whole numbers: it draws on a sheet
//! [`FINENESS`] times as large, which is then shown at its intended size.

use super::theme::{MONO, SANS};
use crate::convert::drawing_unit;
use anyhow::{Result, anyhow};
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, IntoDrawingArea as _};
use plotters::element::{Circle, DashedPathElement, PathElement, Polygon, Rectangle};
use plotters::prelude::SVGBackend;
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{
    Color as _, FontDesc, FontFamily, FontStyle, RGBColor, ShapeStyle, TextStyle,
};

/// Drawing units per picture unit.
const FINENESS: f64 = 20.0;
/// plotters' SVG backend divides type sizes by this.
const TYPE_SCALE: f64 = 1.24;

/// A sheet to draw on, in picture units from its upper left corner.
pub(super) struct Canvas<'a> {
    area: DrawingArea<SVGBackend<'a>, Shift>,
}

/// How a text is set.
#[derive(Debug, Clone, Copy)]
pub(super) struct Type {
    pub(super) size: f64,
    pub(super) colour: RGBColor,
    pub(super) side: Side,
    pub(super) mono: bool,
    pub(super) bold: bool,
}

/// Which side of a text its position is.
#[derive(Debug, Clone, Copy)]
pub(super) enum Side {
    Left,
    Centre,
    Right,
}

/// How a line is drawn.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pen {
    pub(super) width: f64,
    pub(super) colour: RGBColor,
    /// 0 (invisible) to 1.
    pub(super) strength: f64,
}

/// Draws a picture of a size and returns it as an SVG document.
///
/// # Errors
/// Whatever `draw` returns.
pub(super) fn svg(
    width: f64,
    height: f64,
    draw: impl FnOnce(&Canvas<'_>) -> Result<()>,
) -> Result<String> {
    let mut sheet = String::new();
    let (fine_width, fine_height) =
        (drawing_unit(width * FINENESS), drawing_unit(height * FINENESS));
    {
        let size = (fine_width.unsigned_abs(), fine_height.unsigned_abs());
        let canvas = Canvas { area: SVGBackend::with_string(&mut sheet, size).into_drawing_area() };
        draw(&canvas)?;
        canvas.area.present().map_err(|error| anyhow!("cannot be drawn: {error}"))?;
    }
    Ok(format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height}\" \
         viewBox=\"0 0 {fine_width} {fine_height}\">\n{sheet}</svg>\n"
    ))
}

impl Type {
    pub(super) const fn sans(size: f64, colour: RGBColor) -> Self {
        Self { size, colour, side: Side::Left, mono: false, bold: false }
    }

    pub(super) const fn mono(size: f64, colour: RGBColor) -> Self {
        Self { mono: true, ..Self::sans(size, colour) }
    }

    pub(super) const fn bold(self) -> Self {
        Self { bold: true, ..self }
    }

    pub(super) const fn at(self, side: Side) -> Self {
        Self { side, ..self }
    }
}

impl Pen {
    pub(super) const fn new(width: f64, colour: RGBColor) -> Self {
        Self { width, colour, strength: 1.0 }
    }

    pub(super) const fn strength(self, strength: f64) -> Self {
        Self { strength, ..self }
    }

    fn style(self) -> ShapeStyle {
        self.colour
            .mix(self.strength)
            .stroke_width(drawing_unit(self.width * FINENESS).unsigned_abs())
    }
}

impl Canvas<'_> {
    /// A text whose small letters are centred on `y`.
    pub(super) fn text(&self, x: f64, y: f64, text: &str, set: Type) -> Result<()> {
        let style = if set.bold { FontStyle::Bold } else { FontStyle::Normal };
        let family = FontFamily::Name(if set.mono { MONO } else { SANS });
        let font = FontDesc::new(family, set.size * TYPE_SCALE * FINENESS, style);
        let side = match set.side {
            Side::Left => HPos::Left,
            Side::Centre => HPos::Center,
            Side::Right => HPos::Right,
        };
        let style = TextStyle::from(font).color(&set.colour).pos(Pos::new(side, VPos::Center));
        drawn(self.area.draw_text(text, &style, fine((x, y))))
    }

    pub(super) fn line(&self, from: (f64, f64), to: (f64, f64), pen: Pen) -> Result<()> {
        self.path(&[from, to], pen)
    }

    pub(super) fn path(&self, points: &[(f64, f64)], pen: Pen) -> Result<()> {
        let points: Vec<_> = points.iter().copied().map(fine).collect();
        drawn(self.area.draw(&PathElement::new(points, pen.style())))
    }

    pub(super) fn dashed(&self, points: &[(f64, f64)], pen: Pen) -> Result<()> {
        let points: Vec<_> = points.iter().copied().map(fine).collect();
        let (dash, space) = (drawing_unit(4.0 * FINENESS), drawing_unit(3.0 * FINENESS));
        drawn(self.area.draw(&DashedPathElement::new(points, dash, space, pen.style())))
    }

    pub(super) fn circle(&self, centre: (f64, f64), radius: f64, colour: RGBColor) -> Result<()> {
        let radius = drawing_unit(radius * FINENESS);
        drawn(self.area.draw(&Circle::new(fine(centre), radius, colour.filled())))
    }

    pub(super) fn rectangle(
        &self,
        from: (f64, f64),
        to: (f64, f64),
        colour: RGBColor,
        strength: f64,
    ) -> Result<()> {
        drawn(
            self.area.draw(&Rectangle::new([fine(from), fine(to)], colour.mix(strength).filled())),
        )
    }

    /// A panel: a rectangle with rounded corners.
    pub(super) fn panel(
        &self,
        (left, top): (f64, f64),
        (right, bottom): (f64, f64),
        colour: RGBColor,
    ) -> Result<()> {
        const RADIUS: f64 = 6.0;
        const STEPS: u32 = 6;
        let corners = [
            (right - RADIUS, top + RADIUS, -0.25),
            (right - RADIUS, bottom - RADIUS, 0.0),
            (left + RADIUS, bottom - RADIUS, 0.25),
            (left + RADIUS, top + RADIUS, 0.5),
        ];
        let points: Vec<_> = corners
            .into_iter()
            .flat_map(|(x, y, turn)| {
                (0..=STEPS).map(move |step| {
                    let turn = turn + 0.25 * f64::from(step) / f64::from(STEPS);
                    let (sin, cos) = (turn * std::f64::consts::TAU).sin_cos();
                    fine((x + RADIUS * cos, y + RADIUS * sin))
                })
            })
            .collect();
        drawn(self.area.draw(&Polygon::new(points, colour.filled())))
    }

    /// The sign of a stray.
    pub(super) fn diamond(&self, (x, y): (f64, f64), size: f64, pen: Pen) -> Result<()> {
        // The first side is drawn twice, so that the corner it starts from is joined.
        let round = [
            (x, y - size),
            (x + size, y),
            (x, y + size),
            (x - size, y),
            (x, y - size),
            (x + size, y),
        ];
        self.path(&round, pen)
    }
}

fn fine((x, y): (f64, f64)) -> (i32, i32) {
    (drawing_unit(x * FINENESS), drawing_unit(y * FINENESS))
}

fn drawn<E: std::error::Error + Send + Sync>(
    result: Result<(), plotters::drawing::DrawingAreaErrorKind<E>>,
) -> Result<()> {
    result.map_err(|error| anyhow!("cannot be drawn: {error}"))
}
