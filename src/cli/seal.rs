//! `hessbook seal`: runs notebooks and seals them.

use std::path::PathBuf;
use std::process::ExitCode;
use std::sync::Arc;

use clap::Args;

use crate::fault::Fault;
use crate::notebook::holdings::Holdings;
use crate::notebook::seal::OpenRow;
use crate::notebook::sealing::{Sealed, Sealing, seal};
use crate::notebook::signature::PrivateKey;
use crate::session::on_big_stack;

use super::run::no_folder;
use super::{Done, err, out, setting, settings, stopped_by_interrupt};

/// Run notebooks in a fresh session and seal them.
///
/// The seal is written into the notebook's metadata, and the outputs are written anew with it, so that both say the same. A
/// notebook whose content is sealed already keeps its seal. Rows of the register that are strained or broken, and that
/// nobody dealt with, refuse the seal.
///
/// Exit status: 0 when all are sealed, 1 when one was refused, 2 when one could not be read or written.
#[derive(Args)]
pub struct Seal {
    /// .ipynb notebooks
    #[arg(required = true)]
    notebooks: Vec<PathBuf>,
    /// Your name, to be kept in the seal; without this no name is kept
    #[arg(long, value_name = "NAME")]
    author: Option<String>,
    /// Seal although rows are strained or broken and not dealt with; the seal says that it is a draft
    #[arg(long)]
    draft: bool,
    /// Sign with this private key, as `hessbook keys new` makes it
    #[arg(long, value_name = "KEYFILE")]
    sign: Option<PathBuf>,
    /// Override a declared parameter, as in `--set outlet="450 degC"`; the seal keeps it
    #[arg(long, value_name = "NAME=TEXT", value_parser = setting)]
    set: Vec<(String, String)>,
}

impl Seal {
    pub(super) fn run(self) -> Done {
        let how = Sealing {
            key: self.sign.as_deref().map(PrivateKey::read).transpose()?,
            author: self.author,
            draft: self.draft,
            settings: settings(&self.set)?,
            date: chrono::Utc::now().format("%Y-%m-%dT%H:%M:%SZ").to_string(),
        };
        let (stop, holdings) = (stopped_by_interrupt(), Holdings::shipped());
        let mut worst = 0;
        for path in &self.notebooks {
            let done = on_big_stack(|| -> Result<(Vec<OpenRow>, String), Fault> {
                no_folder(path, "a notebook")?;
                let Sealed { notebook, seal, kept, bad_signature } = seal(path, &how, &holdings, &Arc::clone(&stop))?;
                notebook.write(path)?;
                let when = if kept { "unchanged since" } else { "sealed" };
                let draft = if seal.draft { " as a draft" } else { "" };
                let mut words = format!("{when} {}{draft}: {}", seal.sealed, counted(seal.values.len()));
                if let Some(key) = bad_signature {
                    let now = if seal.signature.is_some() { "signed anew" } else { "no longer signed" };
                    words.push_str(&format!("; the signature with the key {key} did not hold, and it is {now}"));
                }
                Ok((seal.open, words))
            });
            match done {
                Ok((open, words)) => {
                    out(&format!("{}: {words}\n", path.display()));
                    out(&open_rows(&open));
                }
                Err(fault) => {
                    err(&format!("hessbook: {fault}\n"));
                    let refused = fault.code().starts_with("seal-of-");
                    worst = worst.max(if refused { 1 } else { super::FAILED });
                }
            }
        }
        Ok(ExitCode::from(worst))
    }
}

fn counted(values: usize) -> String {
    if values == 1 { "1 value".to_owned() } else { format!("{values} values") }
}

/// Rows that the seal names as open, each once, with the number of values it touches.
fn open_rows(open: &[OpenRow]) -> String {
    let mut rows: Vec<(&OpenRow, usize)> = Vec::new();
    for row in open {
        let same = |known: &&mut (&OpenRow, usize)| {
            (&known.0.id, &known.0.status, &known.0.subject) == (&row.id, &row.status, &row.subject)
        };
        match rows.iter_mut().find(same) {
            Some((_, count)) => *count += 1,
            None => rows.push((row, 1)),
        }
    }
    let line = |(row, count): &(&OpenRow, usize)| {
        format!("  {:<9} {} ({}), under {}: {}\n", row.status, row.id, row.subject, counted(*count), row.note)
    };
    rows.iter().map(line).collect()
}
