//! Reader of sound banks in the published SF2 format (a RIFF file; technical specification 2.04, 2006, sections 4 to 8): the
//! recorded samples, and how each zone of each preset plays them.

mod riff;
mod zones;

use std::collections::BTreeMap;
use std::fmt;

pub use zones::Zone;

use riff::{Chunks, Record};

/// A sample of the bank.
#[derive(Debug, Clone)]
pub struct Sample {
    /// Name in the bank.
    pub name: String,
    /// Sample rate in Hz.
    pub sample_rate_hz: f64,
    /// The samples, 16 bits.
    pub samples: Vec<i16>,
    /// First sample of the loop and the one after its last; empty or out of range for a sample without loop.
    pub loop_points: (usize, usize),
    /// MIDI key at which the sample sounds at its own rate; 255 for a sound without pitch.
    pub root_key: u8,
    /// Correction that the player adds to the pitch, in cents.
    pub correction_cents: i8,
    /// The zones that play it.
    pub zones: Vec<Zone>,
}

/// Why a bank could not be read.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct BankError(String);

impl fmt::Display for BankError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "not a readable sound bank: {}", self.0)
    }
}

impl std::error::Error for BankError {}

/// Reads all samples of a bank from its bytes.
///
/// # Errors
/// Bytes that are no sound bank, or one whose tables point outside it.
pub fn read(bytes: &[u8]) -> Result<Vec<Sample>, BankError> {
    let chunks = Chunks::read(bytes)?;
    let pcm = chunks.get("smpl")?;
    let mut zones = zones::by_sample(&chunks)?;
    let headers = chunks.records("shdr", 46)?;
    // The last header only marks the end.
    let count = headers.len().saturating_sub(1);
    (0..count)
        .map(|index| sample(headers.at(index)?, pcm, zones.remove(&index).unwrap_or_default()))
        .collect()
}

fn sample(header: Record<'_>, pcm: &[u8], zones: Vec<Zone>) -> Result<Sample, BankError> {
    let start = header.size(20)?;
    let end = header.size(24)?;
    let bytes = pcm
        .get(start * 2..end * 2)
        .ok_or_else(|| BankError(format!("sample from {start} to {end} is outside the data")))?;
    Ok(Sample {
        name: header.name()?,
        sample_rate_hz: f64::from(header.u32(36)?),
        samples: bytes.chunks_exact(2).map(|pair| i16::from_le_bytes([pair[0], pair[1]])).collect(),
        loop_points: (
            header.size(28)?.saturating_sub(start),
            header.size(32)?.saturating_sub(start),
        ),
        root_key: header.u8(40)?,
        correction_cents: header.i8(41)?,
        zones,
    })
}

/// Zones by the index of the sample they play.
type ZonesBySample = BTreeMap<usize, Vec<Zone>>;
