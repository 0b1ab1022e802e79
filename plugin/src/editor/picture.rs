//! The editor's picture as SVG: the same shapes that would be painted, written down as vectors.

use std::fmt::Write as _;

use egui::epaint::{BandShape, ClippedShape, TextShape};
use egui::{Color32, Context, Pos2, RawInput, Rect, Shape, Stroke, Ui, Vec2};

use super::theme::{Theme, install_fonts};

/// Draws without a window and writes down what was drawn.
pub(crate) fn svg(size: Vec2, theme: Theme, mut draw: impl FnMut(&mut Ui)) -> String {
    let ctx = Context::default();
    install_fonts(&ctx);
    theme.apply(&ctx);
    let area = Rect::from_min_size(Pos2::ZERO, size);
    let input = || RawInput { screen_rect: Some(area), ..RawInput::default() };
    // Fonts are there from the second pass on.
    ctx.run_ui(input(), |_| {}).textures_delta.clear();
    let mut output = ctx.run_ui(input(), |ui| draw(ui));
    output.textures_delta.clear();
    let mut out = Writer::new(size);
    for ClippedShape { clip_rect, shape, .. } in &output.shapes {
        out.clipped(clip_rect.intersect(area), area, shape);
    }
    out.finish()
}

struct Writer {
    out: String,
    clips: usize,
}

