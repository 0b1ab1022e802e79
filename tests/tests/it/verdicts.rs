//! Figures held against what is to be reached, all of them before the test fails.

use plumbtone_tests::figures::{Errors, Tally};

/// Worst cases told of a figure that was not reached.
const WORST: usize = 4;

/// What was not reached so far.
#[derive(Default)]
pub(crate) struct Verdicts(String);

impl Verdicts {
    /// A figure must not exceed `most`; `errors` are what it was computed from.
    pub(crate) fn at_most(&mut self, name: &str, reached: f64, most: f64, errors: &Errors) {
        self.within(name, reached, (f64::NEG_INFINITY, most), errors);
    }

    /// A figure must lie between two bounds.
    pub(crate) fn within(
        &mut self,
        name: &str,
        reached: f64,
        (least, most): (f64, f64),
        errors: &Errors,
    ) {
        if !(reached >= least && reached <= most) {
            self.add(name, &format!("{reached:.4}, to reach {least} to {most}"));
            for (error, case) in errors.worst(WORST) {
                self.add("", &format!("{error:.4} in {case}"));
            }
        }
    }

    /// At least this many percent of what was due must have come.
    pub(crate) fn at_least_percent(&mut self, name: &str, tally: &Tally, least: f64) {
        if !(tally.percent() >= least) {
            let (hits, total) = (tally.hits, tally.total);
            let reached = tally.percent();
            self.add(name, &format!("{reached:.3} % ({hits} of {total}), to reach {least} %"));
            for (misses, case) in tally.worst(WORST) {
                self.add("", &format!("{misses} missed in {case}"));
            }
        }
    }

    /// Fails when anything was not reached.
    pub(crate) fn assert_all_reached(self) {
        assert!(self.0.is_empty(), "not reached:\n{}", self.0);
    }

    fn add(&mut self, name: &str, text: &str) {
        let indent = if name.is_empty() { "    " } else { "" };
        let colon = if name.is_empty() { "" } else { ": " };
        self.0 += &format!("  {indent}{name}{colon}{text}\n");
    }
}
