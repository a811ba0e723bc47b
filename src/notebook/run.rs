//! Runs a notebook or a script from its first cell to its last, in a fresh session, and tells what came out.
//!
//! [`run`] stops at the first cell that fails, as a front end's "run all" does: what follows would work on a state that
//! its author never saw. The surprise: a `.rhai` script is a notebook of one cell.

use std::path::Path;

use serde::{Deserialize, Serialize};

use crate::fault::Fault;
use crate::notebook::file::{CodeCell, FileError, NotebookFile, Output};
use crate::render::Bundle;
use crate::render::report::Record;
use crate::session::Session;
use crate::session::outcome::Host;

/// What a run gave, as `hessbook run --format json` prints it.
#[derive(Debug, Serialize)]
pub struct RunRecord {
    pub file: String,
    pub status: RunStatus,
    pub reports: Vec<Record>,
    pub parameters: Vec<ParameterRecord>,
    pub faults: Vec<FaultRecord>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum RunStatus {
    Ok,
    Fault,
}

/// An input that the notebook declares.
#[derive(Debug, Serialize)]
pub struct ParameterRecord {
    pub name: String,
    pub value: String,
    /// Whether the value was set from outside.
    pub set: bool,
}

/// A fault with its place.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct FaultRecord {
    pub cell: String,
    pub line: u32,
    pub column: u32,
    pub code: String,
    pub message: String,
    pub hint: String,
}

impl FaultRecord {
    /// `cell` names the place where the fault itself has none.
    pub fn of(fault: &Fault, cell: &str) -> FaultRecord {
        let place = fault.place();
        FaultRecord {
            cell: place.map_or(cell, |place| &place.cell).to_owned(),
            line: place.map_or(0, |place| place.line),
            column: place.map_or(0, |place| place.column),
            code: fault.code().to_owned(),
            message: fault.message().to_owned(),
            hint: fault.hint().to_owned(),
        }
    }
}

/// Something to run.
pub enum Source {
    Notebook(NotebookFile),
    /// Code cells, each with its name, whose outputs nobody wants.
    Cells(Vec<(String, String)>),
    Script {
        name: String,
        text: String,
    },
}

impl Source {
    /// Reads a `.ipynb` notebook, or anything else as a script.
    ///
    /// # Errors
    /// The file cannot be read, or is no notebook.
    pub fn read(path: &Path) -> Result<Source, FileError> {
        if path.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("ipynb")) {
            return Ok(Source::Notebook(NotebookFile::read(path)?));
        }
        let failed = |why: std::io::Error| FileError::Read { path: path.to_owned(), why: why.to_string() };
        let text = std::fs::read_to_string(path).map_err(failed)?;
        let text = text.strip_prefix('\u{feff}').unwrap_or(&text).to_owned();
        let name = path.file_name().map_or_else(|| "script".to_owned(), |name| name.to_string_lossy().into_owned());
        Ok(Source::Script { name, text })
    }

    fn cells(&self) -> Vec<(String, String, Option<CodeCell>)> {
        match self {
            Source::Notebook(notebook) => notebook
                .code_cells()
                .into_iter()
                .map(|cell| (cell.name.clone(), cell.source.clone(), Some(cell)))
                .collect(),
            Source::Cells(cells) => cells.iter().map(|(name, text)| (name.clone(), text.clone(), None)).collect(),
            Source::Script { name, text } => vec![(name.clone(), text.clone(), None)],
        }
    }
}

/// Told of each cell as it is reached.
pub trait Watcher {
    fn begins(&mut self, cell: &str, nth: usize, of: usize);
    /// What the running cell writes or shows.
    fn gives(&mut self, output: &Output);
    /// The new content of something it has shown.
    fn updates(&mut self, bundle: &Bundle);
}