impl Writer {
    fn new(size: Vec2) -> Self {
        let (w, h) = (size.x, size.y);
        let out = format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{w}\" height=\"{h}\" viewBox=\"0 0 {w} {h}\">\n"
        );
        Self { out, clips: 0 }
    }

    fn finish(mut self) -> String {
        self.out.push_str("</svg>\n");
        self.out
    }

    fn write(&mut self, text: core::fmt::Arguments<'_>) {
        // Writing to a string cannot fail.
        let _ = self.out.write_fmt(text);
        self.out.push('\n');
    }

    fn clipped(&mut self, clip: Rect, area: Rect, shape: &Shape) {
        let bounds = shape.visual_bounding_rect();
        if !bounds.intersects(clip) {
            return;
        }
        let cut = clip != area && !clip.contains_rect(bounds);
        if cut {
            self.clips += 1;
            let (id, at, size) = (self.clips, clip.min, clip.size());
            self.write(format_args!(
                "<clipPath id=\"c{id}\"><rect x=\"{:.1}\" y=\"{:.1}\" width=\"{:.1}\" height=\"{:.1}\"/></clipPath><g clip-path=\"url(#c{id})\">",
                at.x, at.y, size.x, size.y
            ));
        }
        self.shape(shape);
        if cut {
            self.write(format_args!("</g>"));
        }
    }

    fn shape(&mut self, shape: &Shape) {
        match shape {
            Shape::Vec(shapes) => shapes.iter().for_each(|shape| self.shape(shape)),
            Shape::Circle(circle) => {
                let paint = paint(circle.fill, circle.stroke);
                let at = circle.center;
                self.write(format_args!(
                    "<circle cx=\"{:.2}\" cy=\"{:.2}\" r=\"{:.2}\"{paint}/>",
                    at.x, at.y, circle.radius
                ));
            }
            Shape::LineSegment { points, stroke } => {
                self.path(points, false, Color32::TRANSPARENT, *stroke);
            }
            Shape::Path(path) => {
                let colour = match path.stroke.color {
                    egui::epaint::ColorMode::Solid(colour) => colour,
                    egui::epaint::ColorMode::UV(_) => Color32::TRANSPARENT,
                };
                let stroke = Stroke::new(path.stroke.width, colour);
                self.path(&path.points, path.closed, path.fill, stroke);
            }
            Shape::Rect(rect) => {
                let paint = paint(rect.fill, rect.stroke);
                let (at, size) = (rect.rect.min, rect.rect.size());
                self.write(format_args!(
                    "<rect x=\"{:.2}\" y=\"{:.2}\" width=\"{:.2}\" height=\"{:.2}\" rx=\"{}\"{paint}/>",
                    at.x, at.y, size.x.max(0.0), size.y.max(0.0), rect.corner_radius.nw
                ));
            }
            Shape::Text(text) => self.text(text),
            Shape::Band(band) => self.band(band),
            // The editor draws none of these.
            Shape::Noop
            | Shape::Mesh(_)
            | Shape::Ellipse(_)
            | Shape::QuadraticBezier(_)
            | Shape::CubicBezier(_)
            | Shape::Callback(_) => {}
        }
    }

    fn path(&mut self, points: &[Pos2], closed: bool, fill: Color32, stroke: Stroke) {
        let mut data = String::new();
        for (k, point) in points.iter().enumerate() {
            let _ = write!(data, "{}{:.2} {:.2}", if k == 0 { 'M' } else { 'L' }, point.x, point.y);
        }
        if closed {
            data.push('Z');
        }
        let paint = paint(fill, stroke);
        self.write(format_args!("<path d=\"{data}\"{paint}/>"));
    }

    fn band(&mut self, band: &BandShape) {
        let lower = band.points.iter().map(|point| Pos2::new(point.x, point.y.min));
        let upper = band.points.iter().rev().map(|point| Pos2::new(point.x, point.y.max));
        let outline: Vec<Pos2> = lower.chain(upper).collect();
        self.path(&outline, true, band.fill, band.stroke);
    }

    fn text(&mut self, shape: &TextShape) {
        for placed in &shape.galley.rows {
            let text: String = placed.row.glyphs.iter().map(|glyph| glyph.chr).collect();
            let Some((first, last)) = placed.row.glyphs.first().zip(placed.row.glyphs.last())
            else {
                continue;
            };
            let Some(section) = shape.galley.job.sections.first() else { continue };
            let at = shape.pos + placed.pos.to_vec2() + first.pos.to_vec2();
            let width = last.max_x() - first.pos.x;
            let (family, weight) = match section.format.font_id.family {
                egui::FontFamily::Monospace => ("DejaVu Sans Mono", 400),
                egui::FontFamily::Proportional => ("DejaVu Sans", 400),
                egui::FontFamily::Name(_) => ("DejaVu Sans", 700),
            };
            let colour = shape.override_text_color.unwrap_or(section.format.color);
            let colour = if colour == Color32::PLACEHOLDER { shape.fallback_color } else { colour };
            let paint = paint(colour, Stroke::NONE);
            let size = section.format.font_id.size;
            let text = escaped(&text);
            self.write(format_args!(
                "<text x=\"{:.2}\" y=\"{:.2}\" font-size=\"{size}\" font-family=\"{family}\" font-weight=\"{weight}\" textLength=\"{width:.2}\"{paint}>{text}</text>",
                at.x, at.y
            ));
        }
    }
}

fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;")
}

fn paint(fill: Color32, stroke: Stroke) -> String {
    if stroke.width > 0.0 && stroke.color != Color32::TRANSPARENT {
        let width = stroke.width;
        let (fill, stroke) = (colour("fill", fill), colour("stroke", stroke.color));
        format!(" {fill} {stroke} stroke-width=\"{width}\"")
    } else {
        format!(" {} stroke=\"none\"", colour("fill", fill))
    }
}

fn colour(name: &str, colour: Color32) -> String {
    if colour == Color32::TRANSPARENT {
        return format!("{name}=\"none\"");
    }
    let [r, g, b, a] = colour.to_srgba_unmultiplied();
    let opacity = f32::from(a) / 255.0;
    if a == u8::MAX {
        format!("{name}=\"#{r:02X}{g:02X}{b:02X}\"")
    } else {
        format!("{name}=\"#{r:02X}{g:02X}{b:02X}\" {name}-opacity=\"{opacity:.3}\"")
    }
}
