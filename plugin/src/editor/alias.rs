//! The worst alias as one figure: the one that stands out most over what the partials mask.

use egui::{Align2, Rect, Ui, pos2};
use plumbtone_analysis::Reading;
use plumbtone_analysis::keys::{AliasHeard, worst_alias_now};

use super::ink;
use super::steady::{Steady, signed};
use super::theme::{Palette, SMALL, VALUE, sans};
use super::words::hertz;

/// An alias that is not found for so long is gone, in seconds.
const GONE_S: f64 = 1.0;
/// Deviation that its level is rounded by, in dB: strays come without one.
const SHOWN_SD: f64 = 0.5;

/// The alias on display.
#[derive(Debug, Clone)]
pub(crate) struct Alias {
    worst: AliasHeard,
    relative_db: Steady,
    /// Centre of the last reading that had one, and of the last one at all.
    found: u64,
    centre: u64,
}

impl Alias {
    /// What is shown after another reading.
    pub(crate) fn next(
        before: Option<Self>,
        reading: &Reading,
        sample_rate_hz: f64,
    ) -> Option<Self> {
        let centre = reading.centre;
        let seconds = |from: u64| centre.saturating_sub(from) as f64 / sample_rate_hz;
        match (before, worst_alias_now(reading)) {
            (Some(mut alias), Some(worst)) => {
                let elapsed_s = seconds(alias.centre);
                alias.relative_db.update(worst.relative_db, SHOWN_SD, elapsed_s, 0);
                Some(Self { worst, found: centre, centre, ..alias })
            }
            (None, Some(worst)) => {
                let mut relative_db = Steady::default();
                relative_db.update(worst.relative_db, SHOWN_SD, 0.0, 0);
                Some(Self { worst, relative_db, found: centre, centre })
            }
            (Some(alias), None) => {
                (seconds(alias.found) < GONE_S).then_some(Self { centre, ..alias })
            }
            (None, None) => None,
        }
    }

    /// Draws it into a place of the band.
    pub(crate) fn show(&self, ui: &mut Ui, rect: Rect, palette: &Palette) {
        let heard = self.worst.over_mask_db > 0.0;
        let help = self.help();
        let place = (rect.left_top(), Align2::LEFT_TOP);
        ink::text(ui, place, "worst alias", sans(SMALL), palette.dim).on_hover_text(&help);
        let y = rect.bottom() - 10.0;
        ink::diamond(ui, pos2(rect.left() + 5.0, y), 4.5, palette.stray);
        let colour = if heard { palette.stray } else { palette.ink };
        let text = format!("{} dB", self.relative_db.text(true));
        let place = (pos2(rect.left() + 15.0, y), Align2::LEFT_CENTER);
        ink::text(ui, place, &text, sans(VALUE), colour).on_hover_text(help);
    }

    fn help(&self) -> String {
        format!("The alias that stands out most. {}", sentence(&self.worst))
    }
}

/// All there is to say of an alias.
pub(crate) fn sentence(alias: &AliasHeard) -> String {
    let AliasHeard { frequency_hz, partial, folds, relative_db, over_mask_db } = *alias;
    let times = match folds {
        1 => "once".to_owned(),
        2 => "twice".to_owned(),
        folds => format!("{folds} times"),
    };
    let heard = if over_mask_db > 0.0 {
        format!(
            "{over_mask_db:.0} dB over what the partials and the quiet hide there: it may be heard"
        )
    } else {
        format!(
            "{:.0} dB under what the partials and the quiet hide there: hardly heard",
            -over_mask_db
        )
    };
    format!(
        "Partial {partial}, folded {times}, at {} Hz, {} dB to the strongest partial, {heard}.",
        hertz(frequency_hz, 1),
        signed(relative_db, 1)
    )
}
