//! FLAC (RFC 9639) carries its own framing, which the decoder reads; only one lie of its header matters.

use super::{Section, read_up_to};
use anyhow::Result;
use std::fs::File;
use std::io::{Seek as _, SeekFrom};

/// Marker, head of the first metadata block (its kind and three bytes of length), and the least and largest block size in it.
const HEAD_BYTES: usize = 12;

/// Some encoders count the last, short block of a stream of fixed block size into the least block size. The decoder
/// would take such a stream for one of variable block size, and find no frame in it.
pub(super) fn find(mut file: File) -> Result<Section> {
    let mut head = [0; HEAD_BYTES];
    let mut length = 0;
    file.rewind()?;
    if read_up_to(&mut file, &mut head)? == HEAD_BYTES
        && &head[..4] == b"fLaC"
        && has_fixed_blocks(&mut file)?
    {
        let (least, largest) = head[8..].split_at_mut(2);
        least.copy_from_slice(largest);
        length = HEAD_BYTES;
    }
    file.seek(SeekFrom::Start(length as u64))?;
    Ok(Section::unknown_length(head[..length].to_vec(), file))
}

/// Whether the first frame says that all blocks are of one size.
fn has_fixed_blocks(file: &mut File) -> Result<bool> {
    let mut position = 4;
    loop {
        let mut head = [0; 4];
        file.seek(SeekFrom::Start(position))?;
        if read_up_to(file, &mut head)? < head.len() {
            return Ok(false);
        }
        if head[0] == 0xff {
            // The frame's sync code is 14 bits; the last of the second byte tells variable from fixed.
            return Ok(head[1] & 1 == 0);
        }
        let [_, sizes @ ..] = head;
        position += 4 + u64::from(u32::from_be_bytes([0, sizes[0], sizes[1], sizes[2]]));
    }
}
