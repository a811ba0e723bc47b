//! `hessbook data compare OLD NEW --archive PATH`: what a revised table would move in an archive, before it is adopted.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use crate::data::records::Records;
use crate::fault::Fault;
use crate::notebook::audit_text;
use crate::notebook::data_change::compare_data;
use crate::notebook::holdings::Holdings;
use crate::notebook::verdict::{AuditStatus, Verdict};
use crate::source::{Embedded, sha256};

use super::{Done, notebooks_below, out, stopped_by_interrupt};

/// Audits each notebook of an archive on the new table against the old one; both take the place of the shipped table of
/// their dataset.
pub(super) fn compare(old: &Path, new: &Path, archive: &[PathBuf]) -> Done {
    let (old, new, stop) = (holdings(old)?, holdings(new)?, stopped_by_interrupt());
    let (mut worst, mut count, mut moving) = (AuditStatus::Same, 0, 0);
    for path in archive.iter().flat_map(|path| notebooks_below(path)) {
        let audit = compare_data(&path, &old, &new, &stop);
        worst = worst.max(audit.status);
        count += audit.values.len();
        moving += audit.values.iter().filter(|value| value.under_today.verdict != Verdict::Identical).count();
        out(&audit_text::data_change(&audit));
    }
    out(&format!("{moving} of {count} reported values would change\n"));
    Ok(ExitCode::from(worst.exit()))
}

fn holdings(path: &Path) -> Result<Holdings, Fault> {
    let unusable = |why: String| {
        Fault::new(
            "revised-table-unusable",
            format!("cannot take {} for a table: {why}", path.display()),
            "give a table as those in stdlib/data, with its schema as the first member",
        )
    };
    let bytes = std::fs::read(path).map_err(|error| unusable(error.to_string()))?;
    let name = path.display().to_string();
    let records = Records::read(&[Embedded { path: &name, bytes: &bytes, sha256: &sha256(&bytes) }])?;
    if records.tables.is_empty() {
        return Err(unusable("it names no schema".to_owned()));
    }
    let holdings = Holdings::of(Records::shipped().with_tables(&records));
    holdings.catalog()?;
    Ok(holdings)
}
