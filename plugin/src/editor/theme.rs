//! Colours, type and spacing. Nothing else in the editor names a colour.
//!
//! The colours are told apart by people with any colour vision (blue, vermilion and bluish green of M. Okabe and K. Ito,
//! Color Universal Design, 2008, shifted for contrast), and none of them stands without a shape or a word beside it.

use std::sync::Arc;

use egui::{
    Color32, Context, CornerRadius, FontData, FontDefinitions, FontFamily, FontId, Stroke, Visuals,
};

/// Space around and between the cards, in points.
pub(crate) const GAP: f32 = 12.0;
/// Space within a card.
pub(crate) const PAD: f32 = 14.0;
/// Corners of cards, buttons and bars.
pub(crate) const CORNER: f32 = 6.0;
/// Sizes of type, in points.
pub(crate) const NOTE: f32 = 44.0;
pub(crate) const LARGE: f32 = 20.0;
pub(crate) const VALUE: f32 = 15.0;
pub(crate) const TEXT: f32 = 13.0;
pub(crate) const FIGURE: f32 = 12.0;
pub(crate) const SMALL: f32 = 11.0;

/// Light or dark.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Theme {
    /// Light figures on a dark ground.
    #[default]
    Dark,
    /// Dark figures on a light ground.
    Light,
}

/// The colours of a theme.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Palette {
    /// Behind the cards.
    pub(crate) ground: Color32,
    pub(crate) card: Color32,
    /// Lines of a grid.
    pub(crate) grid: Color32,
    /// Edges of buttons, and rules.
    pub(crate) edge: Color32,
    pub(crate) ink: Color32,
    /// Ink of what is said in passing.
    pub(crate) dim: Color32,
    /// Partials and pitch.
    pub(crate) pitch: Color32,
    /// What belongs to no partial, and what is outside.
    pub(crate) stray: Color32,
    /// What is within, and what is switched on.
    pub(crate) within: Color32,
    pub(crate) within_ground: Color32,
    /// Under the pointer, or chosen.
    pub(crate) lit: Color32,
    /// Of captures.
    pub(crate) captures: [Color32; 6],
}

const DARK: Palette = Palette {
    ground: Color32::from_rgb(0x14, 0x17, 0x1C),
    card: Color32::from_rgb(0x1B, 0x20, 0x27),
    grid: Color32::from_rgb(0x26, 0x2D, 0x37),
    edge: Color32::from_rgb(0x36, 0x40, 0x4D),
    ink: Color32::from_rgb(0xE6, 0xE9, 0xEE),
    dim: Color32::from_rgb(0x9A, 0xA6, 0xB6),
    pitch: Color32::from_rgb(0x56, 0xB4, 0xE9),
    stray: Color32::from_rgb(0xF0, 0x82, 0x47),
    within: Color32::from_rgb(0x2B, 0xB5, 0x92),
    within_ground: Color32::from_rgb(0x17, 0x33, 0x2C),
    lit: Color32::from_rgb(0x26, 0x2E, 0x39),
    captures: [
        Color32::from_rgb(0xE6, 0x9F, 0x00),
        Color32::from_rgb(0x56, 0xB4, 0xE9),
        Color32::from_rgb(0xD9, 0x86, 0xB4),
        Color32::from_rgb(0x2B, 0xB5, 0x92),
        Color32::from_rgb(0xEF, 0xE3, 0x50),
        Color32::from_rgb(0xA8, 0x9B, 0xF0),
    ],
};

const LIGHT: Palette = Palette {
    ground: Color32::from_rgb(0xE9, 0xED, 0xF2),
    card: Color32::from_rgb(0xFD, 0xFD, 0xFE),
    grid: Color32::from_rgb(0xE4, 0xE9, 0xEF),
    edge: Color32::from_rgb(0xC0, 0xC9, 0xD4),
    ink: Color32::from_rgb(0x18, 0x1F, 0x28),
    dim: Color32::from_rgb(0x55, 0x61, 0x71),
    pitch: Color32::from_rgb(0x00, 0x6B, 0xB0),
    stray: Color32::from_rgb(0xAC, 0x44, 0x06),
    within: Color32::from_rgb(0x06, 0x75, 0x58),
    within_ground: Color32::from_rgb(0xDA, 0xF1, 0xE9),
    lit: Color32::from_rgb(0xE8, 0xEF, 0xF7),
    captures: [
        Color32::from_rgb(0x8A, 0x5A, 0x00),
        Color32::from_rgb(0x00, 0x6B, 0xB0),
        Color32::from_rgb(0xA0, 0x3B, 0x74),
        Color32::from_rgb(0x06, 0x75, 0x58),
        Color32::from_rgb(0x6B, 0x66, 0x00),
        Color32::from_rgb(0x5A, 0x48, 0xB8),
    ],
};

