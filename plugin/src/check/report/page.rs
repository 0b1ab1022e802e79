//! The report as one page: all checks over time, and a line for each.

use std::fmt::Write as _;

use super::super::result::{CheckResult, VerdictWord, clock};
use super::{CAUTION, Job};

/// Size of the page, and the margin, in points.
const WIDTH: f64 = 842.0;
const MARGIN: f64 = 36.0;
/// Place and height of the lane of time, and where the lines begin.
const LANE: (f64, f64) = (92.0, 26.0);
const LINES: f64 = 160.0;
const LINE: f64 = 20.0;
/// Most checks that have a line, and most spans told in one.
const LINES_MAX: usize = 40;
const SPANS_MAX: usize = 3;
/// Most characters of a comment that a line shows.
const COMMENT: usize = 60;

const INK: &str = "#181f28";
const DIM: &str = "#556171";
const EDGE: &str = "#c0c9d4";
const WITHIN: &str = "#067558";
const OUTSIDE: &str = "#ac4406";

/// All of it.
pub(super) fn text(job: &Job) -> String {
    let lines = job.results.len().min(LINES_MAX);
    let notes = job.results.iter().take(LINES_MAX).filter(|r| has_note(r)).count();
    let height = LINES + LINE * (lines + notes) as f64 + 64.0;
    let mut page = Page(format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{WIDTH}\" height=\"{height}\" viewBox=\"0 0 {WIDTH} {height}\" font-family=\"sans-serif\">\n<rect width=\"{WIDTH}\" height=\"{height}\" fill=\"#ffffff\"/>\n"
    ));
    head(&mut page, job);
    lane(&mut page, &job.results);
    let mut y = columns(&mut page);
    for result in job.results.iter().take(LINES_MAX) {
        y = line(&mut page, y, result);
    }
    if job.results.len() > lines {
        let more = format!("and {} more, in the CSV and JSON files", job.results.len() - lines);
        page.text((MARGIN, y + 14.0), 11.0, DIM, &more);
    }
    page.text((MARGIN, height - 18.0), 10.0, DIM, CAUTION);
    page.0.push_str("</svg>\n");
    page.0
}

struct Page(String);

impl Page {
    fn write(&mut self, text: core::fmt::Arguments<'_>) {
        // Writing to a string cannot fail.
        let _ = self.0.write_fmt(text);
        self.0.push('\n');
    }

    fn text(&mut self, (x, y): (f64, f64), size: f64, colour: &str, text: &str) {
        let text = escaped(text);
        self.write(format_args!(
            "<text x=\"{x:.1}\" y=\"{y:.1}\" font-size=\"{size}\" fill=\"{colour}\">{text}</text>"
        ));
    }

    fn bar(&mut self, (from, to): (f64, f64), (y, height): (f64, f64), colour: &str) {
        let width = (to - from).max(1.0);
        self.write(format_args!(
            "<rect x=\"{from:.2}\" y=\"{y:.1}\" width=\"{width:.2}\" height=\"{height:.1}\" fill=\"{colour}\"/>"
        ));
    }
}

fn head(page: &mut Page, job: &Job) {
    page.text((MARGIN, 50.0), 20.0, INK, job.place.title());
    let count = |word| job.results.iter().filter(|r| r.verdict == word).count();
    let summary = format!(
        "Pitch-drift checks: {} within, {} outside, {} unmeasured. Written {}.",
        count(VerdictWord::Within),
        count(VerdictWord::Outside),
        count(VerdictWord::Unmeasured),
        job.place.stamp()
    );
    page.text((MARGIN, 72.0), 12.0, DIM, &summary);
}

