//! The whole editor as a function of plain data: the band on top, the plumb view, the side panel, the drift trace.

use std::sync::Mutex;

use egui::{Rect, Ui, pos2};

use super::band::{self, Figures};
use super::captures::{self, Captures, Side};
use super::checks::Checks;
use super::drift::Drift;
use super::field::{Bench, Editing};
use super::keys::Keys;
use super::knob::Gesture;
use super::panel::{self, Copy, Tab, Views};
use super::plumb::Plumb;
use super::settings::Look;
use super::theme::{GAP, Theme};
use super::{copy, notices, picture, sound};
use crate::parameters::Parameters;
use crate::readout::Readout;
use crate::trail::Trail;

/// Space around the cards.
const MARGIN: f32 = 14.0;
/// Width of the side panel, and the window's width below which there is none.
const PANEL: f32 = 292.0;
const WIDE: f32 = 780.0;
/// Height of the drift trace: a share of the window, within limits; and the window's height below which there is none.
const TRACE_SHARE: f32 = 0.235;
const TRACE: (f32, f32) = (120.0, 300.0);
const TALL: f32 = 430.0;

/// All that the editor draws from.
#[derive(Debug, Clone, Copy)]
pub struct Shown<'a> {
    /// What the worker said last.
    pub readout: &'a Readout,
    /// The pitch over time.
    pub trail: &'a Mutex<Trail>,
    /// The parameters.
    pub parameters: &'a Parameters,
    /// Stream position of the newest sample.
    pub position: u64,
    /// Samples lost since the instance was made.
    pub lost_samples: u64,
    /// Notes lost since then.
    pub lost_notes: u64,
    /// MIDI messages of checks that were sent late since then.
    pub late_messages: u64,
    /// What was unsound in the last loaded state.
    pub unsound: &'a [String],
    /// A clock in seconds, for what changes calmly.
    pub time_s: f64,
}

/// What the editor keeps between two frames.
#[derive(Debug, Clone, Default)]
pub struct Screen {
    theme: Theme,
    zoom: f32,
    tab: Tab,
    figures: Figures,
    sound: sound::Figures,
    plumb: Plumb,
    drift: Drift,
    captures: Captures,
    checks: Checks,
    keys: Keys,
    editing: Editing,
}

impl Screen {
    /// An editor with this look; a zoom of 1 is the size it was drawn for.
    #[must_use]
    pub fn new(theme: Theme, zoom: f32) -> Self {
        Self { theme, zoom, ..Self::default() }
    }

    /// Light or dark.
    #[must_use]
    pub fn theme(&self) -> Theme {
        self.theme
    }

    /// The zoom.
    #[must_use]
    pub fn zoom(&self) -> f32 {
        self.zoom
    }

    /// Takes a zoom that was set elsewhere.
    pub fn set_zoom(&mut self, zoom: f32) {
        self.zoom = zoom;
    }

    /// Pins a partial by its number, or none.
    pub fn pin(&mut self, partial: Option<u32>) {
        self.plumb.pinned = partial;
    }

    /// Compares a capture, by its number, with another one or with what is heard; without one nothing is compared.
    pub fn compare(&mut self, first: Option<u64>, second: Option<u64>) {
        self.captures.choose(first, second.map_or(Side::Live, Side::Kept));
    }

    /// Shows so many seconds of drift.
    pub fn span(&mut self, seconds: f64) {
        self.drift.span(seconds);
    }

    /// Draws a frame. Returns what is to be done to the parameters.
    pub fn show(&mut self, ui: &mut Ui, shown: &Shown<'_>) -> Vec<Gesture> {
        let area = ui.ctx().content_rect();
        self.update(shown, area.width());
        let mut gestures = Vec::new();
        let asked = self.draw(ui, area, shown, &mut gestures);
        if let Some(copy) = asked {
            ui.ctx().copy_text(match copy {
                Copy::Text => copy::text(shown),
                Copy::Csv => copy::csv(shown),
                Copy::KeysText => self.keys.text(shown),
                Copy::KeysCsv => self.keys.csv(shown),
                Copy::Picture => self.svg(area.size(), shown),
            });
        }
        gestures
    }

    /// The picture of what is shown, at a size in points, as SVG.
    #[must_use]
    pub fn svg(&self, size: egui::Vec2, shown: &Shown<'_>) -> String {
        let mut screen = self.clone();
        screen.update(shown, size.x);
        picture::svg(size, self.theme, |ui| {
            screen.draw(ui, ui.ctx().content_rect(), shown, &mut Vec::new());
        })
    }

    fn update(&mut self, shown: &Shown<'_>, width: f32) {
        self.figures.update(shown);
        self.sound.update(shown);
        self.plumb.update(shown);
        self.captures.update(shown);
        self.checks.update(&shown.parameters.results);
        self.keys.update(shown);
        self.drift.update(shown.trail, width - 2.0 * MARGIN, shown);
    }

    fn draw(
        &mut self,
        ui: &mut Ui,
        area: Rect,
        shown: &Shown<'_>,
        gestures: &mut Vec<Gesture>,
    ) -> Option<Copy> {
        let palette = self.theme.palette();
        *ui.visuals_mut() = self.theme.visuals();
        ui.painter().rect_filled(area, 0.0, palette.ground);
        let Self {
            theme,
            zoom,
            tab,
            figures,
            sound,
            plumb,
            drift,
            captures,
            checks,
            keys,
            editing,
        } = self;
        let mut bench = Bench { parameters: shown.parameters, palette, editing, gestures };
        let top = area.top() + band::HEIGHT;
        band::show(ui, area.with_max_y(top), shown, figures, &mut bench);
        let mut body = area.with_min_y(top).shrink(MARGIN);
        let notices = notices::notices(shown);
        if !notices.is_empty() {
            let height = notices::height(notices.len());
            notices::show(ui, body.with_max_y(body.top() + height), &notices, palette);
            body.min.y += height;
        }
        if area.height() >= TALL {
            let height = (area.height() * TRACE_SHARE).clamp(TRACE.0, TRACE.1);
            let trace = body.with_min_y(body.bottom() - height);
            drift.show(ui, trace, (shown, checks), &mut bench);
            body.max.y = trace.top() - GAP;
        }
        let mut asked = None;
        let mut of_keys = false;
        if area.width() >= WIDE {
            let split = body.right() - PANEL;
            let side = Rect::from_min_max(pos2(split, body.top()), body.max);
            let mut look = Look { theme, zoom, plumb };
            let views = Views { tab, look: &mut look, captures, checks, keys };
            asked = panel::show(ui, side, views, (shown, sound), &mut bench);
            body.max.x = split - GAP;
            of_keys = *tab == Tab::Keys;
        }
        match captures.comparison() {
            _ if of_keys => keys.picture(ui, body, shown, palette),
            Some(comparison) => comparison.show(ui, body, palette),
            None => plumb.show(ui, body, shown, palette),
        }
        captures::tell(ui, body, captures, shown.time_s, palette);
        if let Some(stretch) = checks.jump.take() {
            drift.jump(stretch);
            ui.ctx().request_repaint();
        }
        asked
    }
}
