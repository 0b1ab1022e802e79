//! What an instant is said to be once its neighbours are known: pitch, deviation, confidence, state.

use crate::fundamental::Candidate;
use crate::reading::{State, Stray};
use crate::refine::Tone;
use crate::stiff::CENTS_PER_NEPER;
use crate::strays::peaks::STRAYS_MAX;

/// Instants on either side that an instant is settled with.
pub(crate) const NEIGHBOURS: usize = 5;
/// Second central moment of the kernel by which a Hann frame averages the frequency, in squared frames: a sixth of the
/// ratio of the window's fourth and second moments, over the frame's square.
const KERNEL_MOMENT: f64 = 0.01310;
/// Share of the sharpest bend near by that may be left in the pitch.
const LEFT_OF_BEND: f64 = 0.2;
/// Curvature of the pitch, in its own deviations, that is worth correcting.
const CURVED: f64 = 2.0;
/// Largest step between instants over which the pitch counts as continuous, in cents.
const CONTINUOUS_CENTS: f64 = 60.0;
/// Range of the pitch among the neighbours that makes it glide: cents, and deviations.
const GLIDES_CENTS: f64 = 15.0;
const GLIDES_SD: f64 = 6.0;
/// Score at which a pitch is as likely right as not, and the width of the step.
const EVEN_SCORE: f64 = 0.5;
const SCORE_WIDTH: f64 = 0.075;
/// Advantage over the best other candidate that leaves no doubt, in cost.
const CLEAR_COST: f64 = 0.25;
/// Net way of the pitch among the neighbours, in cents, beyond which it is a sweep rather than a tone.
const SWEEP_CENTS: f64 = 60.0;
/// Partials up to which a sound that fades or wavers may be a drum's mode or a narrow band of noise; and how far it may
/// fade, in dB, and waver, in cents, among the neighbours before it is taken for one.
const FEW_PARTIALS: usize = 5;
const FADES_DB: f64 = 4.0;
const WAVERS_CENTS: f64 = 12.0;
/// Confidence of what does not hold still.
const RESTLESS: f64 = 0.75;
/// Share of the peaks that a second voice must explain, and the instants that must say so.
const SECOND_SHARE: f64 = 0.2;
const SECOND_INSTANTS: usize = 4;

/// What is known of one instant.
#[derive(Debug)]
pub(crate) struct Instant {
    /// Sample position.
    pub(crate) centre: u64,
    /// Level in dBFS.
    pub(crate) level_dbfs: f64,
    /// Level in a frame that the fundamental does not ripple, in dBFS.
    pub(crate) calm_dbfs: f64,
    /// Level of the noise between the partials, in dBFS.
    pub(crate) noise_dbfs: f64,
    /// Fundamental and inharmonicity that the tones were refined for.
    pub(crate) model: (f64, f64),
    /// Length of the frame they were refined in.
    pub(crate) frame_s: f64,
    /// Partials.
    pub(crate) tones: Vec<Tone>,
    /// Strays.
    pub(crate) strays: Vec<Stray>,
    /// The candidate decided for, and by how much it beat the others.
    pub(crate) decided: Option<Candidate>,
    /// Cost by which it beat the next.
    pub(crate) advantage: f64,
    /// Fundamental as fitted, its deviation, and the inharmonicity with its own.
    pub(crate) f0: f64,
    /// Deviation of the fundamental in cents.
    pub(crate) f0_sd_cents: f64,
    /// Inharmonicity and its deviation.
    pub(crate) b: Option<(f64, f64)>,
    /// Share of the peaks that a second voice explains.
    pub(crate) second: f64,
}

impl Instant {
    /// An instant with room for so many partials.
    pub(crate) fn new(partials: usize) -> Self {
        Self {
            centre: 0,
            level_dbfs: f64::NEG_INFINITY,
            calm_dbfs: f64::NEG_INFINITY,
            noise_dbfs: f64::NEG_INFINITY,
            model: (0.0, 0.0),
            frame_s: 0.0,
            tones: Vec::with_capacity(partials),
            strays: Vec::with_capacity(STRAYS_MAX),
            decided: None,
            advantage: 0.0,
            f0: 0.0,
            f0_sd_cents: 0.0,
            b: None,
            second: 0.0,
        }
    }
}

/// What an instant is settled to be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Settled {
    /// State.
    pub(crate) state: State,
    /// Fundamental, its deviation in cents, confidence.
    pub(crate) pitch: Option<(f64, f64, f64)>,
}