/// Runs everything, and puts what came out into the notebook, where it is one. `file` is its path: what cells read is looked
/// for beside it.
pub fn run(file: &str, source: &mut Source, session: &mut Session, watcher: &mut dyn Watcher) -> RunRecord {
    let cells = source.cells();
    session.set_folder(Path::new(file).parent().map(Path::to_owned).unwrap_or_default());
    let mut ran: Vec<Ran> = Vec::new();
    let mut faults = Vec::new();
    for (nth, (name, text, _)) in cells.iter().enumerate() {
        if text.trim().is_empty() {
            ran.push(Ran { count: None, outputs: Vec::new() });
            continue;
        }
        watcher.begins(name, nth + 1, cells.len());
        let count = ran.iter().filter_map(|cell| cell.count).max().unwrap_or(0) + 1;
        ran.push(Ran { count: Some(count), outputs: Vec::new() });
        let mut host = Collecting { ran: &mut ran, watcher };
        let outcome = session.run_cell(name, text, &mut host);
        let mut last = |output: Output| {
            watcher.gives(&output);
            if let Some(cell) = ran.last_mut() {
                cell.outputs.push(output);
            }
        };
        if let Some(shown) = outcome.shown {
            last(Output::Result(shown));
        }
        if let Err(fault) = &outcome.result {
            let trace = fault.to_string().lines().map(str::to_owned).collect();
            last(Output::Error { name: fault.code().to_owned(), message: fault.message().to_owned(), trace });
            faults.push(FaultRecord::of(fault, name));
            break;
        }
    }
    if let (true, Some(fault)) = (faults.is_empty(), session.unused_setting()) {
        faults.push(FaultRecord::of(&fault, file));
    }
    if let Source::Notebook(notebook) = source {
        // Cells behind a fault did not run, and what an earlier run left there would pass for this one's.
        for (nth, (_, _, cell)) in cells.iter().enumerate() {
            if let Some(cell) = cell {
                let ran = ran.get(nth);
                notebook.set_outputs(cell, ran.and_then(|ran| ran.count), ran.map_or(&[], |ran| &ran.outputs));
            }
        }
    }
    RunRecord {
        file: file.to_owned(),
        status: if faults.is_empty() { RunStatus::Ok } else { RunStatus::Fault },
        reports: session.reports().into_iter().map(|report| report.record).collect(),
        parameters: session
            .parameters()
            .into_iter()
            .map(|p| ParameterRecord { name: p.name, value: p.written, set: p.set })
            .collect(),
        faults,
    }
}

/// What one cell gave.
struct Ran {
    count: Option<u32>,
    outputs: Vec<Output>,
}

/// Keeps what the running cell, the last of `ran`, gives: in order, neighbouring texts of one stream joined.
struct Collecting<'a> {
    ran: &'a mut Vec<Ran>,
    watcher: &'a mut dyn Watcher,
}

impl Collecting<'_> {
    fn outputs(&mut self) -> &mut Vec<Output> {
        match self.ran.last_mut() {
            Some(cell) => &mut cell.outputs,
            None => unreachable!("a cell runs"),
        }
    }
}

impl Host for Collecting<'_> {
    fn write(&mut self, stderr: bool, text: &str) {
        self.watcher.gives(&Output::Stream { stderr, text: text.to_owned() });
        match self.outputs().last_mut() {
            Some(Output::Stream { stderr: same, text: before }) if *same == stderr => before.push_str(text),
            _ => self.outputs().push(Output::Stream { stderr, text: text.to_owned() }),
        }
    }

    fn show(&mut self, bundle: &Bundle, id: Option<&str>) {
        let output = Output::Display { bundle: bundle.clone(), id: id.map(str::to_owned) };
        self.watcher.gives(&output);
        self.outputs().push(output);
    }

    fn update(&mut self, bundle: &Bundle, id: &str) {
        self.watcher.updates(bundle);
        for output in self.ran.iter_mut().flat_map(|cell| &mut cell.outputs) {
            if let Output::Display { bundle: shown, id: Some(known) } = output
                && known == id
            {
                *shown = bundle.clone();
            }
        }
    }
}
