//! Text on its way to the terminal: waiting in memory while small, in an unnamed temporary file when large, so that
//! results come out in the order of the files whatever the order in which they are ready.

use anyhow::{Context as _, Result};
use std::io::{self, BufReader, Seek as _, Write};
use tempfile::SpooledTempFile;

/// Text kept in memory at most, per spool.
const IN_MEMORY_BYTES: usize = 64 << 10;

/// Text to be printed later.
#[derive(Debug)]
pub(crate) struct Spool {
    parts: Vec<SpooledTempFile>,
}

impl Spool {
    pub(crate) fn new() -> Self {
        Self { parts: vec![SpooledTempFile::new(IN_MEMORY_BYTES)] }
    }

    /// Puts another spool's text behind what is there, without copying it.
    pub(crate) fn append(&mut self, other: Self) {
        self.parts.extend(other.parts);
        self.parts.push(SpooledTempFile::new(IN_MEMORY_BYTES));
    }

    /// Copies the text out.
    ///
    /// # Errors
    /// Reading the temporary file, or writing.
    pub(crate) fn print(self, out: &mut impl Write) -> io::Result<()> {
        for mut part in self.parts {
            part.rewind()?;
            io::copy(&mut BufReader::new(part), out)?;
        }
        out.flush()
    }
}

impl Write for Spool {
    fn write(&mut self, text: &[u8]) -> io::Result<usize> {
        self.parts.last_mut().map_or(Ok(0), |part| part.write(text))
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

/// Writes text that cannot fail but for the temporary file.
///
/// # Errors
/// The temporary file fails.
pub(crate) fn write(spool: &mut Spool, text: std::fmt::Arguments<'_>) -> Result<()> {
    spool.write_fmt(text).context("cannot write a temporary file")
}
