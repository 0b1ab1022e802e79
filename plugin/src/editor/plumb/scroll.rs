//! Which rows of partials are to be seen: as many as fit the sound, or as the wheel and the keys say.

use egui::{Key, Rangef, Rect, Response, Role, Sense, Ui, WidgetInfo};

use super::super::field;
use super::axis::RowAxis;

/// Fewest and most rows.
const ROWS: (f32, f32) = (8.0, 128.0);

/// How the rows are scrolled and zoomed.
#[derive(Debug, Clone)]
pub(crate) struct Scroll {
    /// Rows to be seen, when the user zoomed.
    rows: Option<f32>,
    /// Number of the lowest row.
    first: f32,
}

impl Default for Scroll {
    fn default() -> Self {
        Self { rows: None, first: 1.0 }
    }
}

impl Scroll {
    /// Back to the automatic choice of rows.
    fn fit(&mut self) {
        *self = Self::default();
    }

    /// The rows over a height; `fitting` of them unless the user zoomed.
    pub(crate) fn axis(&mut self, y: Rangef, fitting: f32) -> RowAxis {
        let count = self.rows.unwrap_or(fitting).clamp(ROWS.0, ROWS.1);
        self.first = self.first.clamp(1.0, (ROWS.1 - count + 1.0).max(1.0));
        RowAxis { y, first: self.first, count }
    }

    /// Takes what wheel, double click and keys do to the ground of a view, which goes by a name.
    pub(crate) fn navigate(&mut self, ui: &Ui, rect: Rect, axis: RowAxis, name: &str) -> Response {
        let response = ui.interact(rect, ui.scope_id().with("ground"), Sense::click());
        response.widget_info(|| WidgetInfo::labeled(Role::GenericContainer, true, name));
        if response.double_clicked() {
            self.fit();
        }
        if ui.rect_contains_pointer(rect) {
            let (scroll, zoom) =
                ui.input(|input| (input.smooth_scroll_delta().y, input.zoom_delta()));
            if (zoom - 1.0).abs() > 1e-3 {
                let at =
                    ui.input(|input| input.pointer.hover_pos()).map_or(rect.center().y, |p| p.y);
                let number = axis.number(at);
                let count = (axis.count / zoom).clamp(ROWS.0, ROWS.1);
                self.first = number - (number - axis.first) * count / axis.count;
                self.rows = Some(count);
            } else if scroll != 0.0 {
                self.rows = Some(axis.count);
                self.first += scroll / axis.row();
            }
        }
        field::keep_arrows(ui, &response);
        if response.has_focus() {
            self.keys(ui, axis);
        }
        response
    }

    fn keys(&mut self, ui: &Ui, axis: RowAxis) {
        let pressed = |key| ui.input(|input| input.key_pressed(key));
        for (key, by) in [(Key::Plus, 0.8), (Key::Equals, 0.8), (Key::Minus, 1.25)] {
            if pressed(key) {
                self.rows = Some((axis.count * by).clamp(ROWS.0, ROWS.1));
            }
        }
        for (key, by) in [(Key::PageUp, 0.8), (Key::PageDown, -0.8)] {
            if pressed(key) {
                self.rows = Some(axis.count);
                self.first += by * axis.count;
            }
        }
        if pressed(Key::Home) {
            self.fit();
        }
    }
}
