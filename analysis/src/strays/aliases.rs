//! Aliases: partials above the Nyquist frequency, folded back to `|f - fs round(f / fs)|` of their frequency `f`.
//!
//! Lines are so sharp that the match is tested within a fraction of a resolution, which asks for the fundamental to better
//! than a millionth: it is refined on the way, order by order, since partial 500 shows an error of the fundamental 500
//! times. Where the tone's own partials contradict each other (aliases lie on them), each in turn is trusted, and what
//! explains most of the lines is kept. A line is no alias when it is stronger than the partials before it let expect, and
//! none is when they are no more than chance would bring.

use super::Candidate;
use crate::convert::{floor_index, nearest, number};
use crate::measure::lines::Line;
use crate::reading::StrayKind;
use crate::stiff::partial_hz;

/// Highest partial that an alias is traced to.
const ORDERS: usize = 4096;
/// Orders by which hypotheses are compared.
const ORDERS_COMPARED: usize = 320;
/// Widest match, in resolutions of the long transform.
const MATCH: f64 = 0.5;
/// What is within this many of its deviations says more of the fundamental.
const DEVIATIONS: f64 = 4.0;
/// Deviation of a line's frequency that no signal-to-noise ratio improves, in resolutions.
const LINE_SD: f64 = 0.01;
/// Amplitude times order may exceed that of the orders before by this factor.
const STRONGER: f64 = 2.0;
/// From one order to the next of the same parity, the amplitude expected (times the order) falls by this factor unless it
/// is seen again.
const FORGET: f64 = 0.97;
/// Orders among which the number of matches is held against chance.
const TESTED: [usize; 3] = [16, 64, 512];
/// Probability by chance below which aliases are believed.
const CHANCE: f64 = 1e-3;
/// Strongest partials that are trusted in turn.
const TRUSTED: usize = 8;

/// What a tone's own partials say.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Own {
    /// Partial number.
    pub(crate) n: usize,
    /// Frequency in Hz.
    pub(crate) hz: f64,
    /// Its deviation in Hz.
    pub(crate) sd_hz: f64,
    /// Amplitude.
    pub(crate) amplitude: f64,
}

/// The tone whose partials may have folded.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Tone<'a> {
    /// Its own partials, by rising number.
    pub(crate) own: &'a [Own],
    /// Highest number that was looked for: above it, but below the Nyquist frequency, lines are the tone's own too.
    pub(crate) looked_for: usize,
    /// Fundamental in Hz.
    pub(crate) f0: f64,
    /// Its deviation in Hz.
    pub(crate) f0_sd: f64,
    /// Inharmonicity, where it is significant.
    pub(crate) b: Option<f64>,
    /// Sample rate in Hz.
    pub(crate) sample_rate_hz: f64,
    /// Resolution of the lines in Hz.
    pub(crate) resolution_hz: f64,
}

/// A model that may explain the lines.
#[derive(Debug, Clone, Copy)]
struct Model {
    f0: f64,
    /// One over the variance of `f0`.
    weight: f64,
    b: f64,
}

/// Result of tracing a model.
#[derive(Debug, Clone, Copy)]
struct Trace {
    /// The model, refined on the way.
    model: Model,
    /// Sum of the amplitudes explained.
    explained: f64,
    /// Matches, and those expected by chance, among the first orders that fold.
    tests: [(f64, f64); TESTED.len()],
}

/// Frequency at which a partial appears after sampling, negative where it moves down as the partial moves up.
fn turned_hz(hz: f64, sample_rate_hz: f64) -> f64 {
    hz - sample_rate_hz * nearest(hz / sample_rate_hz)
}

/// Names the aliases among the lines that have no explanation yet, sorted by frequency, and drops those that turn out to be
/// partials in their place.
pub(crate) fn name_aliases(candidates: &mut Vec<Candidate>, tone: &Tone<'_>) {
    if candidates.is_empty() || tone.own.is_empty() {
        return;
    }
    for candidate in candidates.iter_mut() {
        candidate.traced = (0, 0);
    }
    let mut tracer = Tracer { tone, number: 0 };
    let mut best: Option<(Model, f64)> = None;
    let limit = strong_enough(tone.own);
    for b in [Some(0.0), tone.b].into_iter().flatten() {
        let fitted = Model { f0: tone.f0, weight: tone.f0_sd.powi(-2), b };
        tracer.consider(fitted, candidates, &mut best);
        for trusted in tone.own.iter().filter(|o| o.amplitude >= limit) {
            let order = partial_hz(1.0, b, trusted.n as f64);
            let sd = trusted.sd_hz.max(0.1 * LINE_SD * tone.resolution_hz) / order;
            let told = Model { f0: trusted.hz / order, weight: sd.powi(-2), b };
            tracer.consider(told, candidates, &mut best);
        }
    }
    let Some((model, _)) = best else { return };
    let trace = tracer.run(model, candidates, ORDERS);
    let believed = trace.tests.iter().any(|&(found, chance)| beyond_chance(found, chance));
    let nyquist = 0.5 * tone.sample_rate_hz;
    let hz_of = |n: usize| partial_hz(trace.model.f0, trace.model.b, n as f64);
    candidates.retain_mut(|c| {
        let (n, by) = c.traced;
        let hz = hz_of(n);
        if by == tracer.number && hz > nyquist && believed {
            let folds = number(floor_index(hz / nyquist));
            c.kind = StrayKind::Alias { partial: number(n), folds };
        }
        by != tracer.number || hz > nyquist
    });
}

