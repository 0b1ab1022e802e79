//! The picture of a drift check: the pitch over time against its tolerance, what it comes to, and where it is outside.

use super::axis::{Axis, tick_decimals};
use super::canvas::{self, Canvas, Pen, Side, Type};
use super::head::{file_name, shortened};
use super::theme::{
    DIM, DRIFT_HEIGHT, GRID, GROUND, HEAD, INK, MARGIN, PANEL, PARTIAL, SANS_WIDTH, SPANS_HEIGHT,
    STRAY, WIDTH,
};
use crate::drift::record::{DriftRecord, SpanRecord, VerdictWord};
use crate::measure::{FileFacts, Timebase};
use crate::output::words::{UNMEASURED, plain, signed, with_deviation, with_unit};
use anyhow::Result;
use plumbtone_analysis::check::{Column, Trace};
use std::path::Path;

const PLOT_LEFT: f64 = 64.0;
const PLOT_RIGHT: f64 = WIDTH - MARGIN - 20.0;
const LABEL: Type = Type::sans(11.0, DIM);
const VALUE: Type = Type::sans(15.0, INK);
const SMALL: Type = Type::sans(10.0, DIM);
/// Room for values beyond the tolerance, as a multiple of it, and beyond what is heard.
const BEYOND_TOLERANCE: f64 = 1.6;
const BEYOND_HEARD: f64 = 1.15;
/// How far readings may stretch the scale, as a multiple of what the heard pitch needs.
const STRETCH: f64 = 3.0;
/// Spans listed.
const SPANS_SHOWN: usize = 12;

/// What is drawn.
pub(crate) struct DriftPicture<'a> {
    pub(crate) facts: &'a FileFacts,
    pub(crate) record: &'a DriftRecord,
    pub(crate) trace: &'a Trace,
    pub(crate) timebase: Timebase,
}

/// Draws the picture and puts it in its place.
///
/// # Errors
/// The place cannot be written to.
pub(crate) fn write(place: &Path, picture: &DriftPicture<'_>) -> Result<()> {
    super::write(place, &picture.draw()?)
}

