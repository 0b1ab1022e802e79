//! The few shapes that a page is made of, as SVG.

use core::fmt::{Arguments, Write as _};

use egui::Color32;

use crate::editor::Theme;

/// The colours of a page: those of the editor's light theme.
#[derive(Debug, Clone, Copy)]
pub(super) struct Colours {
    pub(super) card: Color32,
    pub(super) grid: Color32,
    pub(super) edge: Color32,
    pub(super) ink: Color32,
    pub(super) dim: Color32,
    pub(super) pitch: Color32,
    pub(super) outside: Color32,
    pub(super) within: Color32,
    pub(super) within_ground: Color32,
}

impl Colours {
    pub(super) fn new() -> Self {
        let palette = Theme::Light.palette();
        Self {
            card: palette.card,
            grid: palette.grid,
            edge: palette.edge,
            ink: palette.ink,
            dim: palette.dim,
            pitch: palette.pitch,
            outside: palette.stray,
            within: palette.within,
            within_ground: palette.within_ground,
        }
    }
}

/// Where a text stands beside its place.
#[derive(Debug, Clone, Copy)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// How a text looks.
#[derive(Debug, Clone, Copy)]
pub(super) struct Style {
    pub(super) size: f64,
    pub(super) bold: bool,
    pub(super) colour: Color32,
    pub(super) anchor: Anchor,
}

impl Style {
    pub(super) fn new(size: f64, colour: Color32) -> Self {
        Self { size, bold: false, colour, anchor: Anchor::Start }
    }

    pub(super) fn bold(self) -> Self {
        Self { bold: true, ..self }
    }

    pub(super) fn anchored(self, anchor: Anchor) -> Self {
        Self { anchor, ..self }
    }
}

/// A page that grows.
#[derive(Debug, Default)]
pub(super) struct Svg(String);

impl Svg {
    /// The whole file, once its size is known.
    pub(super) fn finish(self, (width, height): (f64, f64)) -> String {
        let body = self.0;
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height:.0}\" viewBox=\"0 0 {width} {height:.0}\" font-family=\"'DejaVu Sans', sans-serif\">\n{body}</svg>\n"
        )
    }

    /// Puts another one on top.
    pub(super) fn append(&mut self, other: &Self) {
        self.0.push_str(&other.0);
    }

    fn write(&mut self, text: Arguments<'_>) {
        // Writing to a string cannot fail.
        let _ = self.0.write_fmt(text);
        self.0.push('\n');
    }

    pub(super) fn text(&mut self, (x, y): (f64, f64), text: &str, style: Style) {
        let Style { size, bold, colour, anchor } = style;
        let (text, colour) = (escaped(text), hex(colour));
        let anchor = match anchor {
            Anchor::Start => "",
            Anchor::Middle => " text-anchor=\"middle\"",
            Anchor::End => " text-anchor=\"end\"",
        };
        let weight = if bold { " font-weight=\"bold\"" } else { "" };
        self.write(format_args!(
            "<text x=\"{x:.1}\" y=\"{y:.1}\" font-size=\"{size}\" fill=\"{colour}\"{anchor}{weight}>{text}</text>"
        ));
    }

    /// A filled area between two places each way.
    pub(super) fn area(&mut self, x: (f64, f64), y: (f64, f64), colour: Color32, opacity: f64) {
        let (width, height) = ((x.1 - x.0).max(0.0), (y.1 - y.0).max(0.0));
        let (left, top, colour) = (x.0, y.0, hex(colour));
        self.write(format_args!(
            "<rect x=\"{left:.2}\" y=\"{top:.2}\" width=\"{width:.2}\" height=\"{height:.2}\" fill=\"{colour}\" fill-opacity=\"{opacity}\"/>"
        ));
    }

    /// A card with round corners.
    pub(super) fn card(&mut self, x: (f64, f64), y: (f64, f64), colours: &Colours) {
        let (width, height) = (x.1 - x.0, y.1 - y.0);
        let (left, top, fill, edge) = (x.0, y.0, hex(colours.card), hex(colours.edge));
        self.write(format_args!(
            "<rect x=\"{left:.1}\" y=\"{top:.1}\" width=\"{width:.1}\" height=\"{height:.1}\" rx=\"6\" fill=\"{fill}\" stroke=\"{edge}\"/>"
        ));
    }

    /// A straight line.
    pub(super) fn line(&mut self, from: (f64, f64), to: (f64, f64), width: f64, colour: Color32) {
        let ((x1, y1), (x2, y2), colour) = (from, to, hex(colour));
        self.write(format_args!(
            "<path d=\"M{x1:.2} {y1:.2}L{x2:.2} {y2:.2}\" stroke=\"{colour}\" stroke-width=\"{width}\" fill=\"none\"/>"
        ));
    }

    /// A line through points.
    pub(super) fn trace(&mut self, points: &[(f64, f64)], width: f64, colour: Color32) {
        let (path, colour) = (path(points), hex(colour));
        self.write(format_args!(
            "<path d=\"{path}\" stroke=\"{colour}\" stroke-width=\"{width}\" stroke-linejoin=\"round\" stroke-linecap=\"round\" fill=\"none\"/>"
        ));
    }

    /// A filled shape with these corners.
    pub(super) fn shape(&mut self, corners: &[(f64, f64)], colour: Color32, opacity: f64) {
        let (path, colour) = (path(corners), hex(colour));
        self.write(format_args!(
            "<path d=\"{path}Z\" fill=\"{colour}\" fill-opacity=\"{opacity}\"/>"
        ));
    }

    /// A disc, or a ring.
    pub(super) fn disc(&mut self, (x, y): (f64, f64), radius: f64, colour: Color32, filled: bool) {
        let colour = hex(colour);
        let paint = if filled {
            format!("fill=\"{colour}\"")
        } else {
            format!("fill=\"none\" stroke=\"{colour}\" stroke-width=\"1.5\"")
        };
        self.write(format_args!("<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"{radius}\" {paint}/>"));
    }
}

fn path(points: &[(f64, f64)]) -> String {
    let mut path = String::new();
    for (number, (x, y)) in points.iter().enumerate() {
        let command = if number == 0 { 'M' } else { 'L' };
        // Writing to a string cannot fail.
        let _ = write!(path, "{command}{x:.2} {y:.2}");
    }
    path
}

fn hex(colour: Color32) -> String {
    format!("#{:02x}{:02x}{:02x}", colour.r(), colour.g(), colour.b())
}

fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            // XML has no place for these.
            c if c.is_control() => out.push(' '),
            c => out.push(c),
        }
    }
    out
}
