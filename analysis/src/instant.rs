//! The evidence of one instant: its spectra, its peaks, its periodicity, its candidates.

use realfft::RealFftPlanner;

use crate::convert::{floor_index, nearest, nearest_index};
use crate::fundamental::lag::{Autocorrelation, Periodicity};
use crate::fundamental::{Candidate, Search, View};
use crate::history::History;
use crate::peaks::{self, NoiseFloor, PEAKS_MAX, Peak};
use crate::reading::Stray;
use crate::refine::Refiner;
use crate::settings::Settings;
use crate::spectrum::{Frame, Transform, TransformRuns};
use crate::strays;

/// Shortest frame, in seconds, before rounding to a power of two; each further one is twice as long.
const SHORTEST_S: f64 = 1024.0 / 48_000.0;
/// Frame lengths.
pub(crate) const LENGTHS: usize = 4;
const LONGEST: usize = LENGTHS - 1;
/// Periods that the frame in which partials are refined should hold.
const REFINE_PERIODS: f64 = 4.5;
/// Highest peak, in Hz, looked at in the middle frames.
const SEARCH_PEAKS_HZ: f64 = 6_000.0;
/// Lowest peak looked at, in Hz.
const LOWEST_PEAK_HZ: f64 = 15.0;
/// Least sample rate at which the periodicity of the shorter and of the longest frame is taken, in Hz.
const LAG_RATES_HZ: [f64; 2] = [22_000.0, 11_000.0];
/// Partials of a second voice: less are the overtones of a bar, a bell or a skin.
const VOICE_PARTIALS: usize = 3;
/// Bins between partials from which the power of a frame does not follow the single period.
const CALM_BINS: f64 = 3.2;
/// Share of the peaks that the pitch explains, above which no second voice is searched.
const ONE_VOICE: f64 = 0.8;

/// Frames of every length around one centre, and their peaks.
#[derive(Debug)]
struct Frames {
    sample_rate_hz: f64,
    frames: Vec<Frame>,
    peaks: Vec<Vec<Peak>>,
    /// Where each frame was last centred.
    centres: [u64; LENGTHS],
}

impl Frames {
    fn new(sample_rate_hz: f64, transforms: &[Transform]) -> Self {
        Self {
            sample_rate_hz,
            frames: transforms.iter().map(Transform::make_frame).collect(),
            peaks: transforms.iter().map(|_| Vec::with_capacity(PEAKS_MAX)).collect(),
            centres: [u64::MAX; LENGTHS],
        }
    }

    fn transform(&mut self, transform: &mut Transform, i: usize, history: &History, centre: u64) {
        transform.run(history, centre, &mut self.frames[i]);
        self.centres[i] = centre;
    }

    fn pick(&mut self, i: usize, noise: &NoiseFloor) {
        let top = if i == 0 || i == LONGEST { f64::MAX } else { SEARCH_PEAKS_HZ };
        let range_hz = (LOWEST_PEAK_HZ, top.min(self.sample_rate_hz / 2.0));
        peaks::pick(&self.frames[i], self.bin_hz(i), noise, range_hz, &mut self.peaks[i]);
        peaks::weigh(&mut self.peaks[i]);
    }

    fn view<'a>(&'a self, periodicity: Option<&'a Periodicity>) -> View<'a> {
        View {
            peaks: [0, 1, 2, 3].map(|i| self.peaks[i].as_slice()),
            frame_s: [0, 1, 2, 3].map(|i| 1.0 / self.bin_hz(i)),
            periodicity,
        }
    }

    /// The frame in which partials of a fundamental are refined.
    fn suited(&self, f0: f64) -> usize {
        (0..LONGEST).find(|&i| f0 >= REFINE_PERIODS * self.bin_hz(i)).unwrap_or(LONGEST)
    }

    fn bin_hz(&self, i: usize) -> f64 {
        self.sample_rate_hz / (2 * (self.frames[i].power.len() - 1)) as f64
    }
}

