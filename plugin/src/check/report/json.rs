//! The report as JSON: the results under the names that the command line's JSON gives them.

use std::io;

use plumbtone_analysis::VERSION;
use serde::Serialize;
use serde_json::Serializer;
use serde_json::ser::Formatter;

use super::super::result::CheckResult;
use super::{CAUTION, Job};

#[derive(Serialize)]
struct Report<'a> {
    name: &'a str,
    written: String,
    engine_version: &'a str,
    caution: &'a str,
    results: &'a [CheckResult],
}

/// All of it.
pub(super) fn text(job: &Job) -> io::Result<String> {
    let report = Report {
        name: job.place.title(),
        written: job.place.stamp(),
        engine_version: VERSION,
        caution: CAUTION,
        results: &job.results,
    };
    let mut text = Vec::new();
    report.serialize(&mut Serializer::with_formatter(&mut text, Lines::default()))?;
    text.push(b'\n');
    String::from_utf8(text).map_err(io::Error::other)
}

/// A field a line, as far as objects go; lists of numbers stay on theirs.
#[derive(Debug, Default)]
struct Lines {
    depth: usize,
}

impl Lines {
    fn begin(&self, writer: &mut (impl io::Write + ?Sized)) -> io::Result<()> {
        write!(writer, "\n{:1$}", "", 2 * self.depth)
    }
}

impl Formatter for Lines {
    fn begin_object<W: ?Sized + io::Write>(&mut self, writer: &mut W) -> io::Result<()> {
        self.depth += 1;
        writer.write_all(b"{")
    }

    fn end_object<W: ?Sized + io::Write>(&mut self, writer: &mut W) -> io::Result<()> {
        self.depth -= 1;
        self.begin(writer)?;
        writer.write_all(b"}")
    }

    fn begin_object_key<W: ?Sized + io::Write>(
        &mut self,
        writer: &mut W,
        first: bool,
    ) -> io::Result<()> {
        if !first {
            writer.write_all(b",")?;
        }
        self.begin(writer)
    }

    fn begin_object_value<W: ?Sized + io::Write>(&mut self, writer: &mut W) -> io::Result<()> {
        writer.write_all(b": ")
    }
}
