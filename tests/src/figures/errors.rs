//! Collected errors and counts, each with the case it came from.

use std::sync::Arc;

/// Sizes of errors with the cases they came from.
#[derive(Debug, Clone, Default)]
pub struct Errors(Vec<(f64, Arc<str>)>);

impl Errors {
    /// Adds an error; only its size counts.
    pub fn push(&mut self, error: f64, case: &Arc<str>) {
        self.0.push((error.abs(), Arc::clone(case)));
    }

    /// Adds all of another collection.
    pub fn append(&mut self, mut other: Self) {
        self.0.append(&mut other.0);
    }

    /// How many there are.
    #[must_use]
    pub fn len(&self) -> usize {
        self.0.len()
    }

    /// Whether there are none.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    /// Root mean square; NaN for none.
    #[must_use]
    pub fn rms(&self) -> f64 {
        (self.0.iter().map(|(e, _)| e * e).sum::<f64>() / self.0.len() as f64).sqrt()
    }

    /// Median; NaN for none.
    #[must_use]
    pub fn median(&self) -> f64 {
        self.percentile(50.0)
    }

    /// The error that `percent` of all do not exceed; NaN for none.
    #[must_use]
    pub fn percentile(&self, percent: f64) -> f64 {
        let mut sizes: Vec<f64> = self.0.iter().map(|&(e, _)| e).collect();
        sizes.sort_by(f64::total_cmp);
        let last = sizes.len().saturating_sub(1);
        let rank = crate::cast::index(percent / 100.0 * last as f64);
        sizes.get(rank).copied().unwrap_or(f64::NAN)
    }

    /// Share of the errors above a size.
    #[must_use]
    pub fn share_above(&self, size: f64) -> f64 {
        self.0.iter().filter(|(e, _)| *e > size).count() as f64 / self.0.len() as f64
    }

    /// The largest errors with their cases, largest first, one per case: what follows a semicolon in a case's name only says
    /// where in it the error is.
    #[must_use]
    pub fn worst(&self, count: usize) -> Vec<(f64, &str)> {
        let mut sorted: Vec<(f64, &str)> = self.0.iter().map(|(e, case)| (*e, &**case)).collect();
        sorted.sort_by(|a, b| b.0.total_cmp(&a.0));
        let mut worst: Vec<(f64, &str)> = Vec::new();
        for (error, case) in sorted {
            if worst.len() < count && worst.iter().all(|&(_, seen)| whole(seen) != whole(case)) {
                worst.push((error, case));
            }
        }
        worst
    }
}

fn whole(case: &str) -> &str {
    case.split(';').next().unwrap_or(case)
}

/// How many of what was due came, and the cases where something did not.
#[derive(Debug, Clone, Default)]
pub struct Tally {
    /// Number that counted.
    pub hits: usize,
    /// Number due.
    pub total: usize,
    /// Cases with a miss, once per miss.
    pub misses: Vec<Arc<str>>,
}

impl Tally {
    /// Counts one.
    pub fn push(&mut self, hit: bool, case: &Arc<str>) {
        self.total += 1;
        if hit {
            self.hits += 1;
        } else {
            self.misses.push(Arc::clone(case));
        }
    }

    /// Adds another tally.
    pub fn append(&mut self, mut other: Self) {
        self.hits += other.hits;
        self.total += other.total;
        self.misses.append(&mut other.misses);
    }

    /// Share of hits in percent; NaN when nothing was due.
    #[must_use]
    pub fn percent(&self) -> f64 {
        100.0 * self.hits as f64 / self.total as f64
    }

    /// The cases with most misses, and how many.
    #[must_use]
    pub fn worst(&self, count: usize) -> Vec<(usize, &str)> {
        let mut cases: std::collections::BTreeMap<&str, usize> = std::collections::BTreeMap::new();
        for case in &self.misses {
            *cases.entry(whole(case)).or_default() += 1;
        }
        let mut worst: Vec<(usize, &str)> = cases.into_iter().map(|(c, n)| (n, c)).collect();
        worst.sort_by_key(|&(misses, _)| std::cmp::Reverse(misses));
        worst.truncate(count);
        worst
    }
}
