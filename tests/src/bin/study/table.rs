//! Rows of the printed tables.

use plumbtone_tests::figures::{Errors, Tally};

/// Prints a heading.
pub(crate) fn heading(text: &str) {
    println!("\n{text}");
}

/// Prints a figure beside what is to be reached.
pub(crate) fn row(name: &str, reached: &str, target: &str) {
    println!("  {name:<44}{reached:>26}   to reach {target}");
}

/// Prints the worst of some errors.
pub(crate) fn worst_errors(errors: &Errors, count: usize) {
    for (error, case) in errors.worst(count) {
        println!("      {error:>12.4}  {case}");
    }
}

/// Prints the cases with most misses.
pub(crate) fn worst_misses(tally: &Tally, count: usize) {
    for (misses, case) in tally.worst(count) {
        println!("      {misses:>6} missed  {case}");
    }
}

/// Median and 95th percentile.
pub(crate) fn median_and_95th(errors: &Errors) -> String {
    format!("{:.4}, {:.4}", errors.median(), errors.percentile(95.0))
}

/// Hits of a total.
pub(crate) fn hits(tally: &Tally) -> String {
    format!("{:.2} % ({} of {})", tally.percent(), tally.hits, tally.total)
}

/// Misses of a total.
pub(crate) fn misses(tally: &Tally) -> String {
    let missed = tally.total - tally.hits;
    format!("{:.2} % ({missed} of {})", 100.0 - tally.percent(), tally.total)
}
