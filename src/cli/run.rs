//! `hessbook run`: a notebook or script from the command line.

use std::io::IsTerminal;
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use clap::{Args, ValueEnum};
use serde::Deserialize;

use crate::fault::Fault;
use crate::notebook::file::{FileError, NotebookFile, Output};
use crate::notebook::run::{RunRecord, RunStatus, Source, Watcher, run};
use crate::notebook::seal::Seal;
use crate::notebook::sealing::{read_seal, sealed_cells};
use crate::render::report::{self, Record};
use crate::render::{Bundle, text};
use crate::session::{Session, on_big_stack};

use super::{Done, err, out, setting, settings, stopped_by_interrupt};

/// Run a notebook or script and print its reported results.
///
/// Exit status: 0 when all cells ran, 1 with a fault in the notebook, 2 when it could not be run.
#[derive(Args)]
pub struct Run {
    /// A .ipynb notebook or a .rhai script
    file: PathBuf,
    /// Override a declared parameter, as in `--set outlet="450 degC"`
    #[arg(long, value_name = "NAME=TEXT", value_parser = setting)]
    set: Vec<(String, String)>,
    /// Write the notebook with its outputs to this file
    #[arg(long, value_name = "FILE", conflicts_with = "in_place")]
    output: Option<PathBuf>,
    /// Write the outputs into the notebook itself
    #[arg(long)]
    in_place: bool,
    /// What is printed
    #[arg(long, value_enum, default_value_t = Format::Text)]
    format: Format,
}

#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Format {
    Text,
    Json,
}

impl Run {
    pub(super) fn run(self) -> Done {
        let stop = stopped_by_interrupt();
        Ok(match on_big_stack(move || executed(&self, stop))? {
            RunStatus::Ok => ExitCode::SUCCESS,
            RunStatus::Fault => ExitCode::from(1),
        })
    }
}

/// Refuses a folder where one file is wanted.
///
/// # Errors
/// It is a folder.
pub(super) fn no_folder(path: &Path, wanted: &str) -> Result<(), Fault> {
    if !path.is_dir() {
        return Ok(());
    }
    Err(Fault::new(
        "notebook-is-folder",
        format!("{} is a folder, and {wanted} is wanted", path.display()),
        format!("name a file in it, such as {}", path.join("NAME.ipynb").display()),
    ))
}

fn executed(args: &Run, stop: Arc<AtomicBool>) -> Result<RunStatus, Fault> {
    no_folder(&args.file, "a notebook or a script")?;
    let mut source = Source::read(&args.file)?;
    let target = if args.in_place { Some(&args.file) } else { args.output.as_ref() };
    if let (Some(_), Source::Script { name, .. }) = (target, &source) {
        return Err(Fault::new(
            "script-has-no-outputs",
            format!("{name} is a script, and a script keeps no outputs"),
            "give a .ipynb notebook, or leave out --output and --in-place",
        ));
    }
    if let Some(folder) = target.and_then(|path| path.parent()).filter(|folder| !folder.as_os_str().is_empty())
        && !folder.is_dir()
    {
        return Err(Fault::new(
            "output-folder-missing",
            format!("there is no folder {} to write the notebook to", folder.display()),
            "make the folder first, or choose another file",
        ));
    }
    let settings = settings(&args.set)?;
    let mut session = Session::new(stop);
    session.set_parameters(settings);
    let name = args.file.display().to_string();
    let mut progress = Progress { format: args.format, terminal: std::io::stderr().is_terminal() };
    let record = run(&name, &mut source, &mut session, &mut progress);
    progress.clear();
    // The record comes first: results are not to be lost to a file that cannot be written.
    print(&record, args.format);
    if let (Some(path), Source::Notebook(notebook)) = (target, &source) {
        if let Ok(Some(seal)) = read_seal(&name, notebook)
            && !is_of(&seal, notebook, &record)
        {
            err(&format!(
                "hessbook: {} keeps a seal of {} that says otherwise than these outputs; seal it again with `hessbook seal`\n",
                path.display(),
                seal.sealed
            ));
        }
        notebook.write(path).map_err(|error: FileError| Fault::from(error))?;
    }
    // The process ends here; taking the engine apart first would be a tenth of a short run.
    std::mem::forget(session);
    Ok(record.status)
}

/// Whether a seal is of these cells and these results.
fn is_of(seal: &Seal, notebook: &NotebookFile, record: &RunRecord) -> bool {
    seal.cells == sealed_cells(notebook) && seal.values.iter().map(|value| &value.record).eq(&record.reports)
}

/// Text goes to standard output as it comes; a line on the terminal says which cell runs.
struct Progress {
    format: Format,
    terminal: bool,
}

impl Progress {
    fn clear(&self) {
        if self.terminal {
            err("\r\x1b[K");
        }
    }
}

impl Watcher for Progress {
    fn begins(&mut self, cell: &str, nth: usize, of: usize) {
        if self.terminal && of > 1 {
            err(&format!("\r\x1b[K{cell} ({nth} of {of})"));
        }
    }

    fn gives(&mut self, output: &Output) {
        if self.format == Format::Json {
            return; // Standard output holds one JSON object and nothing else.
        }
        self.clear();
        match output {
            Output::Stream { stderr: true, text } => err(text),
            Output::Stream { stderr: false, text } => out(text),
            Output::Display { bundle, .. } | Output::Result(bundle) => {
                out(&format!("{}\n\n", bundle.plain().trim_end()))
            }
            Output::Error { .. } => {}
        }
    }

    fn updates(&mut self, bundle: &Bundle) {
        let record = bundle.data.get(report::MIME).and_then(|record| Record::deserialize(record).ok());
        if let (Format::Text, Some(record)) = (self.format, record) {
            self.clear();
            out(&format!("{}\n\n", text::decisions(&record)));
        }
    }
}

fn print(record: &RunRecord, format: Format) {
    match format {
        Format::Json => {
            let text =
                serde_json::to_string_pretty(record).unwrap_or_else(|e| unreachable!("a record is plain strings: {e}"));
            out(&format!("{text}\n"));
        }
        Format::Text => {
            if !record.parameters.is_empty() {
                out("parameters\n");
                for parameter in &record.parameters {
                    let set = if parameter.set { " (set)" } else { "" };
                    out(&format!("  {} = {}{set}\n", parameter.name, parameter.value));
                }
            }
            for fault in &record.faults {
                let place = match (fault.line, fault.column) {
                    (0, _) => fault.cell.clone(),
                    (line, column) => format!("{}, line {line}, column {column}", fault.cell),
                };
                err(&format!("{place}: {}\n  try: {}\n  ({})\n", fault.message, fault.hint, fault.code));
            }
        }
    }
}
