//! The chunk walk of WAV (Microsoft/IBM, "Multimedia Programming Interface and Data Specifications 1.0", 1991, with
//! `WAVE_FORMAT_EXTENSIBLE`) and of its 64-bit forms (EBU Tech 3306, ITU-R BS.2088).

use super::{Chunk, Section, SoundData, frame_bytes};
use anyhow::{Context as _, Result, bail};
use std::fs::File;

const FORMAT_PCM: u16 = 1;
const FORMAT_FLOAT: u16 = 3;
const FORMAT_EXTENSIBLE: u16 = 0xfffe;
/// The size field of a 64-bit file or an endless stream: look elsewhere.
const SIZE_ELSEWHERE: u32 = u32::MAX;

pub(super) fn find(mut file: File, file_length: u64) -> Result<Section> {
    let mut format = None;
    let mut long_data_size = None;
    let mut position = 12;
    while let Some(chunk) = Chunk::at(&mut file, position, u32::from_le_bytes)? {
        match &chunk.name {
            b"fmt " => format = Some(Format::parse(&chunk.body(&mut file, 16)?)?),
            b"ds64" => long_data_size = u64_at(&chunk.body(&mut file, 16)?, 8),
            b"data" => {
                let format = format.context("has no format description before its sound data")?;
                return section(file, file_length, &chunk, &format, long_data_size);
            }
            _ => {}
        }
        position = chunk.next();
    }
    bail!("holds no sound data: its header ends at byte {}", position.min(file_length))
}

fn section(
    mut file: File,
    file_length: u64,
    data: &Chunk,
    format: &Format,
    long_data_size: Option<u64>,
) -> Result<Section> {
    let after = file_length.saturating_sub(data.next());
    let rest_is_chunks = after < 8 || rest_is_chunks(&mut file, data.next(), file_length)?;
    let (stated, remark) = match (data.size, long_data_size) {
        (SIZE_ELSEWHERE, size) => (size, None),
        (0, _) if !rest_is_chunks => {
            (None, Some("the header was never completed: measured up to the file's end".to_owned()))
        }
        (size, _) if !rest_is_chunks => (
            Some(u64::from(size)),
            Some(format!(
                "{after} bytes behind the sound data that the header announces were not read"
            )),
        ),
        (size, _) => (Some(u64::from(size)), None),
    };
    let sound = SoundData { start: data.start, stated, frame: format.frame };
    let mut section = Section::new(format.header(), file, file_length, &sound)?;
    section.remark = remark;
    Ok(section)
}

/// Whether what follows the sound data is a list of chunks, and not more sound.
fn rest_is_chunks(file: &mut File, mut position: u64, file_length: u64) -> Result<bool> {
    while let Some(chunk) = Chunk::at(file, position, u32::from_le_bytes)? {
        if !chunk.name.iter().all(|byte| (b' '..=b'~').contains(byte)) {
            return Ok(false);
        }
        position = chunk.next();
    }
    // The last chunk may lack its padding byte.
    Ok(position <= file_length + 1)
}

/// What the format description says, its extensible form resolved to the plain one.
struct Format {
    tag: u16,
    channels: u16,
    sample_rate_hz: u32,
    bits: u16,
    frame: u64,
}

impl Format {
    fn parse(body: &[u8]) -> Result<Self> {
        let u16_at = |at: usize| body.get(at..at + 2).map(|b| u16::from_le_bytes([b[0], b[1]]));
        let required = |at| u16_at(at).context("has a format description that is too short");
        let tag = match required(0)? {
            // The sub-format's identifier starts with the plain tag.
            FORMAT_EXTENSIBLE => required(24)?,
            tag => tag,
        };
        if tag != FORMAT_PCM && tag != FORMAT_FLOAT {
            bail!(
                "is coded in a way that is not supported (WAV format {tag:#06x}); PCM and float are"
            );
        }
        let (channels, bits) = (required(2)?, required(14)?);
        let frame = frame_bytes(channels, bits)?;
        let sample_rate_hz = u32::from_le_bytes([body[4], body[5], body[6], body[7]]);
        Ok(Self { tag, channels, sample_rate_hz, bits, frame })
    }

    /// A header with these facts and open sizes.
    fn header(&self) -> Vec<u8> {
        let frame = u32::try_from(self.frame).unwrap_or(u32::MAX);
        let mut header = Vec::with_capacity(44);
        header.extend(b"RIFF");
        header.extend(SIZE_ELSEWHERE.to_le_bytes());
        header.extend(b"WAVEfmt ");
        header.extend(16_u32.to_le_bytes());
        header.extend(self.tag.to_le_bytes());
        header.extend(self.channels.to_le_bytes());
        header.extend(self.sample_rate_hz.to_le_bytes());
        header.extend(self.sample_rate_hz.wrapping_mul(frame).to_le_bytes());
        header.extend(u16::try_from(frame).unwrap_or(u16::MAX).to_le_bytes());
        header.extend(self.bits.to_le_bytes());
        header.extend(b"data");
        header.extend(SIZE_ELSEWHERE.to_le_bytes());
        header
    }
}

fn u64_at(body: &[u8], at: usize) -> Option<u64> {
    let bytes = body.get(at..at + 8)?;
    Some(u64::from_le_bytes(bytes.try_into().ok()?))
}
