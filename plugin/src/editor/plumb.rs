//! The plumb view: partial number upwards, cents off the harmonic series sideways, levels and figures beside it.

mod axis;
mod memory;
mod pinned;
mod rows;
mod scroll;
mod strays;

use egui::{Align2, Key, Rangef, Rect, Stroke, Ui, pos2, vec2};
use plumbtone_analysis::{Partial, Reading};

use self::axis::CalmFloor;
pub(crate) use self::axis::{
    Axis, CENTS, Calm, CalmCents, CalmRange, CalmRows, RowAxis, round_step,
};
use self::memory::Memory;
use self::rows::Columns;
pub(crate) use self::rows::{WHISKER_SD, figures_every};
pub(crate) use self::scroll::Scroll;
use super::ink;
use super::screen::Shown;
use super::steady::signed;
use super::theme::{CORNER, PAD, Palette, SMALL, mono, sans};
use super::words;
use crate::voices::Voices;

/// Height of the captions above the rows and of the scale below them.
const HEAD: f32 = 28.0;
const FOOT: f32 = 28.0;
/// What a screen reader calls it.
const NAME: &str = "Plumb view: partials off the harmonic series";
/// Widths: partial numbers, lane of the strays, and the figures of Hz and dB.
const NUMBERS: f32 = 42.0;
const LANE: f32 = 48.0;
const HZ: f32 = 84.0;
const DB: f32 = 64.0;
/// Width below which the dB, and below which the Hz are left out.
const WIDE_FOR_DB: f32 = 520.0;
const WIDE_FOR_HZ: f32 = 420.0;
/// Partials whose cents are less sure than this do not stretch the scale.
const SURE_CENTS: f64 = 10.0;
/// Room left of the weakest partial's level, in dB.
const ROOM_DB: f64 = 8.0;

/// What levels are given against.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Levels {
    /// Full scale: 0 dBFS is a full-scale sine.
    #[default]
    FullScale,
    /// The strongest partial.
    Strongest,
    /// Partial 1.
    First,
}

impl Levels {
    /// All of them, with the words they go by.
    pub const ALL: [(Self, &'static str); 3] = [
        (Self::FullScale, "dBFS"),
        (Self::Strongest, "to strongest"),
        (Self::First, "to partial 1"),
    ];

    /// Level that counts as 0 dB; 0 dBFS where there is nothing to compare with.
    fn zero_dbfs(self, partials: &[Partial]) -> f64 {
        let strongest =
            || partials.iter().map(|p| p.level_dbfs).filter(|l| l.is_finite()).reduce(f64::max);
        let first = || partials.iter().find(|p| p.number == 1).map(|p| p.level_dbfs);
        match self {
            Self::FullScale => None,
            Self::Strongest => strongest(),
            Self::First => first().filter(|level| level.is_finite()),
        }
        .unwrap_or(0.0)
    }

    /// Upper end of the scale, in dB.
    fn top_db(self) -> f64 {
        match self {
            Self::FullScale | Self::Strongest => 0.0,
            Self::First => 20.0,
        }
    }
}

/// How the view is set and what it remembers.
#[derive(Debug, Clone)]
pub(crate) struct Plumb {
    pub(crate) levels: Levels,
    /// Half-width of the scale of cents, when the user fixed it.
    pub(crate) fixed_cents: Option<f64>,
    calm_cents: CalmCents,
    calm_rows: CalmRows,
    /// The scale and the rows that fitted the last partials there were.
    fitting_cents: (f64, f64),
    fitting_rows: f32,
    calm_floor: CalmFloor,
    fitting_floor: f64,
    scroll: Scroll,
    pub(crate) pinned: Option<u32>,
    memory: Memory,
}

impl Default for Plumb {
    fn default() -> Self {
        Self {
            levels: Levels::default(),
            fixed_cents: None,
            calm_cents: CalmCents::default(),
            calm_rows: CalmRows::default(),
            fitting_cents: (-20.0, 20.0),
            fitting_rows: 16.0,
            calm_floor: CalmFloor::default(),
            fitting_floor: -80.0,
            scroll: Scroll::default(),
            pinned: None,
            memory: Memory::default(),
        }
    }
}

impl Plumb {
    /// Takes the newest reading.
    pub(crate) fn update(&mut self, shown: &Shown<'_>) {
        let readout = shown.readout;
        if readout.measured && readout.sample_rate_hz > 0.0 {
            let time_s = readout.reading.centre as f64 / readout.sample_rate_hz;
            self.memory.push(readout.stream, time_s, &readout.reading.partials);
        }
    }

