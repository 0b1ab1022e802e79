//! The section on recorded instruments.

use std::collections::BTreeSet;
use std::error::Error;

use crate::table::heading;
use plumbtone_tests::recorded::{FamilyScore, Score, bank_path, recordings, score};

/// Prints the figures per family and in total, and up to `worst` of the worst recordings.
pub(crate) fn print(worst: usize) -> Result<(), Box<dyn Error>> {
    heading("Recorded instruments");
    let Some(recordings) = recordings()? else {
        println!("  skipped: no sound bank at {}", bank_path().display());
        return Ok(());
    };
    let scores = score(&recordings)?;
    let (disputed, judged): (Vec<&Score>, Vec<&Score>) = scores.iter().partition(|s| s.disputed);
    println!(
        "  {:<24}{:>10}{:>9}{:>9}{:>12}{:>10}{:>10}",
        "family", "recordings", "misread", "frames", "off > 50 ct", "no answer", "claimed"
    );
    let families: BTreeSet<_> = judged.iter().map(|score| score.family).collect();
    for family in families {
        line(family.name(), &judged, |score| score.family == family);
    }
    line("in total", &judged, |_| true);
    println!(
        "  {:<24}{:>10}{:>9}{:>9}{:>12}{:>10}{:>10}",
        "to reach", "", 0, "", "0.50 %", "1.00 %", "0.10 %"
    );
    line("(disputed, not counted)", &disputed, |_| true);
    print_worst(&judged, worst);
    println!("  disputed:");
    print_each(&disputed);
    Ok(())
}

fn line(name: &str, scores: &[&Score], of: impl Fn(&Score) -> bool) {
    let sum = FamilyScore::of(scores.iter().copied().filter(|score| of(score)));
    println!(
        "  {name:<24}{:>10}{:>9}{:>9}{:>10.2} %{:>8.2} %{:>8.2} %",
        sum.recordings,
        sum.misread,
        sum.frames,
        sum.percent(sum.wrong),
        sum.percent(sum.unanswered),
        sum.percent(sum.claimed),
    );
}

fn print_worst(scores: &[&Score], count: usize) {
    let mut bad: Vec<&Score> = scores
        .iter()
        .copied()
        .filter(|score| score.misread() || score.wrong + score.unanswered > 0)
        .collect();
    bad.sort_by_key(|score| std::cmp::Reverse(score.wrong + score.unanswered));
    println!("  worst of {} recordings that are not perfect:", bad.len());
    bad.truncate(count);
    print_each(&bad);
}

fn print_each(scores: &[&Score]) {
    for score in scores {
        let cents = |value: Option<f64>| {
            value.map_or_else(|| "none".to_owned(), |cents| format!("{cents:+.0} ct"))
        };
        println!(
            "    {:<22}{:<21}{:>8.1} Hz: of {:>3} frames {:>3} wrong ({} claimed), {:>3} unanswered; usual error {}, note {}",
            score.name,
            score.family.name(),
            score.f0_hz,
            score.frames,
            score.wrong,
            score.claimed,
            score.unanswered,
            score.usual_error_cents.map_or_else(|| "none".to_owned(), |e| format!("{e:+} ct")),
            cents(score.note_cents),
        );
    }
}
