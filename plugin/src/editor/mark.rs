//! The marks of captures: a colour and a shape each, so that either tells them apart.

use egui::{Color32, Pos2, Shape, Stroke, pos2};

use super::theme::Palette;
use crate::captures::Capture;

/// What a sound is marked by.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) enum Mark {
    /// What is heard now.
    #[default]
    Live,
    /// A capture's colour, by its index.
    Kept(u8),
}

impl Mark {
    /// The mark of a capture.
    pub(crate) fn of(capture: &Capture) -> Self {
        Self::Kept(capture.colour)
    }

    pub(crate) fn colour(self, palette: &Palette) -> Color32 {
        match self {
            Self::Live => palette.ink,
            Self::Kept(index) => palette.captures[usize::from(index) % palette.captures.len()],
        }
    }

    /// The shape around a point.
    pub(crate) fn shape(self, at: Pos2, radius: f32, palette: &Palette) -> Shape {
        let colour = self.colour(palette);
        let polygon = |corners: &[(f32, f32)]| {
            let corner = |&(x, y): &(f32, f32)| pos2(at.x + radius * x, at.y + radius * y);
            Shape::convex_polygon(corners.iter().map(corner).collect(), colour, Stroke::NONE)
        };
        match self {
            Self::Live => Shape::circle_stroke(at, 0.8 * radius, Stroke::new(0.4 * radius, colour)),
            Self::Kept(0) => Shape::circle_filled(at, 0.95 * radius, colour),
            Self::Kept(1) => polygon(&[(-0.85, -0.85), (0.85, -0.85), (0.85, 0.85), (-0.85, 0.85)]),
            Self::Kept(2) => polygon(&[(0.0, -1.05), (1.05, 0.8), (-1.05, 0.8)]),
            Self::Kept(3) => polygon(&[(-1.05, -0.8), (1.05, -0.8), (0.0, 1.05)]),
            Self::Kept(4) => polygon(&[(-0.5, -1.05), (0.5, -1.05), (0.5, 1.05), (-0.5, 1.05)]),
            Self::Kept(_) => polygon(&[(-1.05, -0.5), (1.05, -0.5), (1.05, 0.5), (-1.05, 0.5)]),
        }
    }
}
