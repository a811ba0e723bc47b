//! What a revision of data would move, before it is adopted: each notebook sealed in memory on the old tables and audited
//! against the new ones.

use std::collections::BTreeMap;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use crate::data::records::Records;
use crate::fault::Fault;
use crate::notebook::audit::{AuditOptions, could_not_run, of_sealed};
use crate::notebook::file::{NotebookFile, bytes_of};
use crate::notebook::holdings::Holdings;
use crate::notebook::run::Source;
use crate::notebook::sealing::{Sealing, in_memory, read_seal};
use crate::notebook::trial::{Unwatched, trial};
use crate::notebook::verdict::{Against, NotebookAudit};
use crate::session::on_big_stack;
use crate::source::{Embedded, sha256};

/// Compares the values of one notebook under two holdings. Values under the old ones stand as sealed, those under the new
/// ones as today's.
pub fn compare_data(path: &Path, old: &Holdings, new: &Holdings, stop: &Arc<AtomicBool>) -> NotebookAudit {
    let file = path.display().to_string();
    let compared = on_big_stack(|| -> Result<NotebookAudit, Fault> {
        let notebook = NotebookFile::read(path)?;
        let seal = read_seal(&file, &notebook)?;
        let settings: BTreeMap<String, String> = (seal.into_iter().flat_map(|seal| seal.parameters))
            .filter_map(|parameter| Some((parameter.name, parameter.set?)))
            .collect();
        let cells = notebook.code_cells().into_iter().map(|cell| (cell.name, cell.source));
        let mut source = Source::Cells(cells.collect());
        let tried = trial(&file, &mut source, &settings, old, stop, &mut Unwatched)?;
        let made = in_memory(&notebook, &tried, &Sealing { settings, ..Sealing::default() }, old);
        let options =
            AuditOptions { today: new.clone(), strict_data: true, stop: Arc::clone(stop), ..AuditOptions::default() };
        of_sealed(&file, &notebook, &made, &options)
    });
    compared.unwrap_or_else(|fault| could_not_run(&file, Against::Nothing, "the file", &fault))
}

/// The shipped tables, with the table of a file in place of that of the same dataset.
///
/// # Errors
/// The file cannot be read, or holds no table.
pub fn revised_holdings(path: &Path) -> Result<Holdings, Fault> {
    let unusable = |why: String| {
        Fault::new(
            "revised-table-unusable",
            format!("cannot take {} for a table: {why}", path.display()),
            "give a table as those in stdlib/data, with its schema as the first member",
        )
    };
    let bytes = bytes_of(path).map_err(|error| unusable(error.to_string()))?;
    let name = path.display().to_string();
    let records = Records::read(&[Embedded { path: &name, bytes: &bytes, sha256: &sha256(&bytes) }])?;
    if records.tables.is_empty() {
        return Err(unusable("it names no schema".to_owned()));
    }
    let holdings = Holdings::of(Records::shipped().with_tables(&records));
    holdings.catalog()?;
    Ok(holdings)
}
