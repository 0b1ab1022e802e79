//! Sounds made here, and the bytes of sound files in many formats, so that each byte of a header is at hand.

use std::f64::consts::TAU;

pub(crate) const RATE_HZ: u32 = 48_000;
/// Fundamental of the test tone.
pub(crate) const F0_HZ: f64 = 440.7;
/// Peak amplitude of its partials: 1/n of this.
pub(crate) const AMPLITUDE: f64 = 0.25;

/// Width of the noise under it.
const NOISE: f64 = 1e-4;

/// One channel of samples.
pub(crate) type Channel = Vec<f64>;

/// A steady tone of six partials.
pub(crate) fn tone(seconds: f64) -> Channel {
    tone_at(F0_HZ, seconds)
}

pub(crate) fn tone_at(f0_hz: f64, seconds: f64) -> Channel {
    moving_tone(|_| f0_hz, seconds)
}

/// The same with a fundamental in Hz that moves over time in seconds.
pub(crate) fn moving_tone(f0_hz: impl Fn(f64) -> f64, seconds: f64) -> Channel {
    let mut turns = 0.0;
    (0..frames(seconds))
        .map(|frame| {
            let partial = |n: f64| AMPLITUDE / n * (TAU * n * turns + n).cos();
            let sample = (1..=6).map(f64::from).map(partial).sum::<f64>() + noise(frame);
            turns += f0_hz((f64::from(frame) + 0.5) / f64::from(RATE_HZ)) / f64::from(RATE_HZ);
            sample
        })
        .collect()
}

/// A noise floor, as every recording has one: without it, rounding repeats with the tone and is no noise.
fn noise(frame: u32) -> f64 {
    let mixed = (u64::from(frame) + 1).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    let mixed = (mixed ^ (mixed >> 32)).wrapping_mul(0xd6e8_feb8_6659_fd93);
    let top = u32::try_from(mixed >> 32).unwrap();
    NOISE * (f64::from(top) / f64::from(u32::MAX) - 0.5)
}

pub(crate) fn silence(seconds: f64) -> Channel {
    vec![0.0; usize::try_from(frames(seconds)).unwrap()]
}

/// How WAV samples are coded.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Coding {
    U8,
    S16,
    S24,
    S32,
    F32,
    F64,
}

impl Coding {
    fn bytes(self) -> u16 {
        match self {
            Self::U8 => 1,
            Self::S16 => 2,
            Self::S24 => 3,
            Self::S32 | Self::F32 => 4,
            Self::F64 => 8,
        }
    }

    fn tag(self) -> u16 {
        if matches!(self, Self::F32 | Self::F64) { 3 } else { 1 }
    }

    /// One sample, little-endian.
    fn sample(self, value: f64) -> Vec<u8> {
        let integer = |bits: u32| round(value * 2_f64.powi(i32::try_from(bits).unwrap() - 1), bits);
        match self {
            Self::U8 => vec![u8::try_from(integer(8) + 128).unwrap()],
            Self::S16 => integer(16).to_le_bytes()[..2].to_vec(),
            Self::S24 => integer(24).to_le_bytes()[..3].to_vec(),
            Self::S32 => integer(32).to_le_bytes()[..4].to_vec(),
            Self::F32 => single(value).to_le_bytes().to_vec(),
            Self::F64 => value.to_le_bytes().to_vec(),
        }
    }
}

/// A WAV file's bytes.
pub(crate) fn wav(channels: &[Channel], coding: Coding) -> Vec<u8> {
    riff(b"RIFF", None, &format(channels.len(), coding, coding.tag()), &data(channels, coding))
}

/// The same with an extensible format description.
pub(crate) fn wav_extensible(channels: &[Channel], coding: Coding) -> Vec<u8> {
    let mut description = format(channels.len(), coding, 0xfffe);
    description.extend(22_u16.to_le_bytes());
    description.extend((coding.bytes() * 8).to_le_bytes());
    description.extend(0_u32.to_le_bytes());
    description.extend(coding.tag().to_le_bytes());
    description.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]);
    riff(b"RIFF", None, &description, &data(channels, coding))
}

/// The same with 64-bit sizes.
pub(crate) fn wav_64(channels: &[Channel], coding: Coding) -> Vec<u8> {
    let data = data(channels, coding);
    let mut sizes = b"ds64".to_vec();
    sizes.extend(28_u32.to_le_bytes());
    sizes.extend((data.len() as u64 + 72).to_le_bytes());
    sizes.extend((data.len() as u64).to_le_bytes());
    sizes.extend([0; 12]);
    riff(b"RF64", Some(&sizes), &format(channels.len(), coding, coding.tag()), &data)
}