/// Front end of the engine: everything computed from the samples around one centre. Owns its scratch.
#[derive(Debug)]
pub(crate) struct Evidence {
    transforms: Vec<Transform>,
    now: Frames,
    newest: Frames,
    noise: NoiseFloor,
    periodicity: Periodicity,
    search: Search,
    rest: Vec<Peak>,
    second: Vec<Candidate>,
    centre: u64,
    /// Instants since the beginning.
    count: usize,
}

impl Evidence {
    /// Plans everything for validated settings.
    pub(crate) fn new(settings: &Settings) -> Self {
        let rate = settings.sample_rate_hz;
        let mut planner = RealFftPlanner::new();
        let shortest = 1usize << nearest_index((SHORTEST_S * rate).log2());
        let transforms: Vec<_> =
            (0..LENGTHS).map(|i| Transform::new(shortest << i, &mut planner)).collect();
        let narrower = LAG_RATES_HZ.map(|least| 1 << floor_index((rate / least).log2()));
        let short = Autocorrelation::new(shortest << 2, narrower[0], rate, &mut planner);
        let long = Autocorrelation::new(shortest << 3, narrower[1], rate, &mut planner);
        Self {
            now: Frames::new(rate, &transforms),
            newest: Frames::new(rate, &transforms),
            transforms,
            noise: NoiseFloor::new(shortest << 3),
            periodicity: Periodicity::new(short, long, settings.highest_hz),
            search: Search::new((settings.lowest_hz, settings.highest_hz)),
            rest: Vec::with_capacity(PEAKS_MAX),
            second: Vec::with_capacity(crate::fundamental::CANDIDATES + 1),
            centre: 0,
            count: 0,
        }
    }

    /// How often each transform has run.
    pub(crate) fn transforms(&self) -> impl Iterator<Item = TransformRuns> {
        let lags = [&self.periodicity.short, &self.periodicity.long];
        self.transforms.iter().map(|t| t.runs).chain(lags.map(|l| l.runs))
    }

    /// Samples needed on either side of a centre.
    pub(crate) fn reach(&self) -> usize {
        self.transforms[LONGEST].len() / 2
    }

    /// Begins anew: the next instant computes everything.
    pub(crate) fn restart(&mut self) {
        self.count = 0;
    }

    /// Analyses the instant around a centre. Of the two longest frames, which change least from instant to instant, one is
    /// renewed at a time.
    pub(crate) fn run(&mut self, history: &History, centre: u64, out: &mut Vec<Candidate>) {
        self.centre = centre;
        let first = self.count == 0;
        let renewed = [true, true, first || self.count % 2 == 1, self.count.is_multiple_of(2)];
        self.count += 1;
        for (i, _) in renewed.iter().enumerate().filter(|r| *r.1) {
            self.transform(i, history);
        }
        if renewed[LONGEST] {
            self.noise.estimate(&self.now.frames[LONGEST]);
            self.periodicity.long.run(&self.now.frames[LONGEST]);
        }
        if renewed[2] {
            self.periodicity.short.run(&self.now.frames[2]);
        }
        self.periodicity.update();
        for (i, _) in renewed.iter().enumerate().filter(|r| *r.1) {
            self.now.pick(i, &self.noise);
        }
        self.search.run(&self.now.view(Some(&self.periodicity)), out);
    }

    /// Transforms frame `i` around the centre; near the ends of the stream around the nearest centre that fills it.
    fn transform(&mut self, i: usize, history: &History) {
        let half = self.transforms[i].len() as u64 / 2;
        let inner = (history.start() + half, history.end().saturating_sub(half));
        let centre =
            if inner.0 <= inner.1 { self.centre.clamp(inner.0, inner.1) } else { self.centre };
        self.now.transform(&mut self.transforms[i], i, history, centre);
    }

    /// Whether a second voice explains what a pitch leaves of the instant's peaks: its share of them, 0 when there is none.
    pub(crate) fn second_voice(&mut self, first: &Candidate) -> f64 {
        if first.explained > ONE_VOICE {
            return 0.0;
        }
        let peaks = &self.now.peaks[2];
        let total: f64 = peaks.iter().map(|p| p.weight).sum();
        self.rest.clear();
        self.rest.extend(peaks.iter().filter(|p| !on_comb(p, first)));
        let view = View {
            peaks: [&[], &self.rest, &self.rest, &self.rest],
            frame_s: [0, 2, 2, 2].map(|i| 1.0 / self.now.bin_hz(i)),
            periodicity: None,
        };
        self.search.run(&view, &mut self.second);
        let rest: f64 = self.rest.iter().map(|p| p.weight).sum();
        let second = self.second.first().filter(|c| c.partials >= VOICE_PARTIALS);
        second.map_or(0.0, |c| c.score * rest / total.max(f64::MIN_POSITIVE))
    }

