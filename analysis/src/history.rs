//! The last samples of the stream, by absolute position: a ring that frames and notes are read back from.

/// A ring of samples. Positions outside what it holds read as silence.
#[derive(Debug)]
pub(crate) struct History {
    ring: Vec<f32>,
    /// First position of the current stream: nothing before it belongs to the sound.
    start: u64,
    /// Position after the newest sample.
    end: u64,
    /// Position after the last sample that is not quiet.
    loud_until: u64,
}

/// Amplitude under which a sample is quiet: a frame of such samples lies under -92 dBFS.
const QUIET: f32 = 1.7e-5;

impl History {
    /// A ring that holds at least `capacity` samples.
    pub(crate) fn new(capacity: usize) -> Self {
        Self { ring: vec![0.0; capacity.next_power_of_two()], start: 0, end: 0, loud_until: 0 }
    }

    /// Position after the newest sample.
    pub(crate) fn end(&self) -> u64 {
        self.end
    }

    /// First position of the current stream.
    pub(crate) fn start(&self) -> u64 {
        self.start
    }

    /// Position after the last sample that is not quiet, or the stream's start.
    pub(crate) fn loud_until(&self) -> u64 {
        self.loud_until
    }

    /// Oldest position still held.
    pub(crate) fn oldest(&self) -> u64 {
        self.start.max(self.end.saturating_sub(self.ring.len() as u64))
    }

    /// Begins a new stream at a position.
    pub(crate) fn restart(&mut self, position: u64) {
        self.start = position;
        self.end = position;
        self.loud_until = position;
    }

    /// Appends samples.
    pub(crate) fn push(&mut self, samples: &[f32]) {
        let mask = self.ring.len() - 1;
        let at = crate::convert::index(self.end) & mask;
        let first = samples.len().min(self.ring.len() - at);
        self.ring[at..at + first].copy_from_slice(&samples[..first]);
        self.ring[..samples.len() - first].copy_from_slice(&samples[first..]);
        if let Some(last) = last_loud(samples) {
            self.loud_until = self.end + last as u64 + 1;
        }
        self.end += samples.len() as u64;
    }

    /// Copies `out.len()` samples from a position (which may lie before the stream's start) on.
    pub(crate) fn read(&self, from: i64, out: &mut [f32]) {
        let (before, early, late) = self.held(from, out.len());
        let (silence, out) = out.split_at_mut(before);
        let (first, out) = out.split_at_mut(early.len());
        let (second, after) = out.split_at_mut(late.len());
        silence.fill(0.0);
        first.copy_from_slice(early);
        second.copy_from_slice(late);
        after.fill(0.0);
    }

    /// The same, each sample times its weight.
    pub(crate) fn read_weighted(&self, from: i64, weights: &[f32], out: &mut [f32]) {
        let (before, early, late) = self.held(from, out.len());
        let (silence, out) = out.split_at_mut(before);
        let (held, after) = out.split_at_mut(early.len() + late.len());
        silence.fill(0.0);
        after.fill(0.0);
        let (first, second) = held.split_at_mut(early.len());
        let weights = &weights[before..];
        for (part, samples, weights) in
            [(first, early, weights), (second, late, &weights[early.len()..])]
        {
            for ((out, x), w) in part.iter_mut().zip(samples).zip(weights) {
                *out = x * w;
            }
        }
    }

    /// Of `count` samples from a position on: how many lie before those held, and those held, in the two parts that the
    /// ring has them in.
    fn held(&self, from: i64, count: usize) -> (usize, &[f32], &[f32]) {
        let position = |p: u64| i64::try_from(p).unwrap_or(i64::MAX);
        let until = from + i64::try_from(count).unwrap_or(i64::MAX);
        let (a, b) = (from.max(position(self.oldest())), until.min(position(self.end)));
        let Some(length) = usize::try_from(b - a).ok().filter(|&l| l > 0) else {
            return (count, &[], &[]);
        };
        let at = usize::try_from(a).unwrap_or(0) & (self.ring.len() - 1);
        let first = length.min(self.ring.len() - at);
        let before = usize::try_from(a - from).unwrap_or(0);
        (before, &self.ring[at..at + first], &self.ring[..length - first])
    }
}

/// Where the last sample that is not quiet lies. Whole pieces are judged side by side, for silence is looked through to its
/// beginning.
fn last_loud(samples: &[f32]) -> Option<usize> {
    let loud = |x: &f32| x.abs() > QUIET;
    let mut end = samples.len();
    for piece in samples.rchunks(64) {
        let start = end - piece.len();
        if piece.iter().fold(false, |any, x| any | loud(x)) {
            return piece.iter().rposition(loud).map(|last| start + last);
        }
        end = start;
    }
    None
}

/// A span of samples that are to be read piece by piece.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Span<'a> {
    /// Where they are.
    pub(crate) history: &'a History,
    /// Position of the first.
    pub(crate) start: u64,
    /// How many.
    pub(crate) length: usize,
}

impl Span<'_> {
    /// Copies the samples from the `first`th on.
    pub(crate) fn read(&self, first: usize, out: &mut [f32]) {
        let from = self.start + first as u64;
        self.history.read(i64::try_from(from).unwrap_or(i64::MAX), out);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_last_loud_sample_is_found_wherever_it_lies() {
        for length in [0, 1, 63, 64, 65, 200] {
            assert_eq!(last_loud(&vec![0.0; length]), None, "{length} samples of silence");
            for at in 0..length {
                let mut samples = vec![QUIET; length];
                samples[at] = -0.1;
                samples[0] = 0.1;
                assert_eq!(last_loud(&samples), Some(at), "sample {at} of {length}");
            }
        }
    }
}
