//! The chunk walk of AIFF and AIFF-C (Apple, "Audio Interchange File Format", 1.3, 1989; AIFF-C draft, 1991).

use super::{Chunk, Section, SoundData, frame_bytes};
use anyhow::{Context as _, Result};
use std::fs::File;

/// Offset and block size, which stand before the sound data within its chunk.
const SOUND_HEAD_BYTES: u64 = 8;

pub(super) fn find(mut file: File, file_length: u64, form: &[u8]) -> Result<Section> {
    let compressed = form == b"AIFC";
    let mut common = None;
    let mut sound = None;
    let mut position = 12;
    // The two chunks may stand in either order.
    while common.is_none() || sound.is_none() {
        let Some(chunk) = Chunk::at(&mut file, position, u32::from_be_bytes)? else { break };
        match &chunk.name {
            b"COMM" => {
                let needed = if compressed { 22 } else { 18 };
                common = Some(Common::parse(&chunk.body(&mut file, needed)?)?);
            }
            b"SSND" => {
                let head = chunk.body(&mut file, 8)?;
                let offset = u64::from(u32::from_be_bytes([head[0], head[1], head[2], head[3]]));
                let skipped = SOUND_HEAD_BYTES + offset;
                sound =
                    Some((chunk.start + skipped, u64::from(chunk.size).saturating_sub(skipped)));
            }
            _ => {}
        }
        position = chunk.next();
    }
    let common = common.context("has no description of its sound (no COMM chunk)")?;
    let (start, chunk_bytes) = sound.context("holds no sound data (no SSND chunk)")?;
    let described = common.frames * common.frame;
    // An unfinished header describes no frames; the chunk then says how much there is.
    let stated = if described == 0 { chunk_bytes } else { described };
    let data = SoundData { start, stated: Some(stated), frame: common.frame };
    Section::new(common.header(compressed), file, file_length, &data)
}

struct Common {
    /// The chunk as it stands, without the name of the coding.
    body: Vec<u8>,
    frames: u64,
    frame: u64,
}

impl Common {
    fn parse(body: &[u8]) -> Result<Self> {
        let channels = u16::from_be_bytes([body[0], body[1]]);
        let frames = u32::from_be_bytes([body[2], body[3], body[4], body[5]]);
        let bits = u16::from_be_bytes([body[6], body[7]]);
        let frame = frame_bytes(channels, bits)?;
        Ok(Self { body: body.to_vec(), frames: u64::from(frames), frame })
    }

    /// A header with these facts and sizes as large as the format can say.
    fn header(&self, compressed: bool) -> Vec<u8> {
        let mut common = self.body[..if compressed { 22 } else { 18 }].to_vec();
        if compressed {
            // An empty name of the coding, padded.
            common.extend([0, 0]);
        }
        let common_size = if compressed { 24_u32 } else { 18 };
        // The form holds its type, both chunk heads and both bodies.
        let sound_size = (u32::MAX - 4 - 8 - common_size - 8) & !1;
        let mut header = Vec::with_capacity(64);
        header.extend(b"FORM");
        header.extend(u32::MAX.to_be_bytes());
        header.extend(if compressed { b"AIFC" } else { b"AIFF" });
        header.extend(b"COMM");
        header.extend(common_size.to_be_bytes());
        header.extend(common);
        header.extend(b"SSND");
        header.extend(sound_size.to_be_bytes());
        header.extend([0; 8]);
        header
    }
}