/// Amplitude of the weakest of the partials that are trusted.
fn strong_enough(own: &[Own]) -> f64 {
    let mut limit = f64::INFINITY;
    for _ in 0..TRUSTED {
        let below = own.iter().map(|o| o.amplitude).filter(|&a| a < limit);
        limit = below.fold(0.0, f64::max);
    }
    limit
}

/// Whether so many matches are more than chance brings, by H. Chernoff's bound on a Poisson variable.
fn beyond_chance(found: f64, chance: f64) -> bool {
    found > chance && found * (found / chance).ln() - found + chance > -CHANCE.ln()
}

/// Traces models through the lines.
struct Tracer<'a> {
    tone: &'a Tone<'a>,
    /// Of the current trace, from 1.
    number: u32,
}

impl Tracer<'_> {
    /// Keeps a model if it explains more than the best so far.
    fn consider(
        &mut self,
        model: Model,
        candidates: &mut [Candidate],
        best: &mut Option<(Model, f64)>,
    ) {
        let far = LINE_SD * self.tone.resolution_hz / ORDERS_COMPARED as f64;
        let same = |m: &Model| m.b.total_cmp(&model.b).is_eq() && (m.f0 - model.f0).abs() < far;
        if best.as_ref().is_some_and(|(m, _)| same(m)) {
            return;
        }
        let explained = self.run(model, candidates, ORDERS_COMPARED).explained;
        if best.is_none_or(|(_, most)| explained > most) {
            *best = Some((model, explained));
        }
    }

    /// Traces so many orders beyond the partials looked for.
    fn run(&mut self, model: Model, candidates: &mut [Candidate], orders: usize) -> Trace {
        self.number += 1;
        let tone = self.tone;
        let mut trace = Trace { model, explained: 0.0, tests: [(0.0, 0.0); TESTED.len()] };
        let mut expected = trace.own(tone);
        let nyquist = 0.5 * tone.sample_rate_hz;
        let widest = MATCH * tone.resolution_hz;
        let open = candidates.iter().filter(|c| c.kind == StrayKind::Unexplained).count();
        let chance = 2.0 * widest * open as f64 / nyquist;
        let mut folded = 0;
        for n in tone.looked_for + 1..=tone.looked_for + orders {
            let order = partial_hz(1.0, model.b, n as f64);
            let hz = order * trace.model.f0;
            let slack = order / trace.model.weight.sqrt();
            if slack > widest {
                break;
            }
            expected[n % 2] *= FORGET;
            let most = STRONGER * expected[n % 2] / n as f64;
            let turned = turned_hz(hz, tone.sample_rate_hz);
            let lies = turned.abs();
            let first = candidates.partition_point(|c| c.line.hz < lies - widest);
            let found = candidates[first..]
                .iter_mut()
                .take_while(|c| c.line.hz <= lies + widest)
                .filter(|c| c.kind == StrayKind::Unexplained)
                .filter(|c| c.traced.1 != self.number && c.line.amplitude <= most)
                .max_by(|a, b| a.line.amplitude.total_cmp(&b.line.amplitude));
            let matched = found.is_some();
            if let Some(c) = found {
                c.traced = (n, self.number);
                trace.explained += c.line.amplitude;
                expected[n % 2] = expected[n % 2].max(c.line.amplitude * n as f64);
                let off = turned.signum() * (c.line.hz - lies);
                let sd = line_sd(&c.line, tone.resolution_hz);
                // Farther off, a weaker line too close to be told apart has drawn it aside.
                if off.abs() < DEVIATIONS * sd.hypot(slack) {
                    trace.model.learn(off / order, sd / order);
                }
            }
            if hz > nyquist {
                for (test, _) in trace.tests.iter_mut().zip(TESTED).filter(|(_, t)| folded < *t) {
                    test.0 += f64::from(u8::from(matched));
                    test.1 += chance;
                }
                folded += 1;
            }
        }
        trace
    }
}