    /// Lists the strays of an instant whose pitch is known.
    pub(crate) fn strays(&self, model: (f64, f64), out: &mut Vec<Stray>) {
        let bin_hz = self.now.bin_hz(LONGEST);
        let peaks = &self.now.peaks[LONGEST];
        strays::peaks::list(peaks, model, bin_hz, self.now.sample_rate_hz, out);
    }

    /// Level in the shortest frame in which a fundamental does not ripple: what an onset is told by.
    pub(crate) fn calm_level_dbfs(&self, f0: f64) -> f64 {
        let calm = |i: &usize| f0 > CALM_BINS * self.now.bin_hz(*i);
        level_dbfs(self.now.frames[(1..LONGEST).find(calm).unwrap_or(LONGEST)].total())
    }

    /// Root mean square around the centre as a level in dBFS, the constant left out.
    pub(crate) fn level_dbfs(&self) -> f64 {
        level_dbfs(self.now.frames[1].total())
    }

    /// Level of the noise between the partials, over the whole band, in dBFS.
    pub(crate) fn noise_dbfs(&self) -> f64 {
        level_dbfs(self.noise.total())
    }

    /// Refines the partials of a fundamental in the frame that suits it; says how long that frame is, in seconds.
    pub(crate) fn refine(
        &mut self,
        history: &History,
        centre: u64,
        model: (f64, f64),
        partials: usize,
        refiner: &mut Refiner,
    ) -> f64 {
        let i = self.now.suited(model.0);
        self.centre = centre;
        if self.now.centres[i].abs_diff(centre) > 0 {
            self.transform(i, history);
        }
        refiner.run(&self.now.frames[i], self.now.bin_hz(i), model, partials, &self.noise);
        1.0 / self.now.bin_hz(i)
    }

    /// Looks at the newest samples, without waiting for what follows: the best candidate and the level. Frames end with the
    /// stream, so short ones look at a later moment than long ones.
    pub(crate) fn newest(&mut self, history: &History, out: &mut Vec<Candidate>) -> f64 {
        for (i, transform) in self.transforms.iter_mut().enumerate() {
            let half = transform.len() as u64 / 2;
            let centre = history.end().saturating_sub(half);
            self.newest.transform(transform, i, history, centre);
            self.newest.pick(i, &self.noise);
        }
        self.search.run(&self.newest.view(None), out);
        level_dbfs(self.newest.frames[0].total())
    }

    /// Refines the partials of a candidate of the newest samples; says where they were measured.
    pub(crate) fn refine_newest(
        &self,
        model: (f64, f64),
        partials: usize,
        refiner: &mut Refiner,
    ) -> u64 {
        let i = self.newest.suited(model.0);
        let bin_hz = self.newest.bin_hz(i);
        refiner.run(&self.newest.frames[i], bin_hz, model, partials, &self.noise);
        self.newest.centres[i]
    }

    /// Samples between two instants: 10 ms or a little less.
    pub(crate) fn hop(settings: &Settings) -> usize {
        floor_index(settings.sample_rate_hz / 100.0 + 1e-6)
    }
}

/// Whether a peak lies on the comb of a candidate.
fn on_comb(peak: &Peak, candidate: &Candidate) -> bool {
    let n = nearest(peak.hz / candidate.hz).max(1.0);
    let expected = crate::stiff::partial_hz(candidate.hz, candidate.b, n);
    (peak.hz - expected).abs() < (0.02 * expected).min(0.14 * candidate.hz)
}

/// Level of the power in the bins of a Hann frame: a sine of amplitude A puts 1.5 A^2 into them.
fn level_dbfs(power: f32) -> f64 {
    10.0 * (f64::from(power) / 1.5).log10()
}
