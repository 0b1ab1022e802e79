//! A note from its stretches: the figures of each put together, the strays named, the descriptors drawn up.

use super::clusters;
use super::lines::{LINES_MAX, Line};
use super::note::{Meter, SPARE, STRETCH_S};
use super::rows::Row;
use super::voices::{self, Search, VOICES_MAX, Voice};
use crate::convert::{index, nearest_index, number};
use crate::descriptors::Descriptors;
use crate::history::{History, Span};
use crate::note::{Cluster, Note, NotePartial};
use crate::reading::{StrayKind, Stretch};
use crate::refine::Tone;
use crate::spectrum::TransformRuns;
use crate::stiff::{
    self, CENTS_PER_NEPER, DB_PER_NEPER, Point, StiffFit, partial_hz, partial_number,
};
use crate::strays::aliases::{self, Own};
use crate::strays::{self, Candidate, mains};

/// Distance of a line from a partial within which it is that partial, in resolutions.
const OWN: f64 = 4.0;
/// The same for a partial of a detuned voice.
const VOICES_OWN: f64 = 0.75;
/// The same for a line that nothing else explains, in cents: strings in pairs and choruses spread a partial.
const SPREAD_CENTS: f64 = 15.0;
/// And at most, as a share of the fundamental.
const SPREAD_OF_F0: f64 = 0.2;

/// Sums over the stretches of a note for one partial.
#[derive(Debug, Clone, Copy, Default)]
struct Sums {
    found: usize,
    /// Weight, and weighted logarithm, of the frequency.
    frequency: (f64, f64),
    /// Weight, and weighted decay, in nepers per second.
    decay: (f64, f64),
    /// Amplitude, phase and logarithmic deviation at the note's start, from the first stretch it is found in.
    start: (f64, f64, f64),
    /// Energy: mean square times seconds.
    energy: f64,
    /// Noise in 1 Hz, as squared amplitude times seconds.
    noise: f64,
    /// What lines it is made of in the first stretch, where the pitch holds.
    cluster: Option<Cluster>,
}

/// Builds notes. Owns all memory for it.
#[derive(Debug)]
pub(crate) struct Assembler {
    sample_rate_hz: f64,
    partials: usize,
    meter: Meter,
    sums: Vec<Sums>,
    points: Vec<Point>,
    candidates: Vec<Candidate>,
    own: Vec<Own>,
    /// Partials of a detuned voice.
    voice: Vec<Own>,
    start: u64,
    stretch_start: u64,
    seconds: f64,
    /// Energy of everything: mean square times seconds.
    energy: f64,
    log_f0: (f64, f64),
    note: Note,
}

impl Assembler {
    /// How often each transform has run.
    pub(crate) fn transforms(&self) -> [TransformRuns; 2] {
        self.meter.long.runs
    }

    /// Room for every note.
    pub(crate) fn new(sample_rate_hz: f64, partials: usize, hop: usize) -> Self {
        Self {
            sample_rate_hz,
            partials,
            meter: Meter::new(sample_rate_hz, partials, hop),
            sums: vec![Sums::default(); partials + 1],
            points: Vec::with_capacity(partials),
            candidates: Vec::with_capacity(LINES_MAX),
            own: Vec::with_capacity(partials + SPARE),
            voice: Vec::with_capacity(partials + SPARE),
            start: 0,
            stretch_start: 0,
            seconds: 0.0,
            energy: 0.0,
            log_f0: (0.0, 0.0),
            note: Note {
                partials: Vec::with_capacity(partials),
                strays: Vec::with_capacity(Note::STRAYS_MAX),
                ..Note::default()
            },
        }
    }

    /// Begins a note.
    pub(crate) fn begin(&mut self, start: u64) {
        self.start = start;
        self.stretch_start = start;
        self.seconds = 0.0;
        self.energy = 0.0;
        self.log_f0 = (0.0, 0.0);
        self.sums.fill(Sums::default());
        self.candidates.clear();
        self.meter.clear();
    }