impl DriftPicture<'_> {
    fn draw(&self) -> Result<String> {
        let plot_top = HEAD + MARGIN;
        let spans_top = plot_top + DRIFT_HEIGHT + 12.0;
        let height = spans_top + SPANS_HEIGHT + MARGIN;
        canvas::svg(WIDTH, height, |canvas| {
            canvas.rectangle((0.0, 0.0), (WIDTH, height), GROUND, 1.0)?;
            self.head(canvas)?;
            self.plot(canvas, plot_top)?;
            self.figures(canvas, spans_top)?;
            self.spans(canvas, spans_top)
        })
    }

    fn head(&self, canvas: &Canvas<'_>) -> Result<()> {
        let record = self.record;
        canvas.rectangle((0.0, 0.0), (WIDTH, HEAD), PANEL, 1.0)?;
        let (word, colour) = match record.verdict {
            VerdictWord::Within => ("within", PARTIAL),
            VerdictWord::Outside => ("outside", STRAY),
            VerdictWord::Unmeasured => ("unmeasured", DIM),
        };
        canvas.text(20.0, 37.0, word, Type::sans(36.0, colour).bold())?;
        let channel = &self.facts.channel;
        let reference = record.reference_hz.map(|hz| format!("{hz:.2} Hz"));
        let conditions = [
            ("reference", shortened(&record.reference, 18.0)),
            ("at", reference.unwrap_or_else(|| "varies".to_owned())),
            ("tolerance", format!("±{} ct", record.tolerance_cents)),
            ("concert pitch", format!("{} Hz", self.facts.concert_pitch_hz)),
            ("listening to", if channel.is_empty() { "mono".to_owned() } else { channel.clone() }),
        ];
        let lefts = [310.0, 490.0, 600.0, 700.0, 810.0];
        for ((label, value), left) in conditions.into_iter().zip(lefts) {
            canvas.text(left, 28.0, label, LABEL)?;
            canvas.text(left, 49.0, &value, VALUE)?;
        }
        let right = WIDTH - MARGIN;
        canvas.text(right, 28.0, "file", LABEL.at(Side::Right))?;
        let room = (right - 930.0) / (SANS_WIDTH * VALUE.size);
        canvas.text(right, 49.0, &shortened(&file_name(self.facts), room), VALUE.at(Side::Right))
    }

    fn plot(&self, canvas: &Canvas<'_>, top: f64) -> Result<()> {
        canvas.panel((MARGIN, top), (WIDTH - MARGIN, top + DRIFT_HEIGHT), PANEL)?;
        let heading = "heard pitch above the reference, cents (pale: readings, with vibrato)";
        canvas.text(MARGIN + 12.0, top + 16.0, heading, LABEL)?;
        let (bottom, top) = (top + DRIFT_HEIGHT - 28.0, top + 34.0);
        let times = Axis { values: self.times(), units: (PLOT_LEFT, PLOT_RIGHT) };
        let cents = Axis { values: self.range(), units: (bottom, top) };
        let tolerance = self.record.tolerance_cents;
        for span in &self.record.spans {
            let (from, to) = (times.within(span.start_s), times.within(span.end_s));
            canvas.rectangle((from, top), (to.max(from + 1.0), bottom), STRAY, 0.18)?;
        }
        for gap in &self.record.gaps {
            let (from, to) = (times.within(gap.start_s), times.within(gap.end_s));
            canvas.rectangle((from, top), (to.max(from + 1.0), bottom), DIM, 0.25)?;
        }
        let band = (cents.at(tolerance), cents.at(-tolerance));
        canvas.rectangle((PLOT_LEFT, band.0), (PLOT_RIGHT, band.1), PARTIAL, 0.08)?;
        grid(canvas, &times, &cents)?;
        for edge in [band.0, band.1] {
            canvas.dashed(&[(PLOT_LEFT, edge), (PLOT_RIGHT, edge)], Pen::new(1.0, DIM))?;
        }
        let plumb = Pen::new(1.0, DIM).strength(0.7);
        canvas.line((PLOT_LEFT, cents.at(0.0)), (PLOT_RIGHT, cents.at(0.0)), plumb)?;
        self.curves(canvas, &times, &cents)
    }

    /// The readings, pale, and the heard pitch over them.
    fn curves(&self, canvas: &Canvas<'_>, times: &Axis, cents: &Axis) -> Result<()> {
        for piece in self.trace.pieces() {
            let (mut raw, mut heard) = (Vec::new(), Vec::new());
            for column in piece {
                let first = times.within(self.timebase.seconds(column.positions.0));
                let last = times.within(self.timebase.seconds(column.positions.1));
                raw.push((first, cents.within(column.raw.0)));
                raw.push((last, cents.within(column.raw.1)));
                heard.push((0.5 * (first + last), cents.within(column.cents())));
            }
            canvas.path(&raw, Pen::new(1.0, PARTIAL).strength(0.35))?;
            match heard[..] {
                [only] => canvas.circle(only, 1.5, PARTIAL)?,
                _ => canvas.path(&heard, Pen::new(2.0, PARTIAL))?,
            }
        }
        Ok(())
    }

    /// What was listened to, from where to where in seconds.
    fn times(&self) -> (f64, f64) {
        let columns = self.trace.columns();
        let end_s = columns.last().map_or(0.0, |c| self.timebase.seconds(c.positions.1));
        let start_s = self.timebase.seconds(0);
        (start_s, end_s.max(start_s + 0.1))
    }

    fn range(&self) -> (f64, f64) {
        let extremes = |c: &Column| [c.extremes.0.abs(), c.extremes.1.abs()];
        let heard = self.trace.columns().iter().flat_map(extremes);
        let needed = heard.fold(0.0, f64::max) * BEYOND_HEARD;
        let needed = needed.max(BEYOND_TOLERANCE * self.record.tolerance_cents);
        let raw = [self.record.raw_lowest_cents, self.record.raw_highest_cents];
        let raw = raw.iter().flatten().fold(0.0_f64, |most, cents| most.max(cents.abs()));
        let most = (1.05 * raw).clamp(needed, STRETCH * needed);
        (-most, most)
    }

    fn figures(&self, canvas: &Canvas<'_>, top: f64) -> Result<()> {
        let record = self.record;
        let right = 0.5 * WIDTH - 6.0;
        canvas.panel((MARGIN, top), (right, top + SPANS_HEIGHT), PANEL)?;
        canvas.text(MARGIN + 12.0, top + 16.0, "what it comes to", LABEL)?;
        let cents = |value| with_unit(&signed(value, 2), "ct");
        let drift = with_deviation(record.drift_cents_per_min, record.drift_per_min_sd, 2, true);
        let share = record.measured_share.map(|share| 100.0 * share);
        let vibrato = match (record.vibrato_hz, record.vibrato_extent_cents) {
            (Some(rate), Some(extent)) => format!("{rate:.2} Hz, ±{extent:.1} ct"),
            _ => UNMEASURED.to_owned(),
        };
        let pairs = [
            ("worst", cents(record.worst_cents)),
            ("mean", cents(record.mean_cents)),
            ("drift", with_unit(&drift, "ct/min")),
            ("vibrato", vibrato),
            (
                "readings",
                format!(
                    "{} to {}",
                    signed(record.raw_lowest_cents, 2),
                    cents(record.raw_highest_cents)
                ),
            ),
            (
                "measured",
                format!(
                    "{} s, {}",
                    plain(Some(record.measured_s), 2),
                    with_unit(&plain(share, 0), "%")
                ),
            ),
            ("outside", format!("{:.2} s", record.outside_s)),
        ];
        for (row, (label, value)) in pairs.iter().enumerate() {
            let y = top + 44.0 + 22.0 * row as f64;
            canvas.text(MARGIN + 12.0, y, label, LABEL)?;
            canvas.text(MARGIN + 120.0, y, value, VALUE)?;
        }
        match &record.reason {
            Some(why) => {
                canvas.text(MARGIN + 12.0, top + SPANS_HEIGHT - 14.0, why, Type::sans(11.0, STRAY))
            }
            None => Ok(()),
        }
    }

    fn spans(&self, canvas: &Canvas<'_>, top: f64) -> Result<()> {
        let left = 0.5 * WIDTH + 6.0;
        canvas.panel((left, top), (WIDTH - MARGIN, top + SPANS_HEIGHT), PANEL)?;
        canvas.text(left + 12.0, top + 16.0, "where it is outside", LABEL)?;
        let columns = [left + 220.0, left + 320.0, left + 430.0, left + 540.0];
        for (x, head) in columns.into_iter().zip(["from s", "to s", "worst ct", "mean ct"]) {
            canvas.text(x, top + 16.0, head, LABEL.at(Side::Right))?;
        }
        for (row, span) in longest(&self.record.spans).into_iter().enumerate() {
            let y = top + 36.0 + 14.0 * row as f64;
            let cells = [
                format!("{:.3}", span.start_s),
                format!("{:.3}", span.end_s),
                signed(Some(span.worst_cents), 2),
                signed(Some(span.mean_cents), 2),
            ];
            for (x, cell) in columns.into_iter().zip(cells) {
                canvas.text(x, y, &cell, Type::mono(10.0, INK).at(Side::Right))?;
            }
        }
        if self.record.spans.is_empty() {
            return canvas.text(left + 12.0, top + 36.0, "nowhere", SMALL);
        }
        let unlisted =
            self.record.spans.len().saturating_sub(SPANS_SHOWN) as u64 + self.record.spans_left_out;
        let more = match unlisted {
            0 => return Ok(()),
            count => format!("and {count} shorter"),
        };
        canvas.text(left + 12.0, top + SPANS_HEIGHT - 14.0, &more, SMALL)
    }
}

