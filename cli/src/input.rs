//! Sound files, decoded block by block to `f32` with full scale 1.0.
//!
//! The decoder is symphonia's; [`container`] finds the sound first, so that a header that lies
//! costs as little as can be.

mod channel;
mod clipping;
mod container;

pub(crate) use channel::{Channel, Mix};

use anyhow::{Context as _, Result, anyhow, bail};
use clipping::ClipCounter;
use container::Section;
use std::fs::File;
use std::io::ErrorKind;
use std::path::Path;
use symphonia::core::codecs::audio::{AudioDecoder, AudioDecoderOptions};
use symphonia::core::errors::Error as DecodeError;
use symphonia::core::formats::probe::Hint;
use symphonia::core::formats::{FormatOptions, FormatReader, TrackType};
use symphonia::core::io::MediaSourceStream;
use symphonia::core::packet::Packet;

/// Longest hole bridged within a file of unknown length, in frames: beyond it, a time stamp is taken for damaged.
const HOLE_FRAMES_MAX: u64 = 1 << 24;
/// Damaged places met without a sound packet in between, after which a file is given up.
const DAMAGED_IN_A_ROW_MAX: u32 = 1 << 16;

/// A sound file being read.
pub(crate) struct Input {
    format: Box<dyn FormatReader>,
    decoder: Box<dyn AudioDecoder>,
    track: u32,
    mix: Mix,
    planes: Vec<Vec<f32>>,
    clips: Vec<ClipCounter>,
    /// Sample rate in Hz.
    pub(crate) sample_rate_hz: u32,
    /// Channels in the file.
    pub(crate) channels: usize,
    /// Frames in the file, when known beforehand.
    pub(crate) frames: Option<u64>,
    /// Frames read so far, lost ones included.
    pub(crate) position: u64,
    pending: Option<Packet>,
    /// Frames lost to damage so far.
    lost: u64,
    /// Frames that the header announces and the file does not hold.
    missing: u64,
    remarks: Vec<String>,
}

/// The next piece of a file.
pub(crate) enum Block {
    /// Samples were put into the buffer given.
    Samples,
    /// That many frames could not be decoded.
    Lost(u64),
}

impl Input {
    /// Opens a file and checks that the channel is there.
    ///
    /// # Errors
    /// Everything that stops the file from being read at all.
    pub(crate) fn open(path: &Path, channel: Channel) -> Result<Self> {
        let mut section = Section::find(open_file(path)?)?;
        let (frames, missing) = (section.frames, section.frames_missing);
        let remarks = section.remark.take().into_iter().collect();
        let stream = MediaSourceStream::new(Box::new(section), Default::default());
        let format = symphonia::default::get_probe()
            .probe(&Hint::new(), stream, FormatOptions::default(), Default::default())
            .map_err(|error| anyhow!("cannot be decoded: {error}"))?;
        let track = format.default_track(TrackType::Audio).context("holds no sound")?;
        let params = track.codec_params.as_ref().and_then(|params| params.audio());
        let params = params.context("holds no sound that can be decoded")?;
        let decoder = symphonia::default::get_codecs()
            .make_audio_decoder(params, &AudioDecoderOptions::default())
            .map_err(|error| anyhow!("cannot be decoded: {error}"))?;
        let sample_rate_hz = params.sample_rate.context("states no sample rate")?;
        let channels = params.channels.as_ref().map_or(0, |channels| channels.count());
        let mix = Mix::new(channel, channels)?;
        let clip = ClipCounter::new(params.bits_per_sample);
        Ok(Self {
            track: track.id,
            decoder,
            mix,
            planes: Vec::new(),
            clips: vec![clip; mix.planes().len()],
            sample_rate_hz,
            channels,
            frames: frames.or(track.num_frames),
            position: 0,
            pending: None,
            lost: 0,
            missing,
            remarks,
            format,
        })
    }

