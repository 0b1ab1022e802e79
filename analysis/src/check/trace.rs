//! The heard pitch over time, in bounded memory however long the sound: what a picture of a check is drawn from.

use super::Heard;

/// Distance from which the trace is interrupted, as multiples of the least distance of two readings met.
const APART: u64 = 10;
/// Cents from one reading to the next that interrupt it too: another note, or another reference.
const JUMP_CENTS: f64 = 60.0;

/// Heard pitches over time, in columns that stand for more and more readings as they become too many.
#[derive(Debug)]
pub struct Trace {
    columns: Vec<Column>,
    most: usize,
    /// Readings so far.
    count: u64,
    /// Readings that a column stands for.
    span: u64,
    last: Option<(u64, f64)>,
    /// Least distance of two readings, in samples.
    hop: u64,
}

/// A stretch of the trace.
#[derive(Debug, Clone, Copy)]
pub struct Column {
    /// Sample positions of its first and last reading.
    pub positions: (u64, u64),
    count: u32,
    /// Sums of the heard pitches above the reference and of their deviations, in cents.
    heard: f64,
    sd: f64,
    /// Lowest and highest of the heard pitches, in cents.
    pub extremes: (f64, f64),
    /// Lowest and highest reading, in cents.
    pub raw: (f64, f64),
    /// Whether the trace is interrupted before it: by a gap, or since another note begins.
    pub interrupted: bool,
}

impl Column {
    /// The mean heard pitch above the reference, in cents.
    #[must_use]
    pub fn cents(&self) -> f64 {
        self.heard / f64::from(self.count)
    }

    /// The standard deviation of one heard pitch, on average, in cents.
    #[must_use]
    pub fn sd_cents(&self) -> f64 {
        self.sd / f64::from(self.count)
    }

    fn of(heard: &Heard, interrupted: bool) -> Self {
        Self {
            positions: (heard.position, heard.position),
            count: 1,
            heard: heard.cents,
            sd: heard.sd_cents,
            extremes: (heard.cents, heard.cents),
            raw: (heard.raw_cents, heard.raw_cents),
            interrupted,
        }
    }

    fn add(&mut self, other: &Self) {
        self.positions.1 = other.positions.1;
        self.count += other.count;
        self.heard += other.heard;
        self.sd += other.sd;
        self.extremes = joined(self.extremes, other.extremes);
        self.raw = joined(self.raw, other.raw);
    }
}

fn joined(a: (f64, f64), b: (f64, f64)) -> (f64, f64) {
    (a.0.min(b.0), a.1.max(b.1))
}

impl Trace {
    /// A trace of at most so many columns, 2 at least. When there are more, neighbours are joined.
    #[must_use]
    pub fn new(most: usize) -> Self {
        Self {
            columns: Vec::new(),
            most: most.max(2),
            count: 0,
            span: 1,
            last: None,
            hop: u64::MAX,
        }
    }

    /// The columns, in order.
    #[must_use]
    pub fn columns(&self) -> &[Column] {
        &self.columns
    }

    /// The stretches of the trace between two interruptions, in order.
    pub fn pieces(&self) -> impl Iterator<Item = &[Column]> {
        self.columns.chunk_by(|_, next| !next.interrupted)
    }

    /// Takes in the next heard pitch.
    pub fn push(&mut self, heard: &Heard) {
        let last = self.last.replace((heard.position, heard.cents));
        let distance = last.map_or(u64::MAX, |(position, _)| heard.position - position);
        self.hop = self.hop.min(distance);
        let jumped = last.is_some_and(|(_, cents)| (heard.cents - cents).abs() > JUMP_CENTS);
        let interrupted = jumped || distance == u64::MAX || distance / APART > self.hop;
        self.count += 1;
        let one = Column::of(heard, interrupted);
        match self.columns.last_mut() {
            Some(last) if !interrupted && u64::from(last.count) < self.span => last.add(&one),
            _ => self.columns.push(one),
        }
        if self.columns.len() > self.most {
            self.halve();
        }
    }

    /// Joins neighbours of one piece; where that is not enough, any.
    fn halve(&mut self) {
        self.span = (2 * self.count / self.most as u64).max(1);
        self.join(|next| !next.interrupted);
        if self.columns.len() > self.most / 4 * 3 {
            self.join(|_| true);
        }
    }

    fn join(&mut self, may: impl Fn(&Column) -> bool) {
        let mut all = core::mem::take(&mut self.columns).into_iter().peekable();
        while let Some(mut column) = all.next() {
            if let Some(next) = all.next_if(&may) {
                column.add(&next);
            }
            self.columns.push(column);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const MOST: usize = 480;

    fn trace(count: u32, cents: impl Fn(u32) -> Option<f64>) -> Trace {
        let mut trace = Trace::new(MOST);
        for index in 0..count {
            if let Some(cents) = cents(index) {
                trace.push(&Heard {
                    position: u64::from(index) * 480,
                    reference_hz: 440.0,
                    cents,
                    sd_cents: 0.1,
                    raw_cents: cents - 3.0,
                });
            }
        }
        trace
    }

    #[test]
    fn a_long_trace_stays_bounded_and_keeps_its_extremes() {
        let trace = trace(1_000_000, |index| Some(if index == 777_777 { 40.0 } else { 1.0 }));
        assert!(trace.columns.len() <= MOST, "{} columns", trace.columns.len());
        assert!(trace.columns.len() > MOST / 4, "{} columns", trace.columns.len());
        let extremes = trace.columns.iter().map(|c| c.extremes).reduce(joined);
        assert_eq!(extremes, Some((1.0, 40.0)), "heard");
        let counted: u32 = trace.columns.iter().map(|c| c.count).sum();
        assert_eq!(counted, 1_000_000, "readings in columns");
        assert!(trace.columns.iter().all(|c| (c.sd_cents() - 0.1).abs() < 1e-9), "deviations");
    }

    #[test]
    fn gaps_and_other_notes_make_pieces_and_drop_outs_none() {
        let cents = |index: u32| match index {
            100 | 105..110 => None,
            300..320 => None,
            _ => Some(if index < 200 { 40.0 } else { -45.0 }),
        };
        let short = trace(400, cents);
        let pieces: Vec<(u64, u64)> = short
            .pieces()
            .map(|piece| (piece[0].positions.0 / 480, piece[piece.len() - 1].positions.1 / 480))
            .collect();
        assert_eq!(pieces, [(0, 199), (200, 299), (320, 399)], "a note, another, and a gap");
        // Ten times as slow, where the drop-outs are gaps too: joined columns are of one piece, as long as there are few.
        let long = trace(4_000, |index| cents(index / 10));
        assert_eq!(long.pieces().count(), 5, "pieces of fewer columns");
        assert!(long.columns.iter().all(|c| c.extremes.1 - c.extremes.0 < 1.0), "no mixture");
    }

    #[test]
    fn many_pieces_stay_bounded_too() {
        let jumps = trace(100_000, |index| Some(if index % 2 == 0 { 50.0 } else { -50.0 }));
        assert!(jumps.columns.len() <= MOST, "{} columns", jumps.columns.len());
        // What comes after them is as fine as its share of the whole.
        let calm =
            trace(100_000, |index| Some(if index < 50_000 && index % 2 == 0 { 99.0 } else { 0.0 }));
        let after = calm.columns.iter().filter(|c| c.positions.0 > 50_000 * 480).count();
        assert!(after > MOST / 8, "{after} columns");
    }
}
