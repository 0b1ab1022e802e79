//! The editor: shows what the worker said last, and never waits for it. Each view is a function of plain data.

mod alias;
mod band;
mod captures;
mod checks;
mod copy;
mod difference;
mod drift;
mod field;
mod ink;
mod keys;
mod knob;
mod mark;
mod notices;
mod panel;
mod parts;
mod picture;
mod plumb;
mod screen;
mod settings;
mod sound;
mod steady;
mod theme;
mod words;

use std::sync::{Arc, Mutex};
use std::time::{Duration, Instant};

use nice_plug::context::gui::GuiContext;
use nice_plug::editor::dpi::LogicalSize;
use nice_plug::editor::{ResizeHint, SizeConstraints};
use nice_plug::plugin::TrackInfo;
use nice_plug_egui::baseview::{HandlerError, WindowSize};
use nice_plug_egui::{
    EguiEditor, EguiEditorState, EguiNiceSettings, Frame, NiceEguiApp, RepaintNotifier,
    create_egui_editor,
};
use triple_buffer::Output;

pub use knob::{Gesture, Knob};
pub use plumb::Levels;
pub use screen::{Screen, Shown};
pub use theme::{Theme, install_fonts};

use crate::convert::single;
use crate::parameters::Parameters;
use crate::pool::Bell;
use crate::readout::Readout;
use crate::status::Status;
use crate::trail::Trail;

/// Size of the window when it is first opened, and its smallest one, in points.
const SIZE: LogicalSize<f32> = LogicalSize::new(1120.0, 760.0);
const SMALLEST: LogicalSize<f32> = LogicalSize::new(480.0, 320.0);
/// Time in which a window takes its first size.
const OPENING: Duration = Duration::from_millis(500);

/// The editor of one instance; lives as long as that and is shown now and then.
#[derive(Debug)]
pub struct Window {
    parameters: Arc<Parameters>,
    status: Arc<Status>,
    bell: Bell,
    readout: Output<Readout>,
    trail: Arc<Mutex<Trail>>,
    open: Option<Open>,
}

/// What there is only while the window is open.
struct Open {
    screen: Screen,
    context: GuiContext,
    since: Instant,
    /// The kept size of the window, until it was asked for.
    size: Option<egui::Vec2>,
}

impl core::fmt::Debug for Open {
    fn fmt(&self, f: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        f.debug_struct("Open").field("screen", &self.screen).finish_non_exhaustive()
    }
}

/// Makes the editor that the host opens and closes.
pub(crate) fn create(window: Window, repaint: RepaintNotifier) -> Option<EguiEditor<Window>> {
    let constraints = SizeConstraints::Logical { min_size: Some(SMALLEST), max_size: None };
    let hint = ResizeHint { size_constraints: constraints, ..ResizeHint::RESIZABLE };
    let settings = EguiNiceSettings::new().with_tile("Plumbtone").with_resize_hint(hint);
    create_egui_editor(EguiEditorState::from_size(SIZE, 1.0), repaint, settings, window)
}

impl Window {
    pub(crate) fn new(
        parameters: Arc<Parameters>,
        status: Arc<Status>,
        bell: Bell,
        readout: Output<Readout>,
        trail: Arc<Mutex<Trail>>,
    ) -> Self {
        Self { parameters, status, bell, readout, trail, open: None }
    }
}

impl NiceEguiApp for Window {
    fn build(
        &mut self,
        egui_ctx: egui::Context,
        nice_gui_ctx: GuiContext,
        _frame: &mut Frame,
    ) -> Result<(), HandlerError> {
        let zoom = single(self.parameters.kept.zoom());
        let theme = self.parameters.kept.theme();
        install_fonts(&egui_ctx);
        theme.apply(&egui_ctx);
        egui_ctx.set_zoom_factor(zoom);
        let screen = Screen::new(theme, zoom);
        let size = self.parameters.kept.size();
        self.open = Some(Open {
            screen,
            context: nice_gui_ctx,
            since: Instant::now(),
            size: size.map(|(width, height)| egui::vec2(single(width), single(height))),
        });
        self.status.watch(true);
        self.bell.ring();
        Ok(())
    }

    fn ui(&mut self, ui: &mut egui::Ui, _frame: &mut Frame) {
        let Some(Open { screen, context, since, size }) = &mut self.open else { return };
        if let Some(size) = size.take()
            && (ui.ctx().content_rect().size() - size).abs().max_elem() > 1.0
        {
            ui.ctx().send_viewport_cmd(egui::ViewportCommand::InnerSize(size));
        }
        self.readout.update();
        let unsound = self.parameters.unsound.findings();
        let shown = Shown {
            readout: self.readout.output_buffer(),
            trail: &self.trail,
            parameters: &self.parameters,
            position: self.status.position(),
            lost_samples: self.status.lost_samples(),
            lost_notes: self.status.lost_notes(),
            late_messages: self.status.late_messages(),
            unsound: &unsound,
            time_s: since.elapsed().as_secs_f64(),
        };
        // The toolkit's own shortcuts zoom too.
        screen.set_zoom(ui.ctx().zoom_factor());
        let (theme, zoom) = (screen.theme(), screen.zoom());
        for gesture in screen.show(ui, &shown) {
            gesture.apply(&self.parameters, &context.param_setter());
        }
        if screen.theme() != theme {
            screen.theme().apply(ui.ctx());
            self.parameters.kept.set_theme(screen.theme());
            ui.ctx().request_repaint();
        }
        if (screen.zoom() - zoom).abs() > f32::EPSILON {
            ui.ctx().set_zoom_factor(screen.zoom());
        }
    }

    fn zoom_factor_changed(&mut self, zoom_factor: f32) {
        self.parameters.kept.set_zoom(f64::from(zoom_factor));
    }

    fn resized(&mut self, new_size: WindowSize) {
        // The sizes that a window goes through while it opens are nobody's choice.
        if self.open.as_ref().is_some_and(|open| open.since.elapsed() > OPENING) {
            self.parameters.kept.set_size(new_size.logical.width, new_size.logical.height);
        }
    }

    fn track_info_changed(&mut self, info: TrackInfo) {
        self.parameters.results.set_track(info.name());
    }

    fn editor_closed(&mut self) {
        self.open = None;
        self.status.watch(false);
    }
}
