//! What is to be done with each notebook of an archive, as the program tells its worker processes and its state file.

use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use serde::{Deserialize, Serialize};

use crate::fault::Fault;
use crate::notebook::audit::{AuditOptions, audit_one};
use crate::notebook::data_change::{compare_data, revised_holdings, table_bytes};
use crate::notebook::holdings::Holdings;
use crate::notebook::seal::Engine;
use crate::notebook::sealing::engine_now;
use crate::notebook::signature::TrustedKey;
use crate::notebook::verdict::NotebookAudit;
use crate::source::sha256;
use crate::units::constants;

/// The order, and the program that it was given to: two audits by equal orders of equal files say the same.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Order {
    pub program: Engine,
    pub task: Task,
}

/// What is to be done.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Task {
    /// Compare with the seals.
    Audit {
        strict_data: bool,
        from_sources: bool,
        /// CODATA year of the set that is taken for today's.
        constants: u16,
        trusted: Vec<TrustedKey>,
        strict_signature: bool,
    },
    /// Compare two editions of a table.
    Revision { old: Table, new: Table },
}

/// A table in a file, or a shipped one by the id of its dataset.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Table {
    pub path: PathBuf,
    pub sha256: String,
}

impl Table {
    /// # Errors
    /// The file cannot be read.
    pub fn at(path: &Path) -> Result<Table, Fault> {
        Ok(Table { sha256: sha256(&table_bytes(path)?), path: path.to_owned() })
    }
}

/// An order with everything read that it names.
pub enum Prepared {
    Audit(Box<AuditOptions>),
    Revision { old: Holdings, new: Holdings, stop: Arc<AtomicBool> },
}

impl Order {
    /// To this program.
    pub fn now(task: Task) -> Order {
        Order { program: engine_now(), task }
    }

    /// Reads what the order names.
    ///
    /// # Errors
    /// There is no such constant set, or a table cannot be used.
    pub fn prepared(&self) -> Result<Prepared, Fault> {
        Ok(match &self.task {
            Task::Audit { strict_data, from_sources, constants: year, trusted, strict_signature } => {
                let set = constants::set(*year).ok_or_else(|| unknown_year(*year))?;
                let today = Holdings::shipped().with_constants(set);
                Prepared::Audit(Box::new(AuditOptions {
                    today,
                    strict_data: *strict_data,
                    from_sources: *from_sources,
                    trusted: trusted.clone(),
                    strict_signature: *strict_signature,
                    stop: Arc::default(),
                }))
            }
            Task::Revision { old, new } => {
                let (old, new) = revised_holdings(&old.path, &new.path)?;
                Prepared::Revision { old, new, stop: Arc::default() }
            }
        })
    }
}

impl Prepared {
    /// Does it with one notebook.
    pub fn done_with(&self, path: &Path) -> NotebookAudit {
        match self {
            Prepared::Audit(options) => audit_one(path, options),
            Prepared::Revision { old, new, stop } => compare_data(path, old, new, stop),
        }
    }
}

fn unknown_year(year: u16) -> Fault {
    let known: Vec<String> = constants::years().map(|year| year.to_string()).collect();
    Fault::new(
        "constant-set-unknown",
        format!("there is no constant set of {year}"),
        format!("choose one of {}", known.join(", ")),
    )
}
