//! `hessbook data`: what tables say, and what a revision of them would do.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Args, Subcommand};

use crate::data::records::Records;
use crate::fault::Fault;
use crate::notebook::audit_text;
use crate::notebook::data_change::compare_data;
use crate::notebook::holdings::Holdings;
use crate::notebook::verdict::{AuditStatus, Verdict};
use crate::source::{Embedded, sha256};

use super::{Done, notebooks_below, out, stopped_by_interrupt};

/// Look into tables of data.
#[derive(Args)]
pub struct Data {
    #[command(subcommand)]
    command: DataCommand,
}

#[derive(Subcommand)]
enum DataCommand {
    /// Tell which reported values of an archive a revision of a table would move, and by how much
    ///
    /// Exit status: 0 when none would move, 1 when one would, 2 when a notebook could not be run.
    Compare {
        /// The table in use, a .json file as those shipped; its dataset takes the place of the shipped one
        old: PathBuf,
        /// The revised table
        new: PathBuf,
        /// A notebook, or a folder of notebooks
        #[arg(long, value_name = "PATH", required = true)]
        archive: Vec<PathBuf>,
    },
}

impl Data {
    pub(super) fn run(self) -> Done {
        let DataCommand::Compare { old, new, archive } = self.command;
        let holdings = |path: &Path| -> Result<Holdings, Fault> {
            let holdings = Holdings::of(Records::shipped().with_tables(&table(path)?));
            holdings.catalog()?;
            Ok(holdings)
        };
        let (old, new, stop) = (holdings(&old)?, holdings(&new)?, stopped_by_interrupt());
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
}

fn table(path: &Path) -> Result<Records, Fault> {
    let unreadable = |why: String| {
        Fault::new(
            "data-file-unreadable",
            format!("cannot read {}: {why}", path.display()),
            "give a table as those in stdlib/data, with its schema as the first member",
        )
    };
    let bytes = std::fs::read(path).map_err(|error| unreadable(error.to_string()))?;
    let name = path.display().to_string();
    let records = Records::read(&[Embedded { path: &name, bytes: &bytes, sha256: &sha256(&bytes) }])?;
    if records.tables.is_empty() {
        return Err(unreadable("it names no schema".to_owned()));
    }
    Ok(records)
}
