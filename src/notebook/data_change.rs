//! What a revision of data would move, before it is adopted: each notebook sealed in memory on the old tables and audited
//! against the new ones.

use std::collections::BTreeMap;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use crate::fault::Fault;
use crate::notebook::audit::{AuditOptions, could_not_run, of_sealed};
use crate::notebook::file::NotebookFile;
use crate::notebook::holdings::Holdings;
use crate::notebook::run::Source;
use crate::notebook::sealing::{Sealing, in_memory, read_seal};
use crate::notebook::trial::{Unwatched, trial};
use crate::notebook::verdict::{Against, NotebookAudit};
use crate::session::on_big_stack;

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
