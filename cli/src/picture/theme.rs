//! Colours, type and measures of the pictures; nowhere else are there any.

use plotters::style::RGBColor;

pub(super) const GROUND: RGBColor = RGBColor(0x14, 0x17, 0x1c);
pub(super) const PANEL: RGBColor = RGBColor(0x1b, 0x20, 0x27);
pub(super) const GRID: RGBColor = RGBColor(0x23, 0x2a, 0x33);
pub(super) const INK: RGBColor = RGBColor(0xe6, 0xe9, 0xee);
pub(super) const DIM: RGBColor = RGBColor(0x94, 0xa0, 0xb0);
pub(super) const PARTIAL: RGBColor = RGBColor(0x56, 0xb4, 0xe9);
pub(super) const STRAY: RGBColor = RGBColor(0xe8, 0x74, 0x3b);

/// Proportional type; the names behind the first are of the same widths, or nearly.
pub(super) const SANS: &str = "DejaVu Sans, Verdana, sans-serif";
/// Type for figures in columns.
pub(super) const MONO: &str = "DejaVu Sans Mono, Menlo, Consolas, monospace";
/// Mean width of a character of [`SANS`], in type sizes; a little generous.
pub(super) const SANS_WIDTH: f64 = 0.62;

/// Width of the whole picture, in picture units (pixels of an SVG shown at its own size).
pub(super) const WIDTH: f64 = 1200.0;
/// Space around and between panels.
pub(super) const MARGIN: f64 = 16.0;
/// Height of the head.
pub(super) const HEAD: f64 = 76.0;
/// Room above and below the rows of the plumb view, for its headings and its axis.
pub(super) const ABOVE_ROWS: f64 = 32.0;
pub(super) const BELOW_ROWS: f64 = 28.0;
/// Right edge of the plumb view.
pub(super) const PLUMB_RIGHT: f64 = 880.0;
/// Left edge of the panel beside it.
pub(super) const SOUND_LEFT: f64 = 892.0;
/// Height of the panel of levels over time.
pub(super) const LEVELS_HEIGHT: f64 = 210.0;
/// Heights of the panels of a drift check: the pitch over time, and what it comes to.
pub(super) const DRIFT_HEIGHT: f64 = 380.0;
pub(super) const SPANS_HEIGHT: f64 = 210.0;
