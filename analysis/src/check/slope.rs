//! The drift of a whole take: a straight line through block means of the pitch, by least squares.
//!
//! Readings that follow each other share samples and are no independent observations. Means over blocks longer than the
//! frames are; what correlation is left between neighbouring blocks inflates the deviation by sqrt((1 + r) / (1 - r)), r
//! being the residuals' correlation at lag 1 (an AR(1) process; G. Box & G. Jenkins, Time Series Analysis, 1970).

/// Length of the first blocks, and the least length of those that count, in seconds.
const FIRST_S: f64 = 0.05;
const LEAST_S: f64 = 0.4;
/// Blocks kept; when full, neighbours are joined.
const BLOCKS_MAX: usize = 256;
/// Blocks that the line is drawn through, at most and at least.
const LINE_BLOCKS: (usize, usize) = (64, 4);
/// Largest correlation that is corrected for.
const CORRELATION_MAX: f64 = 0.9;

/// Collects pitches over time.
#[derive(Debug)]
pub(super) struct Slope {
    blocks: Vec<Block>,
    length_s: f64,
    origin_s: Option<f64>,
}

/// Sums over a block of time.
#[derive(Debug, Clone, Copy, Default)]
struct Block {
    /// Which block of its length it is, from 0.
    number: f64,
    count: f64,
    time_s: f64,
    cents: f64,
}

impl Block {
    fn add(&mut self, other: &Self) {
        self.count += other.count;
        self.time_s += other.time_s;
        self.cents += other.cents;
    }
}

impl Slope {
    pub(super) fn new() -> Self {
        Self { blocks: Vec::with_capacity(BLOCKS_MAX), length_s: FIRST_S, origin_s: None }
    }

    /// Takes in the next pitch; times rise.
    pub(super) fn push(&mut self, time_s: f64, cents: f64) {
        let time_s = time_s - *self.origin_s.get_or_insert(time_s);
        let number = (time_s / self.length_s).floor();
        let one = Block { number, count: 1.0, time_s, cents };
        match self.blocks.last_mut() {
            Some(last) if last.number >= number => last.add(&one),
            _ => {
                if self.blocks.len() == BLOCKS_MAX {
                    join(&mut self.blocks);
                    self.length_s *= 2.0;
                    return self.push_joined(one);
                }
                self.blocks.push(one);
            }
        }
    }

    fn push_joined(&mut self, mut one: Block) {
        one.number = (one.time_s / self.length_s).floor();
        match self.blocks.last_mut() {
            Some(last) if last.number >= one.number => last.add(&one),
            _ => self.blocks.push(one),
        }
    }

    /// Slope in cents per second, and its deviation; `None` for too short a time.
    pub(super) fn line(&self) -> Option<(f64, f64)> {
        let mut blocks = self.blocks.clone();
        let mut length_s = self.length_s;
        while length_s < LEAST_S || blocks.len() > LINE_BLOCKS.0 {
            join(&mut blocks);
            length_s *= 2.0;
        }
        // A block that is hardly filled says little and would break the even spacing.
        let fullest = blocks.iter().map(|b| b.count).fold(0.0, f64::max);
        blocks.retain(|b| b.count > 0.3 * fullest);
        (blocks.len() >= LINE_BLOCKS.1).then(|| fit(&blocks))
    }
}

/// Joins blocks to twice the length.
fn join(blocks: &mut Vec<Block>) {
    let mut joined: usize = 0;
    for i in 0..blocks.len() {
        let mut block = blocks[i];
        block.number = (block.number / 2.0).floor();
        match joined.checked_sub(1).map(|last| &mut blocks[last]) {
            Some(last) if last.number >= block.number => last.add(&block),
            _ => {
                blocks[joined] = block;
                joined += 1;
            }
        }
    }
    blocks.truncate(joined);
}