    /// Takes in an instant of the note; a stretch that is full is measured.
    pub(crate) fn add(
        &mut self,
        history: &History,
        centre: u64,
        pitch: (f64, f64),
        tones: &[Tone],
    ) {
        if centre >= self.stretch_start + nearest_index(STRETCH_S * self.sample_rate_hz) as u64 {
            self.stretch(history, centre);
        }
        self.meter.add(centre, pitch.0, pitch.1, tones);
    }

    /// Ends the note. `None` when nothing in it could be measured.
    pub(crate) fn end(&mut self, history: &History, end: u64) -> Option<&Note> {
        self.stretch(history, end);
        self.note.start = self.start;
        self.note.end = end;
        let fit = self.partials_of_note()?;
        self.strays_of_note(&fit);
        let partials =
            self.note.partials.iter().map(|p| (p.number, 10f64.powf(p.level_mean_dbfs / 20.0)));
        let own: f64 = self.sums.iter().map(|s| 0.5 * s.energy).sum();
        let rest = (self.energy - own) / self.seconds;
        self.note.descriptors = Descriptors::of(partials, (rest > 0.0).then_some(rest));
        Some(&self.note)
    }

    /// Measures the stretch that ends here and adds it up.
    fn stretch(&mut self, history: &History, end: u64) {
        let start = self.stretch_start;
        self.stretch_start = end;
        let Some(fit) = (end > start).then(|| self.meter.run(history, start, end)).flatten() else {
            self.meter.clear();
            return;
        };
        let seconds = index(end - start) as f64 / self.sample_rate_hz;
        if self.seconds <= 0.0 {
            self.collect_lines(&fit);
        }
        self.seconds += seconds;
        self.energy += mean_square(history, start, end) * seconds;
        let w = 1.0 / fit.f0_sd_cents.max(1e-9).powi(2);
        self.log_f0.0 += w;
        self.log_f0.1 += w * fit.f0.ln();
        let since = (start - self.start) as f64 / self.sample_rate_hz;
        for row in self.meter.rows.rows.iter().filter(|r| r.present && r.n <= self.partials) {
            let s = &mut self.sums[row.n];
            let hz = row.hz();
            let w = (hz / row.fit.delta_sd_hz).powi(2);
            s.frequency.0 += w;
            s.frequency.1 += w * hz.ln();
            let w = row.fit.sigma_sd.powi(-2);
            s.decay.0 += w;
            s.decay.1 += w * row.fit.sigma;
            if s.found == 0 {
                let back = (row.fit.sigma * since).clamp(-3.0, 3.0).exp();
                s.start = (row.fit.a.norm() * back, row.fit.a.arg(), row.fit.log_sd);
            }
            s.found += 1;
            s.energy += row.fit.mean_square * seconds;
            s.noise += row.fit.noise * 0.005 * seconds;
        }
        self.meter.clear();
    }