/// The longest spans, in order of time.
fn longest(spans: &[SpanRecord]) -> Vec<&SpanRecord> {
    let mut all: Vec<&SpanRecord> = spans.iter().collect();
    all.sort_by(|a, b| b.length_s().total_cmp(&a.length_s()));
    all.truncate(SPANS_SHOWN);
    all.sort_by(|a, b| a.start_s.total_cmp(&b.start_s));
    all
}

fn grid(canvas: &Canvas<'_>, times: &Axis, cents: &Axis) -> Result<()> {
    let (bottom, top) = cents.units;
    let ticks = cents.ticks(9);
    let decimals = tick_decimals(&ticks);
    for &tick in &ticks {
        let y = cents.at(tick);
        canvas.line((PLOT_LEFT, y), (PLOT_RIGHT, y), Pen::new(1.0, GRID))?;
        canvas.text(PLOT_LEFT - 8.0, y, &signed(Some(tick), decimals), SMALL.at(Side::Right))?;
    }
    let ticks = times.ticks(12);
    let decimals = tick_decimals(&ticks);
    for &tick in &ticks {
        let x = times.at(tick);
        canvas.line((x, top), (x, bottom), Pen::new(1.0, GRID))?;
        let text = format!("{tick:.decimals$} s");
        canvas.text(x, bottom + 13.0, &text, SMALL.at(Side::Centre))?;
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::drift::record::ReferenceWords;
    use crate::fixtures;
    use crate::picture::tests::check_texts;
    use plumbtone_analysis::check::{
        CheckSettings, Drift, Heard, Outcome, Span, Unmeasured, Verdict, Vibrato,
    };

    #[test]
    fn no_text_lies_on_another_or_leaves_the_picture() {
        let usual = outcome(3);
        let nothing = Outcome {
            verdict: Verdict::Unmeasured(Unmeasured::Share(0.123)),
            reference_hz: None,
            worst_cents: None,
            mean_cents: None,
            drift: None,
            vibrato: None,
            raw_cents: None,
            measured_s: 0.0,
            measured_share: None,
            spans: Vec::new(),
            ..usual.clone()
        };
        let long = FileFacts {
            path: format!("{}.wav", "a very long name of a take ".repeat(9)).into(),
            channel: "channel 26".to_owned(),
            concert_pitch_hz: 415.305,
            ..fixtures::facts()
        };
        let name = "a long name of a file of notes.mid".to_owned();
        let words = ReferenceWords { kind: "expected", name };
        for (what, outcome, facts, heard) in [
            ("a usual check", &usual, &fixtures::facts(), 500),
            ("more spans than are listed", &outcome(4000), &long, 5000),
            ("nothing measured", &nothing, &long, 0),
        ] {
            check_texts(what, &drawn(outcome, &words, facts, heard));
        }
    }

    fn drawn(outcome: &Outcome, words: &ReferenceWords, facts: &FileFacts, heard: u64) -> String {
        let timebase = fixtures::TIMEBASE;
        let settings = CheckSettings::new(timebase.sample_rate_hz, timebase.hop);
        let record = DriftRecord::new(outcome, &settings, words, facts, timebase);
        let mut trace = Trace::new(400);
        for index in 0..heard {
            let cents = 1700.0 * (index as f64 / 40.0).sin();
            let position = 480 * (index + 100 * (index / 300));
            trace.push(&Heard {
                position,
                reference_hz: 220.0,
                cents,
                sd_cents: 0.3,
                raw_cents: 1.2 * cents,
            });
        }
        DriftPicture { facts, record: &record, trace: &trace, timebase }.draw().unwrap()
    }

    fn outcome(spans: u64) -> Outcome {
        let span = |i: u64| Span {
            start: 480_000 * i,
            end: 480_000 * i + 90_000,
            worst_cents: -1700.2,
            mean_cents: -1203.4,
        };
        Outcome {
            verdict: Verdict::Outside,
            reference_hz: Some(4186.01),
            worst_cents: Some(-1700.2),
            mean_cents: Some(-12.3),
            drift: Some(Drift { cents_per_s: -1234.5, sd: 0.001 }),
            vibrato: Some(Vibrato { rate_hz: 5.4, extent_cents: 123.4, share: 0.8 }),
            raw_cents: Some((-2040.0, 2040.0)),
            measured_s: 36_000.5,
            measured_share: Some(0.92),
            spans: (0..spans).map(span).collect(),
            spans_left_out: spans / 2,
            stability: Vec::new(),
        }
    }
}
