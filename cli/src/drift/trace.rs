//! The pitch over time, in bounded memory however long the file.

use plumbtone_analysis::check::Heard;

/// Columns kept at most: more than a picture is wide. When full, neighbours are joined.
const COLUMNS_MAX: usize = 4096;
/// Readings apart from which the trace is interrupted, as multiples of the least distance met.
const APART: u64 = 10;

/// Pitches over time.
#[derive(Debug)]
pub(crate) struct Trace {
    pub(crate) columns: Vec<Column>,
    /// Readings that a column stands for.
    span: u32,
    last: Option<u64>,
    /// Least distance of two readings, in samples.
    hop: u64,
}

/// A stretch of the trace.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Column {
    /// Sample positions of its first and last reading.
    pub(crate) positions: (u64, u64),
    count: u32,
    /// Sum of the heard pitches above the reference, in cents.
    heard: f64,
    /// Lowest and highest of them, in cents.
    pub(crate) extremes: (f64, f64),
    /// Lowest and highest reading, in cents.
    pub(crate) raw: (f64, f64),
    /// Whether the trace is interrupted before it.
    pub(crate) interrupted: bool,
}

impl Column {
    /// The mean heard pitch above the reference, in cents.
    pub(crate) fn cents(&self) -> f64 {
        self.heard / f64::from(self.count)
    }

    fn of(heard: &Heard, interrupted: bool) -> Self {
        Self {
            positions: (heard.position, heard.position),
            count: 1,
            heard: heard.cents,
            extremes: (heard.cents, heard.cents),
            raw: (heard.raw_cents, heard.raw_cents),
            interrupted,
        }
    }

    fn add(&mut self, other: &Self) {
        self.positions.1 = other.positions.1;
        self.count += other.count;
        self.heard += other.heard;
        self.extremes = joined(self.extremes, other.extremes);
        self.raw = joined(self.raw, other.raw);
    }
}

fn joined(a: (f64, f64), b: (f64, f64)) -> (f64, f64) {
    (a.0.min(b.0), a.1.max(b.1))
}

impl Default for Trace {
    fn default() -> Self {
        Self { columns: Vec::new(), span: 1, last: None, hop: u64::MAX }
    }
}

impl Trace {
    /// Takes in the next heard pitch.
    pub(crate) fn push(&mut self, heard: &Heard) {
        let distance = self.last.map_or(u64::MAX, |last| heard.position - last);
        self.hop = self.hop.min(distance);
        self.last = Some(heard.position);
        let interrupted = distance / APART > self.hop || distance == u64::MAX;
        let one = Column::of(heard, interrupted);
        match self.columns.last_mut() {
            Some(last) if !interrupted && last.count < self.span => last.add(&one),
            _ => self.columns.push(one),
        }
        if self.columns.len() >= COLUMNS_MAX {
            self.halve();
        }
    }

    fn halve(&mut self) {
        self.span *= 2;
        self.columns = self
            .columns
            .chunks(2)
            .map(|pair| {
                let mut column = pair[0];
                pair[1..].iter().for_each(|next| column.add(next));
                column
            })
            .collect();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_long_trace_stays_bounded_and_keeps_its_extremes() {
        let mut trace = Trace::default();
        for index in 0..1_000_000_u32 {
            let cents = if index == 777_777 { 40.0 } else { 1.0 };
            trace.push(&Heard {
                position: u64::from(index) * 480,
                reference_hz: 440.0,
                cents,
                sd_cents: 0.1,
                raw_cents: cents - 3.0,
            });
        }
        assert!(trace.columns.len() < COLUMNS_MAX, "{} columns", trace.columns.len());
        let extremes = trace.columns.iter().map(|c| c.extremes).reduce(joined);
        assert_eq!(extremes, Some((1.0, 40.0)), "heard");
        let counted: u32 = trace.columns.iter().map(|c| c.count).sum();
        assert_eq!(counted, 1_000_000, "readings in columns");
    }
}
