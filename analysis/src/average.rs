//! Partials of a reading, averaged over the integration time.

use crate::convert::number;
use crate::reading::Partial;
use crate::refine::Tone;
use crate::stiff::{CENTS_PER_NEPER, DB_PER_NEPER, log_ratio, quadrature};

/// Share of a frame after which a Hann frame's estimate is nearly independent of the last.
const FRESH: f64 = 0.6;
/// Step of the pitch that begins a new average, in cents.
const NEW_PITCH_CENTS: f64 = 60.0;
/// Instants without the partial after which its average begins anew.
const FORGOTTEN: usize = 8;

#[derive(Debug, Clone, Copy, Default)]
struct Mean {
    power: f64,
    log_ratio: f64,
    frequency_variance: f64,
    noise_to_signal: f64,
    count: usize,
    missed: usize,
}

/// Running averages of the partials.
#[derive(Debug)]
pub(crate) struct Averager {
    means: Vec<Mean>,
    hop_s: f64,
    integration_s: f64,
    last_f0: f64,
}

impl Averager {
    /// For so many partials.
    pub(crate) fn new(partials: usize, hop_s: f64, integration_s: f64) -> Self {
        Self { means: vec![Mean::default(); partials + 1], hop_s, integration_s, last_f0: 0.0 }
    }

    /// Begins anew.
    pub(crate) fn restart(&mut self) {
        self.means.fill(Mean::default());
        self.last_f0 = 0.0;
    }

    /// Takes in the tones of an instant of pitch `f0` (with its deviation in cents) and lists the averages.
    pub(crate) fn run(
        &mut self,
        (f0, f0_sd_cents): (f64, f64),
        frame_s: f64,
        tones: &[Tone],
        out: &mut Vec<Partial>,
    ) {
        if CENTS_PER_NEPER * (f0 / self.last_f0.max(1e-9)).ln().abs() > NEW_PITCH_CENTS {
            self.restart();
        }
        self.last_f0 = f0;
        for mean in &mut self.means {
            mean.missed += 1;
        }
        let steady = 1.0 - (-self.hop_s / self.integration_s).exp();
        for tone in tones {
            let Some(mean) = self.means.get_mut(tone.n) else { continue };
            if mean.missed > FORGOTTEN {
                *mean = Mean::default();
            }
            mean.missed = 0;
            mean.count += 1;
            let share = steady.max(1.0 / mean.count as f64);
            let log_ratio = log_ratio(tone.hz / (tone.n as f64 * f0));
            mean.power += share * (tone.amplitude.norm_sqr() - mean.power);
            mean.log_ratio += share * (log_ratio - mean.log_ratio);
            mean.frequency_variance +=
                share * ((tone.sd_hz / tone.hz).powi(2) - mean.frequency_variance);
            mean.noise_to_signal += share * (1.0 / tone.snr - mean.noise_to_signal);
        }
        out.clear();
        for tone in tones.iter().filter(|t| t.n < self.means.len()) {
            let mean = &self.means[tone.n];
            let span = (mean.count as f64 * self.hop_s).min(2.0 * self.integration_s);
            let independent = (span / (FRESH * frame_s)).max(1.0);
            let harmonic_hz = tone.n as f64 * f0;
            let sd = (mean.frequency_variance / independent).sqrt();
            out.push(Partial {
                number: number(tone.n),
                frequency_hz: harmonic_hz * mean.log_ratio.exp(),
                frequency_sd_hz: harmonic_hz * sd,
                cents_from_harmonic: CENTS_PER_NEPER * mean.log_ratio,
                cents_sd: quadrature(CENTS_PER_NEPER * sd, f0_sd_cents / independent.sqrt()),
                level_dbfs: 10.0 * mean.power.log10(),
                level_sd_db: DB_PER_NEPER * (0.5 * mean.noise_to_signal / independent).sqrt(),
                phase_rad: tone.amplitude.arg(),
                snr_db: -10.0 * mean.noise_to_signal.log10(),
            });
        }
    }
}
