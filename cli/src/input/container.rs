//! Finds the sound in a file without believing its header.
//!
//! Recorders that lose power leave sizes of zero, copies break off, and editors write odd extra chunks, so the chunk list
//! is walked against what the file really holds. The decoder then gets a [`Section`]: a minimal header of our own,
//! followed by the sound data and nothing else. Sizes of 64 bits (RF64, BW64) come for free that way.

mod aiff;
mod flac;
mod wav;

use anyhow::{Context as _, Result, bail};
use std::fs::File;
use std::io::{Cursor, Read, Seek, SeekFrom, Take};
use symphonia::core::io::MediaSource;

/// Most channels the decoder can lay out.
const CHANNELS_MAX: u16 = 26;
/// Largest chunk of format description read; honest ones have at most a few hundred bytes.
const FORMAT_BYTES_MAX: u64 = 1024;

/// A header of our own and the sound data of a file, read as one stream.
#[derive(Debug)]
pub(crate) struct Section {
    stream: std::io::Chain<Cursor<Vec<u8>>, Take<File>>,
    /// Whole frames (one sample of each channel) of sound data in the file; `None` where only the decoder can know.
    pub(crate) frames: Option<u64>,
    /// Frames that the header states, when it states more than there are.
    pub(crate) frames_missing: u64,
    /// What else was odd.
    pub(crate) remark: Option<String>,
}

/// What a chunk walk found out about the sound data.
struct SoundData {
    start: u64,
    /// Bytes stated; `None` when the header leaves it open.
    stated: Option<u64>,
    /// Bytes of one frame.
    frame: u64,
}

impl Section {
    /// Recognises a file by its first bytes.
    ///
    /// # Errors
    /// An unreadable, empty or unknown file, or a header without which nothing can be read.
    pub(crate) fn find(mut file: File) -> Result<Self> {
        let length = file.metadata()?.len();
        if length == 0 {
            bail!("is empty");
        }
        let mut start = [0; 12];
        let got = read_up_to(&mut file, &mut start)?;
        match (&start[..4], &start[8..]) {
            (b"RIFF" | b"RF64" | b"BW64", b"WAVE") => wav::find(file, length),
            (b"FORM", b"AIFF" | b"AIFC") => aiff::find(file, length, &start[8..]),
            // Some taggers put their block before the marker.
            (b"fLaC" | [b'I', b'D', b'3', _], _) => flac::find(file),
            (b"RIFF" | b"RF64" | b"BW64" | b"FORM", _) if got < 12 => {
                bail!("ends within its header")
            }
            _ => bail!("is not a WAV, AIFF or FLAC file"),
        }
    }

    /// A header of our own, then the file from where it stands.
    fn unknown_length(header: Vec<u8>, file: File) -> Self {
        let stream = Cursor::new(header).chain(file.take(u64::MAX));
        Self { stream, frames: None, frames_missing: 0, remark: None }
    }

    fn new(header: Vec<u8>, mut file: File, file_length: u64, data: &SoundData) -> Result<Self> {
        let present = file_length.saturating_sub(data.start);
        let stated = data.stated.unwrap_or(present);
        let frames = present.min(stated) / data.frame;
        file.seek(SeekFrom::Start(data.start))?;
        let stream = Cursor::new(header).chain(file.take(frames * data.frame));
        let frames_missing = stated / data.frame - frames;
        Ok(Self { stream, frames: Some(frames), frames_missing, remark: None })
    }
}

impl Read for Section {
    fn read(&mut self, buffer: &mut [u8]) -> std::io::Result<usize> {
        self.stream.read(buffer)
    }
}

impl Seek for Section {
    fn seek(&mut self, _: SeekFrom) -> std::io::Result<u64> {
        Err(std::io::ErrorKind::Unsupported.into())
    }
}

impl MediaSource for Section {
    fn is_seekable(&self) -> bool {
        false
    }

    fn byte_len(&self) -> Option<u64> {
        None
    }
}

/// A chunk's head: its name, and where its body lies.
struct Chunk {
    name: [u8; 4],
    start: u64,
    size: u32,
}

impl Chunk {
    /// Reads the head at `position`; `None` where the file ends before or within it.
    fn at(file: &mut File, position: u64, size: fn([u8; 4]) -> u32) -> Result<Option<Self>> {
        file.seek(SeekFrom::Start(position))?;
        let mut head = [0; 8];
        if read_up_to(file, &mut head)? < head.len() {
            return Ok(None);
        }
        let [a, b, c, d, sizes @ ..] = head;
        Ok(Some(Self { name: [a, b, c, d], start: position + 8, size: size(sizes) }))
    }

    /// Where the next chunk starts: chunks lie on even positions.
    fn next(&self) -> u64 {
        self.start + u64::from(self.size) + u64::from(self.size & 1)
    }

    /// Reads the start of the body, at most [`FORMAT_BYTES_MAX`] bytes and at least `needed`.
    fn body(&self, file: &mut File, needed: usize) -> Result<Vec<u8>> {
        let name = String::from_utf8_lossy(&self.name).into_owned();
        let mut body = Vec::new();
        file.seek(SeekFrom::Start(self.start))?;
        file.take(u64::from(self.size).min(FORMAT_BYTES_MAX)).read_to_end(&mut body)?;
        if body.len() < needed {
            bail!(
                "has a header that cannot be right: its '{}' chunk is too short",
                name.trim_end()
            );
        }
        Ok(body)
    }
}

/// Checks what a header says of channels and sample size, and gives the bytes of a frame.
fn frame_bytes(channels: u16, bits: u16) -> Result<u64> {
    if channels == 0 || bits == 0 {
        bail!("has a header that cannot be right: {channels} channels of {bits} bits");
    }
    if channels > CHANNELS_MAX {
        bail!("has {channels} channels; at most {CHANNELS_MAX} can be read");
    }
    Ok(u64::from(channels) * u64::from(bits.div_ceil(8)))
}

fn read_up_to(file: &mut File, buffer: &mut [u8]) -> Result<usize> {
    let mut filled = 0;
    while filled < buffer.len() {
        match file.read(&mut buffer[filled..]).context("cannot be read")? {
            0 => break,
            count => filled += count,
        }
    }
    Ok(filled)
}