/// Ordinary least squares, each block weighing by its count.
fn fit(blocks: &[Block]) -> (f64, f64) {
    let n = blocks.iter().map(|b| b.count).sum::<f64>();
    let mean_time = blocks.iter().map(|b| b.time_s).sum::<f64>() / n;
    let mean_cents = blocks.iter().map(|b| b.cents).sum::<f64>() / n;
    let at = |b: &Block| (b.time_s / b.count - mean_time, b.cents / b.count - mean_cents);
    let (mut xx, mut xy) = (0.0, 0.0);
    for block in blocks {
        let (x, y) = at(block);
        xx += block.count * x * x;
        xy += block.count * x * y;
    }
    let slope = xy / xx;
    let residuals: Vec<(f64, f64)> = blocks
        .iter()
        .map(|b| {
            let (x, y) = at(b);
            (b.count, y - slope * x)
        })
        .collect();
    // HC3 (J. MacKinnon & H. White, Journal of Econometrics 29, 1985): residuals need not be alike everywhere, and those at
    // the ends, which draw the line to themselves, count for what they would be without that.
    let spread: f64 = blocks
        .iter()
        .zip(&residuals)
        .map(|(block, &(w, r))| {
            let (x, _) = at(block);
            let leverage = w / n + w * x * x / xx;
            (w * x * r / (1.0 - leverage)).powi(2)
        })
        .sum();
    let square: f64 = residuals.iter().map(|(w, r)| w * r * r).sum();
    let neighbours: f64 =
        residuals.windows(2).map(|p| (p[0].0 * p[1].0).sqrt() * p[0].1 * p[1].1).sum();
    let correlation = (neighbours / square).clamp(0.0, CORRELATION_MAX);
    let inflation =
        if correlation.is_nan() { 1.0 } else { (1.0 + correlation) / (1.0 - correlation) };
    (slope, (spread * inflation).sqrt() / xx)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(pitches: impl IntoIterator<Item = (f64, f64)>) -> Slope {
        let mut slope = Slope::new();
        pitches.into_iter().for_each(|(time_s, cents)| slope.push(time_s, cents));
        slope
    }

    #[test]
    fn a_straight_line_has_its_slope_however_long() {
        for seconds in [2_u32, 60, 36_000] {
            let line =
                (0..seconds * 20).map(|i| f64::from(i) * 0.05).map(|t| (100.0 + t, 3.0 - 0.25 * t));
            let slope = of(line);
            assert!(slope.blocks.len() <= BLOCKS_MAX, "{} blocks", slope.blocks.len());
            let (cents_per_s, sd) = slope.line().unwrap();
            assert!(
                (cents_per_s + 0.25).abs() < 1e-9 && sd < 1e-6,
                "{seconds} s: {cents_per_s} {sd}"
            );
        }
    }

    #[test]
    fn the_published_example_has_its_slope() {
        // Ten points, one block each; slope by any least squares.
        let blocks: Vec<Block> = [0.0, 0.1, 0.3, 0.2, 0.5, 0.4, 0.7, 0.6, 0.9, 0.8]
            .into_iter()
            .enumerate()
            .map(|(i, y)| Block { number: i as f64, count: 1.0, time_s: 0.1 * i as f64, cents: y })
            .collect();
        let (slope, _) = fit(&blocks);
        assert!((slope - 0.951515).abs() < 1e-6, "{slope}");
    }

    #[test]
    fn the_deviation_is_that_of_many_trials_however_correlated_the_readings() {
        let mut state: u64 = 1;
        let mut uniform = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            (state >> 33) as f64 / (1_u64 << 31) as f64 - 0.5
        };
        for smooth in [1_usize, 5, 15] {
            let trials = 200;
            let mut square = 0.0;
            for _ in 0..trials {
                let noise: Vec<f64> = (0..600 + smooth).map(|_| uniform()).collect();
                let smoothed = noise.windows(smooth).map(|w| w.iter().sum::<f64>());
                let slope = of(smoothed.take(600).enumerate().map(|(i, y)| (0.01 * i as f64, y)));
                let (cents_per_s, sd) = slope.line().unwrap();
                square += (cents_per_s / sd).powi(2) / f64::from(trials);
            }
            let rms = square.sqrt();
            assert!((0.7..1.5).contains(&rms), "means of {smooth}: error over deviation {rms}");
        }
    }

    #[test]
    fn too_short_a_time_has_no_slope() {
        assert_eq!(of((0..100).map(|i| (f64::from(i) * 0.01, 0.0))).line(), None, "1 s");
    }
}
