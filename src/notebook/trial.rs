//! One run of a notebook on given records and constants, for sealing and for audits: its results with their graphs.
//!
//! [`Trial`] lives on the thread that ran it, since values do. The surprise: a trial watches which substances the cells
//! ask for, whether or not that reached a result, since a figure can leave the graph as a bare number.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use crate::fault::Fault;
use crate::model::card::References;
use crate::model::review::Dealing;
use crate::notebook::file::Output;
use crate::notebook::holdings::Holdings;
use crate::notebook::run::{FaultRecord, ParameterRecord, Source, Watcher, run};
use crate::quantity::Quantity;
use crate::render::Bundle;
use crate::render::report::Report;
use crate::session::Session;

/// What came out.
pub struct Trial {
    pub reports: Vec<Tried>,
    pub dealings: Vec<Dealing>,
    pub parameters: Vec<ParameterRecord>,
    pub faults: Vec<FaultRecord>,
    /// Entities that the cells asked for.
    pub asked: BTreeSet<Arc<str>>,
    /// Modules in use at the end, by the names of their files.
    pub modules: BTreeMap<String, Arc<[u8]>>,
    /// Files beside the notebook that the cells read.
    pub files: BTreeMap<String, Arc<[u8]>>,
}

/// One reported result.
pub struct Tried {
    pub value: Quantity,
    pub report: Report,
}

/// Nobody looks on.
pub struct Unwatched;

impl Watcher for Unwatched {
    fn begins(&mut self, _cell: &str, _nth: usize, _of: usize) {}

    fn gives(&mut self, _output: &Output) {}

    fn updates(&mut self, _bundle: &Bundle) {}
}

/// Runs all cells in a fresh session, and puts what came out into the notebook.
///
/// # Errors
/// The records make no catalogue.
pub fn trial(
    file: &str,
    source: &mut Source,
    settings: &BTreeMap<String, String>,
    holdings: &Holdings,
    stop: &Arc<AtomicBool>,
    watcher: &mut dyn Watcher,
) -> Result<Trial, Fault> {
    let catalog = Arc::new(holdings.catalog()?.watched());
    let mut session = Session::with(Arc::clone(stop), References::of(catalog, holdings.constants));
    session.set_parameters(settings.clone());
    session.set_apart(holdings.files.clone());
    let record = run(file, source, &mut session, watcher);
    let reports = session.reported().into_iter().zip(session.reports());
    Ok(Trial {
        reports: reports.map(|(one, report)| Tried { value: one.value, report }).collect(),
        dealings: session.dealings(),
        parameters: record.parameters,
        faults: record.faults,
        // Datasets that cells loaded lie over the catalogue, and were asked in its place.
        asked: session.references().catalog().asked(),
        modules: session.modules_used(),
        files: session.files_read(),
    })
}

impl Trial {
    pub fn of_label(&self, label: &str) -> Option<&Tried> {
        self.reports.iter().find(|one| one.report.record.label == label)
    }
}