/// Settles the instant that `around` puts in the middle: `around(0)`, with neighbours from `-NEIGHBOURS` to `NEIGHBOURS`
/// where there are any.
pub(crate) fn settle<'a>(
    around: impl Fn(isize) -> Option<&'a Instant>,
    hop_s: f64,
    silence_dbfs: f64,
) -> Settled {
    let reach = isize::try_from(NEIGHBOURS).unwrap_or(0);
    let Some(here) = around(0) else { return Settled { state: State::Silent, pitch: None } };
    let without = |state| Settled { state, pitch: None };
    if !(here.level_dbfs > silence_dbfs) {
        return without(State::Silent);
    }
    let voices = (-reach..=reach).filter_map(&around).filter(|i| i.second > SECOND_SHARE).count();
    if here.second > SECOND_SHARE && voices >= SECOND_INSTANTS {
        return without(State::Several);
    }
    let Some(chosen) = here.decided else { return without(State::Unpitched) };
    let run = Run::new(&around, here, reach);
    let (log_f0, sd_cents) = uncurve(&run, here, hop_s);
    let span = run.high - run.low;
    let gliding = CENTS_PER_NEPER * span > GLIDES_CENTS.max(GLIDES_SD * here.f0_sd_cents);
    let state = if gliding { State::Gliding } else { State::Steady };
    let level = |k| around(k).map_or(here.level_dbfs, |i| i.level_dbfs);
    let fades = level(-reach) - level(reach) > FADES_DB;
    let wavers = CENTS_PER_NEPER * span > WAVERS_CENTS;
    let restless = here.tones.len() <= FEW_PARTIALS && (fades || wavers);
    let confidence = confidence(&chosen, here.advantage, &run);
    let confidence = if restless { confidence.min(RESTLESS) } else { confidence };
    Settled { state, pitch: Some((log_f0.exp(), sd_cents, confidence)) }
}

/// The neighbours over which the pitch is continuous.
struct Run {
    /// `ln f0`, where continuous; the instant itself in the middle.
    logs: [Option<f64>; 2 * NEIGHBOURS + 1],
    low: f64,
    high: f64,
    /// From the first to the last.
    net: f64,
    length: usize,
}

impl Run {
    fn new<'a>(
        around: &impl Fn(isize) -> Option<&'a Instant>,
        here: &Instant,
        reach: isize,
    ) -> Self {
        let own = here.f0.ln();
        let mut run =
            Self { logs: [None; 2 * NEIGHBOURS + 1], low: own, high: own, net: 0.0, length: 1 };
        run.logs[NEIGHBOURS] = Some(own);
        let mut ends = [own; 2];
        for (side, sign) in [(0, -1), (1, 1)] {
            let mut last = own;
            for k in 1..=reach {
                let Some(next) = around(sign * k).filter(|i| i.decided.is_some()) else { break };
                let log = next.f0.ln();
                if CENTS_PER_NEPER * (log - last).abs() > CONTINUOUS_CENTS {
                    break;
                }
                let at = NEIGHBOURS.wrapping_add_signed(sign * k);
                run.logs[at] = Some(log);
                run.low = run.low.min(log);
                run.high = run.high.max(log);
                run.length += 1;
                last = log;
            }
            ends[side] = last;
        }
        run.net = (ends[1] - ends[0]).abs();
        run
    }

    /// The largest second difference, over so many instants, around any instant of the run.
    fn sharpest_bend(&self, wide: usize) -> f64 {
        let differences = (wide..self.logs.len() - wide).filter_map(|at| {
            let (before, own, after) =
                (self.logs[at - wide]?, self.logs[at]?, self.logs[at + wide]?);
            Some((before - 2.0 * own + after).abs())
        });
        differences.fold(0.0, f64::max)
    }
}

/// Takes back what the frame's averaging does to a pitch that bends: the frame reads the mean of the pitch under its
/// kernel, so a curvature shifts it by half the kernel's second moment times the second derivative.
fn uncurve(run: &Run, here: &Instant, hop_s: f64) -> (f64, f64) {
    let own = here.f0.ln();
    let sd = here.f0_sd_cents;
    let wide = crate::convert::nearest_index(here.frame_s / 4.0 / hop_s).clamp(1, NEIGHBOURS);
    let (Some(before), Some(after)) = (run.logs[NEIGHBOURS - wide], run.logs[NEIGHBOURS + wide])
    else {
        return (own, sd);
    };
    let span = wide as f64 * hop_s;
    let curvature = (before - 2.0 * own + after) / (span * span);
    let curvature_sd = 6.0f64.sqrt() * sd / CENTS_PER_NEPER / (span * span);
    let gain = KERNEL_MOMENT * here.frame_s * here.frame_s;
    // The correction is itself measured over a span, and the next term of the series is left out: that much of the sharpest
    // bend near by is left.
    let bend = run.sharpest_bend(wide) / (span * span);
    let certain = (bend - CURVED * curvature_sd).max(0.0);
    let left = LEFT_OF_BEND * CENTS_PER_NEPER * gain * certain;
    if curvature.abs() < CURVED * curvature_sd {
        return (own, sd.hypot(left));
    }
    let shift = gain * curvature;
    (own - shift, sd.hypot(CENTS_PER_NEPER * gain * curvature_sd).hypot(left))
}

/// How sure it is that the pitch is this one.
fn confidence(chosen: &Candidate, advantage: f64, run: &Run) -> f64 {
    let fits = provisional_confidence(chosen);
    let clear = 0.5 + 0.5 * (advantage / CLEAR_COST).clamp(0.0, 1.0);
    let holds = run.length >= 2 * NEIGHBOURS && CENTS_PER_NEPER * run.net < SWEEP_CENTS;
    let confidence = fits * clear;
    if holds { confidence } else { confidence.min(RESTLESS) }
}

/// How sure it is by its score alone.
pub(crate) fn provisional_confidence(chosen: &Candidate) -> f64 {
    1.0 / (1.0 + (-(chosen.score - EVEN_SCORE) / SCORE_WIDTH).exp())
}
