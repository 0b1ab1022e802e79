//! The editor's window: shows the newest readout and never waits for the worker.

mod readout_view;

use std::sync::Arc;
use std::time::Duration;

use nice_plug::context::gui::GuiContext;
use nice_plug::editor::dpi::LogicalSize;
use nice_plug_egui::baseview::HandlerError;
use nice_plug_egui::{
    EguiEditor, EguiEditorState, EguiNiceSettings, Frame, NiceEguiApp, RepaintNotifier,
    create_egui_editor,
};
use triple_buffer::Output;

use crate::parameters::Parameters;
use crate::pool::Bell;
use crate::readout::Readout;
use crate::status::Status;
use readout_view::Shown;

/// Size of the window, in points.
const SIZE: LogicalSize<f32> = LogicalSize::new(560.0, 640.0);
/// How often the age of a reading is drawn anew when nothing else happens.
const AGE_REFRESH: Duration = Duration::from_millis(250);

/// The editor of one instance; lives as long as that and is shown now and then.
#[derive(Debug)]
pub struct Window {
    parameters: Arc<Parameters>,
    status: Arc<Status>,
    bell: Bell,
    readout: Output<Readout>,
}

/// Makes the editor that the host opens and closes.
pub(crate) fn create(window: Window, repaint: RepaintNotifier) -> Option<EguiEditor<Window>> {
    let settings = EguiNiceSettings::new().with_tile("Plumbtone");
    create_egui_editor(EguiEditorState::from_size(SIZE, 1.0), repaint, settings, window)
}

impl Window {
    pub(crate) fn new(
        parameters: Arc<Parameters>,
        status: Arc<Status>,
        bell: Bell,
        readout: Output<Readout>,
    ) -> Self {
        Self { parameters, status, bell, readout }
    }
}

impl NiceEguiApp for Window {
    fn build(
        &mut self,
        egui_ctx: egui::Context,
        _nice_gui_ctx: GuiContext,
        _frame: &mut Frame,
    ) -> Result<(), HandlerError> {
        egui_ctx.set_zoom_factor(crate::convert::single(self.parameters.kept.zoom()));
        self.status.watch(true);
        self.bell.ring();
        Ok(())
    }

    fn ui(&mut self, ui: &mut egui::Ui, _frame: &mut Frame) {
        self.readout.update();
        let unsound = self.parameters.unsound.findings();
        let shown = Shown {
            readout: self.readout.output_buffer(),
            position: self.status.position(),
            lost_samples: self.status.lost_samples(),
            lost_notes: self.status.lost_notes(),
            unsound: &unsound,
        };
        egui::CentralPanel::default().show(ui, |ui| readout_view::show(ui, &shown));
        ui.ctx().request_repaint_after(AGE_REFRESH);
    }

    fn zoom_factor_changed(&mut self, zoom_factor: f32) {
        self.parameters.kept.set_zoom(f64::from(zoom_factor));
    }

    fn editor_closed(&mut self) {
        self.status.watch(false);
    }
}