    /// Draws it.
    pub(crate) fn show(&mut self, ui: &mut Ui, rect: Rect, shown: &Shown<'_>, palette: &Palette) {
        ui.painter().rect_filled(rect, CORNER, palette.card);
        let mut ui = ui.new_child(egui::UiBuilder::new().max_rect(rect).id_salt("plumb"));
        let ui = &mut ui;
        ui.shrink_clip_rect(rect);
        let pinned = self.pinned.filter(|_| rect.height() > 300.0);
        let body =
            if pinned.is_some() { rect.with_max_y(rect.bottom() - pinned::HEIGHT) } else { rect };
        let reading = &shown.readout.reading;
        let held = shown.readout.measured && shown.readout.pitch().is_some();
        let partials: &[Partial] = if held { &reading.partials } else { &[] };
        let columns = self.columns(body, shown, partials);
        if self.scroll.navigate(ui, body, columns.rows, NAME).has_focus() {
            self.keys(ui);
        }
        if held {
            captions(ui, &columns, self.levels, palette);
            grid(ui, &columns, palette);
            self.sound(ui, &columns, reading, &shown.readout.voices, palette);
        } else {
            nothing(ui, body, shown, palette);
        }
        if let Some(number) = pinned {
            let inset = rect.with_min_y(rect.bottom() - pinned::HEIGHT);
            if pinned::show(ui, inset, number, &self.memory, palette).clicked() {
                self.pinned = None;
            }
        }
    }

    fn sound(
        &mut self,
        ui: &mut Ui,
        columns: &Columns,
        reading: &Reading,
        voices: &Voices,
        palette: &Palette,
    ) {
        let Some(pitch) = &reading.pitch else { return };
        let zero = self.levels.zero_dbfs(&reading.partials);
        let level = |dbfs: f64| dbfs - zero;
        let cluster = |number| voices.of(number, pitch.f0_hz);
        let partials = (&reading.partials[..], self.pinned);
        let done = rows::show(ui, columns, partials, (level, cluster), palette);
        let highest = reading.partials.iter().map(|p| p.number).max().unwrap_or(0);
        rows::curve(ui, columns, reading.stretch, highest, palette);
        let lane = strays::Lane {
            rows: columns.rows,
            diamonds: columns.levels.x.min - LANE / 2.0,
            levels: columns.levels,
            right: columns.levels.x.max + 14.0,
        };
        strays::show(ui, &lane, (&reading.strays, pitch.f0_hz, reading.stretch), level, palette);
        if let Some(number) = done.clicked {
            self.pinned = if self.pinned == Some(number) { None } else { Some(number) };
        }
    }

    fn columns(&mut self, rect: Rect, shown: &Shown<'_>, partials: &[Partial]) -> Columns {
        let highest = partials.iter().map(|p| p.number).max().unwrap_or(0);
        if !partials.is_empty() {
            self.fitting_rows = self.calm_rows.update(highest, shown.time_s);
        }
        let y = Rangef::new(rect.top() + HEAD, rect.bottom() - FOOT);
        let rows = self.scroll.axis(y, self.fitting_rows);
        let (low, high) = self.scale(shown, partials);
        if !partials.is_empty() {
            self.refit_floor(shown);
        }
        let db = (rect.width() > WIDE_FOR_DB).then_some(rect.right() - PAD);
        let hz = (rect.width() > WIDE_FOR_HZ)
            .then_some(rect.right() - PAD - if db.is_some() { DB } else { 0.0 });
        let figures = hz.map_or(rect.right() - PAD, |hz| hz - HZ);
        let left = rect.left() + NUMBERS + 14.0;
        let middle = left + (figures - left) * 0.62;
        Columns {
            rows,
            numbers: rect.left() + NUMBERS,
            cents: Axis { x: Rangef::new(left, middle - LANE / 2.0), low, high },
            levels: Axis {
                x: Rangef::new(middle + LANE / 2.0, figures),
                low: self.fitting_floor,
                high: self.levels.top_db(),
            },
            hz,
            db,
            whole: rect.shrink2(vec2(4.0, 0.0)),
        }
    }

    /// Ends of the scale of cents.
    fn scale(&mut self, shown: &Shown<'_>, partials: &[Partial]) -> (f64, f64) {
        if let Some(half) = self.fixed_cents {
            return (-half, half);
        }
        let sure = partials
            .iter()
            .filter(|p| p.cents_sd < SURE_CENTS && p.cents_from_harmonic.is_finite());
        let (low, high) = sure.fold((0.0f64, 0.0f64), |(low, high), p| {
            let reach = 2.0 * p.cents_sd;
            (low.max(reach - p.cents_from_harmonic), high.max(p.cents_from_harmonic + reach))
        });
        if !partials.is_empty() {
            self.fitting_cents = self.calm_cents.update((low * 1.05, high * 1.05), shown.time_s);
        }
        self.fitting_cents
    }

    /// The scale of levels holds all partials, and the strays that are labelled.
    fn refit_floor(&mut self, shown: &Shown<'_>) {
        let Reading { partials, strays, .. } = &shown.readout.reading;
        let zero = self.levels.zero_dbfs(partials);
        let strays = strays.iter().take(strays::LABELLED_MOST).map(|stray| stray.level_dbfs);
        let levels = partials.iter().map(|p| p.level_dbfs).chain(strays);
        let below = levels.map(|level| zero - level).filter(|below| below.is_finite());
        if let Some(weakest) = below.reduce(f64::max) {
            self.fitting_floor = self.calm_floor.update(weakest + ROOM_DB, shown.time_s);
        }
    }

