//! Where the rows of the plumb view lie, and how large what stands in them is.

use crate::output::records::NoteRecord;

/// Fewest rows, so that a sound of one partial still shows that there is room for others.
const ROWS_LEAST: u32 = 8;
/// Height of all rows together, at least, and of one row.
const HEIGHT_LEAST: f64 = 420.0;
const ROW_LEAST: f64 = 13.0;

/// The rows: partial number `n` lies at `y(n)`, number 0 at the bottom.
#[derive(Debug, Clone, Copy)]
pub(super) struct Rows {
    pub(super) count: u32,
    pub(super) top: f64,
    pub(super) bottom: f64,
    height: f64,
}

impl Rows {
    pub(super) fn new(note: &NoteRecord, top: f64) -> Self {
        let count = count(note);
        let all = Self::height_for(note);
        Self { count, top, bottom: top + all, height: all / (f64::from(count) + 0.7) }
    }

    /// Height of all rows of a note.
    pub(super) fn height_for(note: &NoteRecord) -> f64 {
        (ROW_LEAST * (f64::from(count(note)) + 0.7)).max(HEIGHT_LEAST)
    }

    /// Height of a partial number, which need not be whole.
    pub(super) fn y(&self, number: f64) -> f64 {
        self.bottom - self.height * number
    }

    /// Whether a height lies among the rows.
    pub(super) fn holds(&self, y: f64) -> bool {
        y >= self.top && y <= self.bottom
    }

    pub(super) fn type_size(&self) -> f64 {
        (0.72 * self.height).min(11.0)
    }

    /// Every row has its number while there is room for it.
    pub(super) fn numbered(&self, number: u32) -> bool {
        self.height >= ROW_LEAST || number == 1 || number.is_multiple_of(5)
    }

    /// Radius of the dot of a partial whose level lies at a share of the level axis.
    pub(super) fn dot(&self, share: f64) -> f64 {
        (2.6 + 3.2 * share).min(0.42 * self.height)
    }

    /// Thickness of a level bar.
    pub(super) fn bar(&self) -> f64 {
        (0.5 * self.height).min(9.0)
    }
}

fn count(note: &NoteRecord) -> u32 {
    note.partials.iter().map(|partial| partial.number).max().unwrap_or(0).max(ROWS_LEAST)
}
