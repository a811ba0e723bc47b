//! The audits of an archive as one JSON document for other programs.
//!
//! `format` names the shape, and another shape takes another version. Figures are decimal texts that read back as the same
//! doubles, as in seals; counts are integers.

use std::io::Write;

use crate::archive::audits::Audits;
use crate::archive::report::{About, unwritable};
use crate::archive::tally::Tally;
use crate::fault::Fault;

/// Name and version of this shape.
pub const FORMAT: &str = "hessbook-audit/1";

pub(super) fn write(audits: &dyn Audits, tally: &Tally, about: &About, out: &mut dyn Write) -> Result<(), Fault> {
    let failed = |why: serde_json::Error| unwritable(why.into());
    write!(out, "{{\"format\":\"{FORMAT}\",\n\"about\":").map_err(unwritable)?;
    serde_json::to_writer(&mut *out, about).map_err(failed)?;
    out.write_all(b",\n\"tally\":").map_err(unwritable)?;
    serde_json::to_writer(&mut *out, tally).map_err(failed)?;
    out.write_all(b",\n\"notebooks\":[").map_err(unwritable)?;
    let mut before = "\n";
    audits.each(&mut |audit| {
        out.write_all(before.as_bytes()).map_err(unwritable)?;
        before = ",\n";
        serde_json::to_writer(&mut *out, audit).map_err(failed)
    })?;
    out.write_all(b"\n]}\n").map_err(unwritable)
}