    /// Reads on; `None` at the end. The samples of the chosen channel replace what is in `out`.
    ///
    /// # Errors
    /// The file cannot be read any further.
    pub(crate) fn next_block(&mut self, out: &mut Vec<f32>) -> Result<Option<Block>> {
        while let Some(packet) = self.next_packet()? {
            let start = u64::try_from(packet.pts.get()).unwrap_or(0);
            let hole = start.saturating_sub(self.position);
            if start < self.position || !self.plausible(start, hole) {
                continue;
            }
            if hole > 0 {
                self.pending = Some(packet);
                self.lost += hole;
                self.position = start;
                return Ok(Some(Block::Lost(hole)));
            }
            if self.decode(&packet)? {
                self.mix.apply(&self.planes, out);
                return Ok(Some(Block::Samples));
            }
        }
        Ok(None)
    }

    /// Everything odd found so far, in words that follow "FILE: ".
    pub(crate) fn remarks(&self, read_to_end: bool) -> Vec<String> {
        let seconds = |frames: u64| frames as f64 / f64::from(self.sample_rate_hz);
        let mut remarks = self.remarks.clone();
        let all = self.frames.unwrap_or(self.position);
        let there = if read_to_end { self.position } else { all };
        let announced = all.max(there) + self.missing;
        if announced > there {
            let (there, announced) = (seconds(there), seconds(announced));
            remarks.push(format!(
                "truncated: only the first {there:.3} s of {announced:.3} s are there"
            ));
        }
        if self.lost > 0 {
            remarks.push(format!(
                "damaged: {:.3} s could not be decoded and are left out as gaps",
                seconds(self.lost)
            ));
        }
        let runs: u64 = self.clips.iter().map(|clip| clip.runs).sum();
        if runs > 0 {
            let places = if runs == 1 { "place" } else { "places" };
            remarks.push(format!(
                "clipped: the samples stay at full scale in {runs} {places}, which falsifies levels and partials"
            ));
        }
        remarks
    }

    fn next_packet(&mut self) -> Result<Option<Packet>> {
        if let Some(packet) = self.pending.take() {
            return Ok(Some(packet));
        }
        for _ in 0..DAMAGED_IN_A_ROW_MAX {
            match self.format.next_packet() {
                Ok(Some(packet)) if packet.track_id == self.track => return Ok(Some(packet)),
                // The reader has passed the damaged place; the next time stamp tells how much was lost.
                Ok(Some(_)) | Err(DecodeError::DecodeError(_)) => {}
                Ok(None) => return Ok(None),
                Err(DecodeError::IoError(error)) if error.kind() == ErrorKind::UnexpectedEof => {
                    return Ok(None);
                }
                Err(error) => bail!("cannot be read any further: {error}"),
            }
        }
        bail!("is damaged beyond reading")
    }

    /// Whether a time stamp can be right.
    fn plausible(&self, start: u64, hole: u64) -> bool {
        hole == 0 || self.frames.map_or(hole <= HOLE_FRAMES_MAX, |frames| start < frames)
    }

    /// Decodes into the planes; false when the packet is damaged.
    fn decode(&mut self, packet: &Packet) -> Result<bool> {
        let buffer = match self.decoder.decode(packet) {
            Ok(buffer) => buffer,
            Err(DecodeError::DecodeError(_) | DecodeError::IoError(_)) => return Ok(false),
            Err(error) => bail!("cannot be decoded any further: {error}"),
        };
        if buffer.num_planes() != self.channels || buffer.spec().rate() != self.sample_rate_hz {
            bail!("changes its number of channels or its sample rate on the way");
        }
        buffer.copy_to_vecs_planar(&mut self.planes);
        self.position += self.planes[0].len() as u64;
        for (clip, plane) in self.clips.iter_mut().zip(&self.planes[self.mix.planes()]) {
            clip.push(plane);
        }
        Ok(true)
    }
}

fn open_file(path: &Path) -> Result<File> {
    let kind = std::fs::metadata(path).map_err(|error| reason(&error))?;
    if !kind.is_file() {
        bail!("is not a regular file");
    }
    File::open(path).map_err(|error| reason(&error))
}

/// What the system says, in words that follow "FILE: ".
fn reason(error: &std::io::Error) -> anyhow::Error {
    match error.kind() {
        ErrorKind::NotFound => anyhow!("does not exist"),
        ErrorKind::PermissionDenied => anyhow!("cannot be read: permission denied"),
        _ => anyhow!("cannot be opened: {error}"),
    }
}