/// The checks over time: a frame each, filled where it is outside, a thin line where there is no verdict.
fn lane(page: &mut Page, results: &[CheckResult]) {
    let from = results.iter().map(|r| r.extent.start_s).fold(f64::INFINITY, f64::min);
    let to = results.iter().map(|r| r.extent.end_s).fold(f64::NEG_INFINITY, f64::max);
    let width = WIDTH - 2.0 * MARGIN;
    let x = |seconds: f64| MARGIN + width * (seconds - from) / (to - from).max(1e-3);
    let (top, height) = LANE;
    page.bar((MARGIN, WIDTH - MARGIN), (top + height, 1.0), EDGE);
    for result in results {
        let ends = (x(result.extent.start_s), x(result.extent.end_s));
        match result.verdict {
            VerdictWord::Unmeasured => page.bar(ends, (top + height / 2.0 - 1.0, 2.0), EDGE),
            VerdictWord::Within | VerdictWord::Outside => {
                page.bar(ends, (top + height - 6.0, 6.0), WITHIN);
            }
        }
        for span in &result.spans {
            let ends = (x(span.extent.start_s), x(span.extent.end_s));
            page.bar(ends, (top, height), OUTSIDE);
        }
    }
    page.text((MARGIN, top + height + 15.0), 10.0, DIM, &clock(from));
    let end = clock(to);
    page.text((WIDTH - MARGIN - 6.0 * end.len() as f64, top + height + 15.0), 10.0, DIM, &end);
}

/// Left edges of what a line says.
const AT: [f64; 7] = [MARGIN, 122.0, 262.0, 320.0, 378.0, 446.0, 606.0];

fn columns(page: &mut Page) -> f64 {
    let names = ["verdict", "from, to", "worst ct", "mean ct", "drift ct/s", "against", "outside"];
    for (x, name) in AT.into_iter().zip(names) {
        page.text((x, LINES), 10.0, DIM, name);
    }
    page.bar((MARGIN, WIDTH - MARGIN), (LINES + 6.0, 1.0), EDGE);
    LINES + 6.0
}

fn line(page: &mut Page, top: f64, result: &CheckResult) -> f64 {
    let y = top + LINE - 5.0;
    let (shape, colour) = match result.verdict {
        VerdictWord::Within => ("\u{25cf}", WITHIN),
        VerdictWord::Outside => ("\u{25b2}", OUTSIDE),
        VerdictWord::Unmeasured => ("\u{25cb}", DIM),
    };
    let (start, end) = result.extent.ends();
    let against = format!("{} \u{b1} {} ct", result.reference, result.tolerance_cents);
    let cells = [
        (format!("{shape} {}", result.verdict.name()), colour),
        (format!("{start} \u{2013} {end}"), INK),
        (cents(result.worst_cents, 1), INK),
        (cents(result.mean_cents, 1), INK),
        (cents(result.drift_cents_per_s, 2), INK),
        (against, DIM),
        (spans(result), INK),
    ];
    for (x, (text, colour)) in AT.into_iter().zip(&cells) {
        page.text((x, y), 10.0, colour, text);
    }
    if !has_note(result) {
        return top + LINE;
    }
    let reason = result.reason.as_deref().unwrap_or_default();
    let gap = if reason.is_empty() || result.comment.is_empty() { "" } else { "; " };
    let note: String = format!("{reason}{gap}{}", result.comment).chars().take(COMMENT).collect();
    page.text((AT[1], y + LINE - 4.0), 10.0, DIM, &note);
    top + 2.0 * LINE
}

fn has_note(result: &CheckResult) -> bool {
    result.reason.is_some() || !result.comment.is_empty()
}

/// The first spans outside, and how many more there are.
fn spans(result: &CheckResult) -> String {
    let told: Vec<String> = result
        .spans
        .iter()
        .take(SPANS_MAX)
        .map(|span| format!("{} ({})", span.extent.ends().0, cents(Some(span.worst_cents), 1)))
        .collect();
    let more = result.spans.len() as u64 + result.spans_left_out - told.len() as u64;
    let rest = if more > 0 { format!(" +{more}") } else { String::new() };
    format!("{}{rest}", told.join(", "))
}

fn cents(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(|| "\u{2013}".to_owned(), |value| format!("{value:+.decimals$}"))
}

fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            // XML has no place for these.
            c if c.is_control() => out.push(' '),
            c => out.push(c),
        }
    }
    out
}