impl Trace {
    /// Learns from the tone's own partials. Returns the amplitude, times the order, expected of the next even and odd one.
    fn own(&mut self, tone: &Tone<'_>) -> [f64; 2] {
        let mut expected = [0.0f64; 2];
        let mut before = 0;
        for own in tone.own {
            for n in before + 1..=own.n {
                expected[n % 2] *= FORGET;
            }
            before = own.n;
            let order = partial_hz(1.0, self.model.b, own.n as f64);
            let off = own.hz - order * self.model.f0;
            let sd = own.sd_hz.hypot(LINE_SD * tone.resolution_hz);
            if off.abs() < DEVIATIONS * sd.hypot(order / self.model.weight.sqrt()) {
                self.explained += own.amplitude;
                self.model.learn(off / order, sd / order);
            }
            // What lies far off is something else in the place of a partial that may not be there.
            if off.abs() < MATCH * tone.resolution_hz {
                expected[own.n % 2] = expected[own.n % 2].max(own.amplitude * own.n as f64);
            }
        }
        expected
    }
}

impl Model {
    /// Takes in a fundamental that is off by so much, with its deviation.
    fn learn(&mut self, off: f64, sd: f64) {
        let w = sd.powi(-2);
        self.weight += w;
        self.f0 += off * w / self.weight;
    }
}

/// Deviation of a line's frequency in Hz: the bound for the window (its variance is 4.66 times that without one) at the
/// line's ratio to the noise, and what its neighbours do to it.
fn line_sd(line: &Line, resolution_hz: f64) -> f64 {
    resolution_hz * LINE_SD.hypot(0.6 / line.snr.sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE: f64 = 44_100.0;

    /// Lines of a saw of this fundamental from partial `first` to `last`, folded, with its own below.
    fn saw(f0: f64, first: usize, last: usize) -> (Vec<Candidate>, Vec<Own>) {
        let own = (1..first).map(|n| {
            let amplitude = 0.3 / n as f64;
            Own { n, hz: n as f64 * f0, sd_hz: 1e-4, amplitude }
        });
        let line = |n: usize| {
            let hz = turned_hz(n as f64 * f0, RATE).abs();
            Candidate::new(Line { hz, amplitude: 0.3 / n as f64, snr: 1e5 })
        };
        let mut lines: Vec<_> = (first..=last).map(line).collect();
        lines.sort_by(|a, b| a.line.hz.total_cmp(&b.line.hz));
        (lines, own.collect())
    }

    fn tone(own: &[Own], f0: f64) -> Tone<'_> {
        Tone {
            own,
            looked_for: own.len(),
            f0,
            f0_sd: 1e-3,
            b: None,
            sample_rate_hz: RATE,
            resolution_hz: 0.35,
        }
    }

    #[test]
    fn published_examples_fold_where_they_should() {
        for (n, hz) in [(7.0, 19_460.0), (13.0, 1_660.0)] {
            let found = turned_hz(n * 3520.0, RATE).abs();
            assert!((found - hz).abs() < 1e-9, "partial {n} of 3520 Hz: {found}");
        }
    }

    #[test]
    fn every_alias_of_a_saw_is_named() {
        let f0 = 1234.567;
        let (mut lines, own) = saw(f0, 18, 300);
        // The fundamental is off by more than the aliases allow, and one of its own partials lies on something else.
        let mut own = own;
        own[4].hz += 2.5;
        name_aliases(&mut lines, &tone(&own, f0 + 0.01));
        let mut numbers: Vec<u32> = lines
            .iter()
            .filter_map(|c| match c.kind {
                StrayKind::Alias { partial, .. } => Some(partial),
                _ => None,
            })
            .collect();
        numbers.sort_unstable();
        assert_eq!(numbers, (18..=300).collect::<Vec<u32>>(), "aliases of {f0} Hz");
    }

    #[test]
    fn partials_in_their_place_are_dropped() {
        let f0 = 110.0;
        let (mut lines, own) = saw(f0, 44, 200);
        name_aliases(&mut lines, &tone(&own, f0));
        assert_eq!(lines.len(), 0, "lines left, though 200 times 110 Hz lies below 22050 Hz");
    }

    #[test]
    fn lines_by_chance_are_no_aliases() {
        let (_, own) = saw(261.6, 44, 44);
        let mut lines: Vec<_> = (0..60)
            .map(|k| {
                let hz = 300.0 + 321.7 * f64::from(k) + 17.0 * (f64::from(k) * 1.7).sin();
                Candidate::new(Line { hz, amplitude: 1e-4, snr: 1e3 })
            })
            .collect();
        name_aliases(&mut lines, &tone(&own, 261.6));
        let named = lines.iter().filter(|c| c.kind != StrayKind::Unexplained).count();
        assert_eq!((named, lines.len()), (0, 60), "unrelated lines");
    }

    #[test]
    fn a_line_stronger_than_the_partials_before_is_no_alias() {
        let f0 = 1234.567;
        let (mut lines, own) = saw(f0, 18, 60);
        let loud = lines.iter_mut().max_by(|a, b| a.line.hz.total_cmp(&b.line.hz)).expect("lines");
        loud.line.amplitude *= 30.0;
        name_aliases(&mut lines, &tone(&own, f0));
        let unexplained = lines.iter().filter(|c| c.kind == StrayKind::Unexplained).count();
        assert_eq!(unexplained, 1, "one line out of line");
    }
}