    fn partials_of_note(&mut self) -> Option<StiffFit> {
        self.note.partials.clear();
        self.points.clear();
        for (n, s) in self.sums.iter().enumerate().filter(|(_, s)| s.found > 0) {
            let hz = (s.frequency.1 / s.frequency.0).exp();
            self.points.push(Point { n: n as f64, hz, sd_hz: hz / s.frequency.0.sqrt() });
        }
        let fit = stiff::fit(&self.points).or_else(|| self.without_partials())?;
        self.note.f0_hz = fit.f0;
        self.note.f0_sd_cents = fit.f0_sd_cents;
        self.note.stretch = fit.b_sd.is_finite().then_some(Stretch { b: fit.b, b_sd: fit.b_sd });
        let strongest = self.sums.iter().map(|s| s.start.0).fold(0.0, f64::max);
        for p in &self.points {
            let n = nearest_index(p.n);
            let s = &self.sums[n];
            let own_cents = CENTS_PER_NEPER * p.sd_hz / p.hz;
            let mean_square = s.energy / self.seconds;
            self.note.partials.push(NotePartial {
                number: number(n),
                frequency_hz: p.hz,
                frequency_sd_hz: p.sd_hz,
                cents_from_harmonic: CENTS_PER_NEPER * (p.hz / (p.n * fit.f0)).ln(),
                cents_sd: own_cents.hypot(fit.f0_sd_cents),
                level_dbfs: 20.0 * s.start.0.log10(),
                level_sd_db: DB_PER_NEPER * s.start.2,
                level_relative_db: 20.0 * (s.start.0 / strongest).log10(),
                level_mean_dbfs: 10.0 * mean_square.log10(),
                phase_rad: s.start.1,
                decay_db_per_s: DB_PER_NEPER * s.decay.1 / s.decay.0,
                decay_sd: DB_PER_NEPER / s.decay.0.sqrt(),
                snr_db: 10.0 * (s.energy / s.noise.max(f64::MIN_POSITIVE)).log10(),
                cluster: s.cluster,
            });
        }
        Some(fit)
    }

    /// What is left to say of a note in which no partial could be measured: where its instants lay.
    fn without_partials(&self) -> Option<StiffFit> {
        (self.log_f0.0 > 0.0).then(|| StiffFit {
            f0: (self.log_f0.1 / self.log_f0.0).exp(),
            f0_sd_cents: self.log_f0.0.sqrt().recip(),
            b: 0.0,
            b_sd: f64::INFINITY,
            scatter_cents: 0.0,
        })
    }

    /// Keeps the lines of the stretch that are no partial's own.
    fn collect_lines(&mut self, fit: &StiffFit) {
        let long = &self.meter.long;
        let own = OWN * long.resolution_hz;
        let sweep = self.meter.sweep;
        let last = self.meter.rows.rows.last().map_or(0, |r| r.n);
        let still = sweep <= 0.0;
        for line in &long.lines {
            let n = nearest_number(line.hz, fit);
            let near = |n: usize| {
                let row = self.meter.rows.rows.iter().find(|r| r.present && r.n == n);
                let hz = row.map_or_else(|| partial_hz(fit.f0, fit.b, n as f64), Row::hz);
                (line.hz - hz).abs() < own + 1.5 * sweep * hz
            };
            let is_partial = (n.saturating_sub(1).max(1)..=(n + 1).min(last)).any(near);
            if !is_partial && self.candidates.len() < self.candidates.capacity() {
                self.candidates.push(Candidate::new(*line));
            }
        }
        self.name(fit, still);
        let strange = |line: &Line| is_alias(&self.candidates, line);
        for row in
            self.meter.rows.rows.iter().filter(|r| still && r.present && r.n <= self.partials)
        {
            let lines = &self.meter.long.lines;
            self.sums[row.n].cluster = clusters::cluster(lines, row.hz(), fit.f0, strange);
        }
    }

    /// Explains the lines collected; where the pitch holds `still`, those of detuned voices too.
    fn name(&mut self, fit: &StiffFit, still: bool) {
        let resolution_hz = self.meter.long.resolution_hz;
        let rows = &self.meter.rows.rows;
        self.own.clear();
        self.own.extend(rows.iter().filter(|r| r.present).map(|r| Own {
            n: r.n,
            hz: r.hz(),
            sd_hz: r.fit.delta_sd_hz,
            amplitude: r.fit.mean_square.sqrt(),
        }));
        let tone = aliases::Tone {
            own: &self.own,
            looked_for: rows.last().map_or(0, |r| r.n),
            f0: fit.f0,
            f0_sd: fit.f0 * fit.f0_sd_cents / CENTS_PER_NEPER,
            b: (fit.b.abs() > 4.0 * fit.b_sd).then_some(fit.b),
            sample_rate_hz: self.sample_rate_hz,
            resolution_hz,
        };
        aliases::name_aliases(&mut self.candidates, &tone);
        if still {
            let search = Search {
                lines: &self.meter.long.lines,
                own: &self.own,
                f0: tone.f0,
                b: tone.b.unwrap_or(0.0),
                resolution_hz,
            };
            name_voices(&search, &tone, &mut self.candidates, &mut self.voice);
        }
        mains::name_mains(&mut self.candidates, resolution_hz);
    }

