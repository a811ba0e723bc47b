//! What a revision of data would move, before it is adopted: each notebook sealed in memory on the old tables and audited
//! against the new ones.

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use crate::data::records::{RecordTable, Records};
use crate::data::revision;
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

/// The shipped tables with `old` in place of the one of its dataset, and with `new` in the place of `old`. Each is a file,
/// or the id of a shipped dataset.
///
/// # Errors
/// One cannot be read or is no table, the old one is in no shipped table's place, or the two are not of one kind.
pub fn revised_holdings(old: &Path, new: &Path) -> Result<(Holdings, Holdings), Fault> {
    let shipped = Records::shipped();
    let (old_table, new_table) = (table_of(old)?, table_of(new)?);
    if old_table.schema != new_table.schema {
        return Err(Fault::new(
            "revised-tables-differ-in-kind",
            format!(
                "{} cannot take the place of {}: its schema is {}, that of the other {}",
                new.display(),
                old.display(),
                new_table.schema,
                old_table.schema
            ),
            "give two tables of one schema, the old one and its new edition",
        ));
    }
    if !shipped.stands_for(&old_table) {
        let known: Vec<&str> = shipped.tables.iter().map(|table| &*table.dataset).filter(|id| !id.is_empty()).collect();
        return Err(unusable(
            old,
            &format!(
                "it stands for no table in use, being of the schema {} and the dataset `{}`",
                old_table.schema, old_table.dataset
            ),
            &format!(
                "name the old table by its file or by the id of its dataset; in use are {}",
                known.iter().collect::<BTreeSet<_>>().into_iter().copied().collect::<Vec<_>>().join(", ")
            ),
        ));
    }
    let holdings = [
        Holdings::of(shipped.with_new_edition(&old_table, &old_table)),
        Holdings::of(shipped.with_new_edition(&old_table, &new_table)),
    ];
    for made in &holdings {
        made.catalog()?;
    }
    let [old, new] = holdings;
    Ok((old, new))
}

/// What a name on the command line stands for: the bytes of the table of that dataset, else of that file.
///
/// # Errors
/// The file cannot be read.
pub fn table_bytes(name: &Path) -> Result<Vec<u8>, Fault> {
    match name.to_str().and_then(revision::shipped_file) {
        Some(shipped) => Ok(shipped.bytes.to_vec()),
        None => bytes_of(name).map_err(|error| {
            let ids = "or the id of a shipped dataset of formation enthalpies, such as atct-1.112";
            unusable(name, &error.to_string(), &format!("give a table as those in stdlib/data, {ids}"))
        }),
    }
}

fn table_of(name: &Path) -> Result<RecordTable, Fault> {
    let bytes = table_bytes(name)?;
    let path = name.display().to_string();
    let read = Records::read(&[Embedded { path: &path, bytes: &bytes, sha256: &sha256(&bytes) }])?;
    let hint = "give a table as those in stdlib/data, with its schema as the first member";
    read.tables.into_iter().next().ok_or_else(|| unusable(name, "it names no schema", hint))
}

fn unusable(name: &Path, why: &str, hint: &str) -> Fault {
    Fault::new("revised-table-unusable", format!("cannot take {} for a table: {why}", name.display()), hint)
}