/// An AIFF file's bytes, or AIFF-C with 32-bit float samples.
pub(crate) fn aiff(channels: &[Channel], float: bool) -> Vec<u8> {
    let bits: u16 = if float { 32 } else { 16 };
    let mut common = small(channels.len()).to_be_bytes().to_vec();
    common.extend(u32::try_from(channels[0].len()).unwrap().to_be_bytes());
    common.extend(bits.to_be_bytes());
    // 48 000 as an 80-bit float: 1.46484375 times 2 to the 15.
    common.extend([0x40, 0x0e, 0xbb, 0x80, 0, 0, 0, 0, 0, 0]);
    if float {
        common.extend(b"fl32\x00\x00");
    }
    let mut sound = vec![0; 8];
    for frame in 0..channels[0].len() {
        for channel in channels {
            if float {
                sound.extend(single(channel[frame]).to_be_bytes());
            } else {
                sound.extend(&round(channel[frame] * 32_768.0, 16).to_be_bytes()[6..]);
            }
        }
    }
    let mut body = if float { b"AIFC".to_vec() } else { b"AIFF".to_vec() };
    for (name, chunk) in [(b"COMM", common), (b"SSND", sound)] {
        body.extend(name);
        body.extend(u32::try_from(chunk.len()).unwrap().to_be_bytes());
        body.extend(chunk);
    }
    let mut file = b"FORM".to_vec();
    file.extend(u32::try_from(body.len()).unwrap().to_be_bytes());
    file.extend(body);
    file
}

/// A FLAC file's bytes, 24 bit.
pub(crate) fn flac(channels: &[Channel]) -> Vec<u8> {
    use flacenc::bitsink::ByteSink;
    use flacenc::component::BitRepr as _;
    use flacenc::error::Verify as _;
    let mut samples = Vec::new();
    for frame in 0..channels[0].len() {
        for channel in channels {
            samples.push(i32::try_from(round(channel[frame] * 8_388_608.0, 24)).unwrap());
        }
    }
    let rate = usize::try_from(RATE_HZ).unwrap();
    let source = flacenc::source::MemSource::from_samples(&samples, channels.len(), 24, rate);
    let config = flacenc::config::Encoder::default().into_verified().unwrap();
    let stream = flacenc::encode_with_fixed_block_size(&config, source, config.block_size).unwrap();
    let mut sink = ByteSink::new();
    stream.write(&mut sink).unwrap();
    sink.as_slice().to_vec()
}

fn riff(marker: &[u8; 4], before: Option<&[u8]>, format: &[u8], data: &[u8]) -> Vec<u8> {
    let long = before.is_some();
    let size = |size: usize| if long { u32::MAX } else { u32::try_from(size).unwrap() };
    let mut file = marker.to_vec();
    file.extend(size(20 + format.len() + data.len()).to_le_bytes());
    file.extend(b"WAVE");
    file.extend(before.unwrap_or_default());
    file.extend(b"fmt ");
    file.extend(u32::try_from(format.len()).unwrap().to_le_bytes());
    file.extend(format);
    file.extend(b"data");
    file.extend(size(data.len()).to_le_bytes());
    file.extend(data);
    file
}

fn format(channels: usize, coding: Coding, tag: u16) -> Vec<u8> {
    let frame = small(channels) * coding.bytes();
    let mut description = tag.to_le_bytes().to_vec();
    description.extend(small(channels).to_le_bytes());
    description.extend(RATE_HZ.to_le_bytes());
    description.extend((RATE_HZ * u32::from(frame)).to_le_bytes());
    description.extend(frame.to_le_bytes());
    description.extend((coding.bytes() * 8).to_le_bytes());
    description
}

fn data(channels: &[Channel], coding: Coding) -> Vec<u8> {
    (0..channels[0].len())
        .flat_map(|frame| channels.iter().flat_map(move |channel| coding.sample(channel[frame])))
        .collect()
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "seconds of a test sound"
)]
fn frames(seconds: f64) -> u32 {
    (seconds * f64::from(RATE_HZ)).round() as u32
}

#[expect(clippy::cast_possible_truncation, reason = "clamped to the bits of the format")]
fn round(value: f64, bits: u32) -> i64 {
    let limit = 2_f64.powi(i32::try_from(bits).unwrap() - 1);
    value.round().clamp(-limit, limit - 1.0) as i64
}

#[expect(clippy::cast_possible_truncation, reason = "the format has single precision")]
fn single(value: f64) -> f32 {
    value as f32
}

fn small(count: usize) -> u16 {
    u16::try_from(count).unwrap()
}
