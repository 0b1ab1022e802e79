//! The evidence of one instant: its spectra, its peaks, its periodicity, its candidates.

use realfft::RealFftPlanner;

use crate::convert::{floor_index, nearest_index};
use crate::fundamental::lag::{Autocorrelation, Periodicity};
use crate::fundamental::{Candidate, Search, View};
use crate::history::History;
use crate::peaks::{self, NoiseFloor, Peak};
use crate::refine::Refiner;
use crate::settings::Settings;
use crate::spectrum::{Frame, Transform};

/// Shortest frame, in seconds, before rounding to a power of two; each further one is twice as long.
const SHORTEST_S: f64 = 1024.0 / 48_000.0;
/// Frame lengths.
pub(crate) const LENGTHS: usize = 4;
/// Periods that the frame in which partials are refined should hold.
const REFINE_PERIODS: f64 = 5.5;
/// Highest peak, in Hz, that the search for the fundamental looks at in the longer frames.
const SEARCH_PEAKS_HZ: f64 = 6_000.0;
/// Most peaks kept of one frame.
const PEAKS_MAX: usize = 200;

/// Front end of the engine: everything computed from the samples around one centre. Owns its scratch.
#[derive(Debug)]
pub(crate) struct Evidence {
    sample_rate_hz: f64,
    transforms: Vec<Transform>,
    frames: Vec<Frame>,
    peaks: Vec<Vec<Peak>>,
    noise: NoiseFloor,
    periodicity: Periodicity,
    search: Search,
    parity: bool,
}

impl Evidence {
    /// Plans everything for validated settings.
    pub(crate) fn new(settings: &Settings) -> Self {
        let rate = settings.sample_rate_hz;
        let mut planner = RealFftPlanner::new();
        let shortest = 1usize << nearest_index((SHORTEST_S * rate).log2());
        let transforms: Vec<_> =
            (0..LENGTHS).map(|i| Transform::new(shortest << i, &mut planner)).collect();
        let frames = transforms.iter().map(Transform::make_frame).collect();
        let short = Autocorrelation::new(shortest << 2, rate, &mut planner);
        let long = Autocorrelation::new(shortest << 3, rate, &mut planner);
        Self {
            sample_rate_hz: rate,
            frames,
            transforms,
            peaks: (0..LENGTHS).map(|_| Vec::with_capacity(PEAKS_MAX)).collect(),
            noise: NoiseFloor::new(shortest << 3),
            periodicity: Periodicity::new(short, long, settings.highest_hz),
            search: Search::new((settings.lowest_hz, settings.highest_hz)),
            parity: false,
        }
    }

    /// Samples needed on either side of a centre.
    pub(crate) fn reach(&self) -> usize {
        self.transforms[LENGTHS - 1].len() / 2
    }

    /// Begins anew: the next instant computes everything.
    pub(crate) fn restart(&mut self) {
        self.parity = false;
    }

    /// Analyses the instant around a centre. The longest frame is renewed at every other instant only.
    pub(crate) fn run(&mut self, history: &History, centre: u64, out: &mut Vec<Candidate>) {
        let renew = !self.parity;
        self.parity = renew;
        for (i, (transform, frame)) in self.transforms.iter_mut().zip(&mut self.frames).enumerate()
        {
            if i < LENGTHS - 1 || renew {
                transform.run(history, centre, frame);
            }
        }
        if renew {
            self.noise.estimate(&self.frames[LENGTHS - 1]);
            self.periodicity.long.run(&self.frames[LENGTHS - 1]);
        }
        self.periodicity.short.run(&self.frames[2]);
        self.periodicity.update();
        for i in 0..LENGTHS {
            if i == LENGTHS - 1 && !renew {
                continue;
            }
            let top = if i == 0 { f64::MAX } else { SEARCH_PEAKS_HZ };
            let top = top.min(self.sample_rate_hz / 2.0);
            peaks::pick(
                &self.frames[i],
                self.bin_hz(i),
                &self.noise,
                (15.0, top),
                &mut self.peaks[i],
            );
        }
        let view = View {
            peaks: [&self.peaks[0], &self.peaks[1], &self.peaks[2], &self.peaks[3]],
            frame_s: [0, 1, 2, 3].map(|i| 1.0 / self.bin_hz(i)),
            periodicity: &self.periodicity,
        };
        self.search.run(&view, out);
    }

    /// Root mean square around the centre as a level in dBFS, the constant left out.
    pub(crate) fn level_dbfs(&self) -> f64 {
        // A sine of amplitude A puts 1.5 A^2 into the bins of a Hann frame.
        let sum: f32 = self.frames[1].power[2..].iter().sum();
        10.0 * (f64::from(sum) / 1.5).log10()
    }

    /// Refines the partials of a fundamental in the frame that suits it; says which frame that was, in seconds.
    pub(crate) fn refine(&self, model: (f64, f64), partials: usize, refiner: &mut Refiner) -> f64 {
        let i = self.frame_for(model.0);
        refiner.run(&self.frames[i], self.bin_hz(i), model, partials, &self.noise);
        1.0 / self.bin_hz(i)
    }

    /// Renews, around a centre, the frame that suits a fundamental, for a decision that came out otherwise than expected.
    pub(crate) fn revisit(&mut self, history: &History, centre: u64, f0: f64) {
        let i = self.frame_for(f0);
        self.transforms[i].run(history, centre, &mut self.frames[i]);
    }

    /// The frame in which partials of a fundamental are refined.
    fn frame_for(&self, f0: f64) -> usize {
        (0..LENGTHS - 1)
            .find(|&i| f0 * self.transforms[i].len() as f64 >= REFINE_PERIODS * self.sample_rate_hz)
            .unwrap_or(LENGTHS - 1)
    }

    fn bin_hz(&self, i: usize) -> f64 {
        self.sample_rate_hz / self.transforms[i].len() as f64
    }

    /// Samples between two instants: 10 ms or a little less.
    pub(crate) fn hop(settings: &Settings) -> usize {
        floor_index(settings.sample_rate_hz / 100.0 + 1e-6)
    }
}