    /// Pins by keys.
    fn keys(&mut self, ui: &Ui) {
        let pressed = |key| ui.input(|input| input.key_pressed(key));
        let pinned = self.pinned.unwrap_or(0);
        if pressed(Key::ArrowUp) {
            self.pinned = Some((pinned + 1).min(128));
        }
        if pressed(Key::ArrowDown) {
            self.pinned = Some(pinned.saturating_sub(1).max(1));
        }
        if pressed(Key::Escape) {
            self.pinned = None;
        }
    }
}

fn captions(ui: &mut Ui, columns: &Columns, levels: Levels, palette: &Palette) {
    let y = columns.whole.top() + 15.0;
    let mut caption = |x: f32, align: Align2, text: &str, help: &str| {
        ink::text(ui, (pos2(x, y), align), text, sans(SMALL), palette.dim).on_hover_text(help);
    };
    let left = columns.whole.left() + 8.0;
    caption(left, Align2::LEFT_CENTER, "partial", "Number of the partial: 1 is the fundamental.");
    caption(
        columns.cents.x.min,
        Align2::LEFT_CENTER,
        "cents off the harmonic series",
        "How far each partial lies from its number times the fundamental, with two standard deviations each way. The dashed line is a stiff string's stretch.",
    );
    let words =
        Levels::ALL.iter().find(|(mode, _)| *mode == levels).map_or("level", |(_, words)| words);
    caption(
        columns.levels.x.min,
        Align2::LEFT_CENTER,
        &format!("level, {words}"),
        "How strong each partial is. Settings has what levels are given against.",
    );
    if let Some(x) = columns.hz {
        caption(x, Align2::RIGHT_CENTER, "Hz", "Frequency of each partial.");
    }
    if let Some(x) = columns.db {
        caption(
            x,
            Align2::RIGHT_CENTER,
            "dB",
            "Level of each partial, against what the level's caption says.",
        );
    }
}

fn grid(ui: &Ui, columns: &Columns, palette: &Palette) {
    let painter = ui.painter();
    let rows = columns.rows;
    let faint = Stroke::new(1.0, palette.grid);
    for cents in columns.cents.ticks(54.0) {
        let x = columns.cents.at(cents);
        let zero = cents.abs() < 1e-9;
        let stroke = if zero { Stroke::new(1.5, palette.dim) } else { faint };
        painter.vline(x, rows.y, stroke);
        let decimals = if columns.cents.high < 5.0 { 1 } else { 0 };
        let text = signed(cents, decimals);
        let at = pos2(x, rows.y.max + 13.0);
        ink::mark(ui, at, Align2::CENTER_CENTER, &text, mono(SMALL), palette.dim);
    }
    for level in columns.levels.ticks(60.0) {
        let at = pos2(columns.levels.at(level), rows.y.max + 13.0);
        painter.vline(at.x, rows.y, faint);
        ink::mark(ui, at, Align2::CENTER_CENTER, &signed(level, 0), mono(SMALL), palette.dim);
    }
}

/// What stands where the partials would: the plumb line alone, and why nothing hangs off it.
fn nothing(ui: &mut Ui, rect: Rect, shown: &Shown<'_>, palette: &Palette) {
    let text = match words::saying(shown.readout, shown.position) {
        words::Saying::NoPitch("several pitches") => {
            "more than one pitch at once: no single series to hang partials on"
        }
        words::Saying::NoPitch("unpitched") => {
            "sound without a pitch: no series to hang partials on"
        }
        words::Saying::NoPitch("silent") => "silence",
        words::Saying::NoPitch("waiting for sound") => "play something, and its partials hang here",
        words::Saying::NoPitch("gap") => "samples are missing here",
        words::Saying::NoPitch("no sure pitch") => "too unsure of the pitch to hang partials on it",
        words::Saying::NoPitch(_) | words::Saying::Pitch(_) => "no partials",
    };
    let line = Rangef::new(rect.top() + HEAD, rect.center().y - 20.0);
    ui.painter().vline(rect.center().x, line, Stroke::new(1.5, palette.edge));
    let bob = pos2(rect.center().x, line.max);
    let points = vec![bob + vec2(-4.0, 0.0), bob + vec2(4.0, 0.0), bob + vec2(0.0, 9.0)];
    ui.painter().add(egui::Shape::convex_polygon(points, palette.edge, Stroke::NONE));
    let place = (rect.center() + vec2(0.0, 8.0), Align2::CENTER_CENTER);
    ink::text_within(ui, place, (text, rect.width() - 24.0), sans(13.0), palette.dim);
}
