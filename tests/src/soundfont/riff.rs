//! The RIFF layer of a sound bank: named chunks, and chunks as tables of fixed-size little-endian records.

use std::collections::BTreeMap;

use super::BankError;

/// The innermost chunks of a bank, by name.
pub(super) struct Chunks<'a>(BTreeMap<String, &'a [u8]>);

impl<'a> Chunks<'a> {
    pub(super) fn read(bytes: &'a [u8]) -> Result<Self, BankError> {
        if bytes.get(..4) != Some(b"RIFF") || bytes.get(8..12) != Some(b"sfbk") {
            return Err(BankError("it does not begin with RIFF and sfbk".to_owned()));
        }
        let lists = split(&bytes[12..])?;
        let mut chunks = BTreeMap::new();
        for (_, list) in lists.into_iter().filter(|(name, _)| name == "LIST") {
            chunks.extend(split(list.get(4..).unwrap_or_default())?);
        }
        Ok(Self(chunks))
    }

    pub(super) fn get(&self, name: &str) -> Result<&'a [u8], BankError> {
        self.0.get(name).copied().ok_or_else(|| BankError(format!("it has no chunk {name}")))
    }

    pub(super) fn records(&self, name: &str, size: usize) -> Result<Records<'a>, BankError> {
        Ok(Records { bytes: self.get(name)?, size })
    }
}

fn split(mut bytes: &[u8]) -> Result<Vec<(String, &[u8])>, BankError> {
    let mut chunks = Vec::new();
    while bytes.len() >= 8 {
        let name = String::from_utf8_lossy(&bytes[..4]).into_owned();
        let size = Record(bytes).size(4)?;
        let body = bytes
            .get(8..8 + size)
            .ok_or_else(|| BankError(format!("chunk {name} is longer than the file")))?;
        chunks.push((name, body));
        // Chunks start at even offsets.
        bytes = bytes.get(8 + size + size % 2..).unwrap_or_default();
    }
    Ok(chunks)
}

/// A chunk as a table.
#[derive(Clone, Copy)]
pub(super) struct Records<'a> {
    bytes: &'a [u8],
    size: usize,
}

impl<'a> Records<'a> {
    pub(super) fn len(self) -> usize {
        self.bytes.len() / self.size
    }

    pub(super) fn at(self, index: usize) -> Result<Record<'a>, BankError> {
        self.bytes
            .get(index * self.size..(index + 1) * self.size)
            .map(Record)
            .ok_or_else(|| BankError(format!("a table ends before entry {index}")))
    }
}

/// One entry of a table; values are read at byte offsets.
#[derive(Clone, Copy)]
pub(super) struct Record<'a>(&'a [u8]);

impl Record<'_> {
    pub(super) fn name(self) -> Result<String, BankError> {
        let bytes = self.array::<20>(0)?;
        let text = bytes.split(|&b| b == 0).next().unwrap_or_default();
        Ok(String::from_utf8_lossy(text).trim().to_owned())
    }

    pub(super) fn u8(self, offset: usize) -> Result<u8, BankError> {
        self.array::<1>(offset).map(u8::from_le_bytes)
    }

    pub(super) fn i8(self, offset: usize) -> Result<i8, BankError> {
        self.array(offset).map(i8::from_le_bytes)
    }

    pub(super) fn u16(self, offset: usize) -> Result<u16, BankError> {
        self.array(offset).map(u16::from_le_bytes)
    }

    pub(super) fn i16(self, offset: usize) -> Result<i16, BankError> {
        self.array(offset).map(i16::from_le_bytes)
    }

    pub(super) fn u32(self, offset: usize) -> Result<u32, BankError> {
        self.array(offset).map(u32::from_le_bytes)
    }

    /// A 32-bit size or index.
    pub(super) fn size(self, offset: usize) -> Result<usize, BankError> {
        let value = self.u32(offset)?;
        usize::try_from(value).map_err(|error| BankError(error.to_string()))
    }

    fn array<const N: usize>(self, offset: usize) -> Result<[u8; N], BankError> {
        self.0
            .get(offset..offset + N)
            .and_then(|bytes| bytes.try_into().ok())
            .ok_or_else(|| BankError("an entry is cut short".to_owned()))
    }
}