impl Theme {
    pub(crate) fn palette(self) -> &'static Palette {
        match self {
            Self::Dark => &DARK,
            Self::Light => &LIGHT,
        }
    }

    /// The name it is kept by.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Dark => "dark",
            Self::Light => "light",
        }
    }

    /// The theme of a name.
    #[must_use]
    pub fn named(name: &str) -> Option<Self> {
        [Self::Dark, Self::Light].into_iter().find(|theme| theme.name() == name)
    }

    /// Gives the toolkit's own windows (popups) the same look.
    pub(crate) fn apply(self, ctx: &Context) {
        ctx.set_visuals(self.visuals());
    }

    /// The same look for the toolkit's own parts (text fields, buttons).
    pub(crate) fn visuals(self) -> Visuals {
        let palette = self.palette();
        let mut visuals = match self {
            Self::Dark => Visuals::dark(),
            Self::Light => Visuals::light(),
        };
        visuals.override_text_color = Some(palette.ink);
        visuals.panel_fill = palette.ground;
        visuals.window_fill = palette.card;
        visuals.window_stroke = Stroke::new(1.0, palette.edge);
        visuals.extreme_bg_color = palette.ground;
        visuals.selection.bg_fill = palette.pitch.gamma_multiply(0.35);
        visuals.selection.stroke = Stroke::new(1.0, palette.pitch);
        visuals.menu_corner_radius = CornerRadius::same(6);
        visuals
    }
}

/// Installs the lettering, whose digits all have the same width.
pub fn install_fonts(ctx: &Context) {
    let mut fonts = FontDefinitions::empty();
    for (name, bytes) in [
        ("sans", dejavu::sans::regular()),
        ("bold", dejavu::sans::bold()),
        ("mono", dejavu::sans_mono::regular()),
    ] {
        fonts.font_data.insert(name.to_owned(), Arc::new(FontData::from_static(bytes)));
        let family = match name {
            "sans" => FontFamily::Proportional,
            "mono" => FontFamily::Monospace,
            _ => FontFamily::Name(name.into()),
        };
        fonts.families.insert(family, vec![name.to_owned(), "sans".to_owned()]);
    }
    ctx.set_fonts(fonts);
    ctx.all_styles_mut(|style| {
        style.interaction.tooltip_delay = 0.4;
        style.animation_time = 0.0;
        for (text_style, id) in &mut style.text_styles {
            id.size = if *text_style == egui::TextStyle::Small { SMALL } else { TEXT };
        }
    });
}

/// Words.
pub(crate) fn sans(size: f32) -> FontId {
    FontId::new(size, FontFamily::Proportional)
}

/// Words and figures that stand out.
pub(crate) fn bold(size: f32) -> FontId {
    FontId::new(size, FontFamily::Name("bold".into()))
}

/// Figures in columns.
pub(crate) fn mono(size: f32) -> FontId {
    FontId::new(size, FontFamily::Monospace)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Contrast of two colours (WCAG 2.1, 1.4.3).
    fn contrast(a: Color32, b: Color32) -> f32 {
        let luminance = |c: Color32| {
            let [r, g, b, _] = egui::Rgba::from(c).to_array();
            0.2126 * r + 0.7152 * g + 0.0722 * b + 0.05
        };
        let (a, b) = (luminance(a), luminance(b));
        a.max(b) / a.min(b)
    }

    #[test]
    fn everything_said_can_be_read() {
        for theme in [Theme::Dark, Theme::Light] {
            let palette = theme.palette();
            for ground in [palette.card, palette.ground, palette.lit] {
                for (name, ink) in [
                    ("ink", palette.ink),
                    ("dim", palette.dim),
                    ("pitch", palette.pitch),
                    ("stray", palette.stray),
                    ("within", palette.within),
                ]
                .into_iter()
                .chain(palette.captures.map(|colour| ("capture", colour)))
                {
                    let found = contrast(ink, ground);
                    assert!(found >= 4.5, "{theme:?} {name} on {ground:?}: {found:.2}");
                }
            }
        }
    }
}
