//! Phase transitions that belong to the functions: temperature, enthalpy and entropy.
//!
//! [`Transition`] is computed from the two functions it joins, so with them the Gibbs energies of the two phases meet
//! there; a transition from another table would open a gap. Second-order ones carry no enthalpy.

use std::sync::Arc;

use serde::Deserialize;

use crate::source::{Citation, Embedded};

use super::dataset::{self, Dataset, DatasetId, Heading, TableFault};

/// What happens at a transition.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Deserialize)]
pub enum TransitionKind {
    #[serde(rename = "fusion")]
    Fusion,
    #[serde(rename = "solid-solid")]
    SolidSolid,
    /// A lambda, Curie or Néel point, or a join that the source makes without a heat.
    #[serde(rename = "second-order")]
    SecondOrder,
}

/// One transition between two phases, or within one phase where two intervals of its function join.
#[derive(Clone, Debug)]
pub struct Transition {
    pub dataset: DatasetId,
    pub id: Arc<str>,
    pub kind: TransitionKind,
    /// The low-temperature phase, by the id of its function.
    pub from: Arc<str>,
    /// The high-temperature phase; the same as `from` for a transition within one function.
    pub to: Arc<str>,
    pub t_k: f64,
    /// J/mol
    pub dh: f64,
    /// J/(mol K)
    pub ds: f64,
    /// J/(mol K), high-temperature phase minus low-temperature phase.
    pub dcp: f64,
    /// How well it closes, and how it compares with other tables.
    pub check: Arc<str>,
    pub note: Option<Arc<str>>,
    /// What the source itself cites.
    pub original_references: Arc<str>,
    pub citation: Citation,
}

pub(super) const SCHEMA: &str = "hessbook-transitions/1";

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow)]
    dataset: Heading<'a>,
    title: &'a str,
    #[serde(borrow)]
    records: Vec<Record<'a>>,
}

#[derive(Deserialize)]
struct Record<'a> {
    id: &'a str,
    kind: TransitionKind,
    from: &'a str,
    to: &'a str,
    t: f64,
    dh: f64,
    ds: f64,
    dcp: f64,
    original_references: &'a str,
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
    note: Option<&'a str>,
}

/// Reads a file of transitions into `transitions` and its description into `datasets`.
pub(super) fn read(
    file: &Embedded<'_>,
    datasets: &mut Vec<Dataset>,
    transitions: &mut Vec<Transition>,
) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    let dataset = dataset::enter(datasets, &page.dataset, page.title, file, page.records.len());
    transitions.extend(page.records.into_iter().map(|record| Transition {
        dataset: dataset.clone(),
        id: record.id.into(),
        kind: record.kind,
        from: record.from.into(),
        to: record.to.into(),
        t_k: record.t,
        dh: record.dh,
        ds: record.ds,
        dcp: record.dcp,
        check: record.check.into(),
        note: record.note.map(Arc::from),
        original_references: record.original_references.into(),
        citation: Citation::new(record.source, record.obtained),
    }));
    Ok(())
}