    fn strays_of_note(&mut self, fit: &StiffFit) {
        let own = OWN * self.meter.long.resolution_hz;
        self.candidates.retain(|c| {
            let n = nearest_number(c.line.hz, fit);
            let hz = partial_hz(fit.f0, fit.b, n as f64);
            let spread = (SPREAD_CENTS / CENTS_PER_NEPER * hz).min(SPREAD_OF_F0 * fit.f0);
            c.kind != StrayKind::Unexplained || (c.line.hz - hz).abs() > spread.max(own)
        });
        self.candidates.sort_unstable_by(|a, b| b.line.amplitude.total_cmp(&a.line.amplitude));
        let kept = self.candidates.len().min(Note::STRAYS_MAX);
        self.note.strays.clear();
        self.note.strays.extend(self.candidates[..kept].iter().map(strays::stray));
        self.note.strays_left_out = self.candidates.len() - kept;
    }
}

/// Finds detuned voices, names their aliases, and drops what are their partials.
fn name_voices(
    search: &Search<'_>,
    tone: &aliases::Tone<'_>,
    candidates: &mut Vec<Candidate>,
    own: &mut Vec<Own>,
) {
    let mut known = [Voice { f0: tone.f0, f0_sd: tone.f0_sd }; VOICES_MAX + 1];
    for count in 1..=VOICES_MAX {
        let found = search.next(&known[..count], |line| {
            let voices = &mut known[..count].iter();
            is_alias(candidates, line)
                || voices.any(|&voice| search.is_partial_of(voice, line.hz, VOICES_OWN))
        });
        let Some(voice) = found else { return };
        known[count] = voice;
        own.clear();
        own.extend(search.own.iter().filter_map(|first| {
            let line = search.line(voice, first.n)?;
            let sd_hz = voices::LINE_SD * search.resolution_hz;
            Some(Own { n: first.n, hz: line.hz, sd_hz, amplitude: line.amplitude })
        }));
        let tone = aliases::Tone { own, f0: voice.f0, f0_sd: voice.f0_sd, ..*tone };
        aliases::name_aliases(candidates, &tone);
        candidates.retain(|c| {
            c.kind != StrayKind::Unexplained || !search.is_partial_of(voice, c.line.hz, VOICES_OWN)
        });
    }
}

/// Whether a line is one of the aliases among the candidates, which rise by frequency.
fn is_alias(candidates: &[Candidate], line: &Line) -> bool {
    let found = candidates.binary_search_by(|c| c.line.hz.total_cmp(&line.hz));
    found.is_ok_and(|at| matches!(candidates[at].kind, StrayKind::Alias { .. }))
}

/// Number of the partial of the model nearest to a frequency.
fn nearest_number(hz: f64, fit: &StiffFit) -> usize {
    nearest_index(partial_number(fit.f0, fit.b.max(0.0), hz)).max(1)
}

/// Mean square of the samples from `start` to `end`.
fn mean_square(history: &History, start: u64, end: u64) -> f64 {
    let mut piece = [0.0f32; 512];
    let length = index(end - start);
    let mut sum = 0.0;
    for first in (0..length).step_by(piece.len()) {
        let piece = &mut piece[..(length - first).min(512)];
        Span { history, start, length }.read(first, piece);
        sum += piece.iter().map(|&x| f64::from(x) * f64::from(x)).sum::<f64>();
    }
    sum / length as f64
}
