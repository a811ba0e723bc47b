//! Formation properties of one phase at 298.15 K, as one dataset prints them.
//!
//! [`Formation`] keeps each figure as printed beside its SI value; figures of different datasets must not be mixed in
//! one reaction without saying so, which is why each carries its dataset.

use std::sync::Arc;

use serde::Deserialize;

use crate::record::correlation::Correlation;
use crate::source::{Citation, Embedded};

use super::dataset::{self, Column, Dataset, DatasetId, Datum, Figure, Heading, TableFault};
use super::function::Function;

/// How far a figure was compared with other sources.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Deserialize)]
pub enum Confirmation {
    /// Agrees within rounding with a source of different origin.
    #[serde(rename = "confirmed")]
    Confirmed,
    /// Agrees with an older or rounded source within the differences expected.
    #[serde(rename = "close")]
    Close,
    /// No second table, but it reproduces a known equilibrium constant or electrode potential.
    #[serde(rename = "consistent")]
    Consistent,
    /// Carried from one copy.
    #[serde(rename = "single source")]
    SingleSource,
}

/// What one dataset says of one phase at 298.15 K.
#[derive(Clone, Debug)]
pub struct Formation {
    pub dataset: DatasetId,
    /// The record's name in its dataset, which may differ from the substance's: `MgO(cr)`.
    pub id: Arc<str>,
    pub formula: Arc<str>,
    /// In words, where the dataset or its copy says it.
    pub name: Option<Arc<str>>,
    pub cas: Option<Arc<str>>,
    /// Standard enthalpy of formation at 298.15 K.
    pub dhf: Datum,
    /// How it is correlated with other formation enthalpies of its table, where the source gives that.
    pub correlation: Option<Arc<Correlation>>,
    /// The same at 0 K.
    pub dhf_0: Option<Datum>,
    /// Standard entropy at 298.15 K.
    pub s: Option<Datum>,
    /// Heat capacity at constant pressure at 298.15 K.
    pub cp: Option<Datum>,
    /// H(298.15 K) - H(0 K)
    pub h298_minus_h0: Option<Datum>,
    /// Standard pressure, Pa.
    pub p_standard_pa: f64,
    pub confirmation: Confirmation,
    /// What the figures were compared with, and the differences found.
    pub check: Option<Arc<str>>,
    /// What the source itself cites.
    pub original_references: Option<Arc<str>>,
    pub citation: Citation,
}

impl Formation {
    /// The formation enthalpy that a function carries, for phases that its dataset's table of 298.15 K leaves out.
    pub(super) fn of_function(function: &Function) -> Formation {
        Formation {
            dataset: function.dataset.clone(),
            id: function.id.clone(),
            formula: function.formula.clone(),
            name: Some(function.name.clone()),
            cas: function.cas.clone(),
            dhf: Datum::formation_j_mol(function.dhf_298),
            correlation: None,
            dhf_0: None,
            s: None,
            cp: None,
            h298_minus_h0: function.h298_minus_h0.map(Datum::energy_j_mol),
            p_standard_pa: function.p_standard_pa,
            confirmation: Confirmation::SingleSource,
            check: None,
            original_references: Some(function.original_references.clone()),
            citation: function.citation.clone(),
        }
    }
}

pub(super) const SCHEMA: &str = "hessbook-formation/1";

/// The field by which formation enthalpies are told apart as inputs, singular, as in "formation enthalpy of CO2(g)".
pub const FIELD: &str = "formation enthalpy";

/// Correlation coefficients of formation enthalpies at 298.15 K, as a table gives them:
/// `"dhf_298_correlations": [{"records": ["CO(g)", "CO2(g)"], "r": [[1, 0.6], [0.6, 1]]}]`.
///
/// No shipped table has the member, since no coefficients were read from a source; a table that has it needs nothing else.
#[derive(Debug)]
pub(super) struct Coefficients {
    pub dataset: DatasetId,
    pub path: String,
    /// Ids of records, as the table has them.
    pub records: Vec<Arc<str>>,
    /// Row by row.
    pub r: Vec<f64>,
}

#[derive(Deserialize)]
struct Group<'a> {
    #[serde(borrow)]
    records: Vec<&'a str>,
    r: Vec<Vec<f64>>,
}

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow)]
    dataset: Heading<'a>,
    title: &'a str,
    p_standard_pa: f64,
    #[serde(borrow)]
    records: Vec<Record<'a>>,
    #[serde(borrow, default)]
    dhf_298_correlations: Vec<Group<'a>>,
}

#[derive(Deserialize)]
struct Record<'a> {
    id: &'a str,
    name: Option<&'a str>,
    formula: &'a str,
    cas: Option<&'a str>,
    #[serde(borrow)]
    dhf_298: Figure<'a>,
    #[serde(borrow)]
    dhf_0: Option<Figure<'a>>,
    #[serde(borrow)]
    s_298: Option<Figure<'a>>,
    #[serde(borrow)]
    cp_298: Option<Figure<'a>>,
    #[serde(borrow)]
    h298_minus_h0: Option<Figure<'a>>,
    original_references: Option<&'a str>,
    source: &'a str,
    obtained: &'a str,
    confirmation: Confirmation,
    check: Option<&'a str>,
}

/// Reads a file of formation properties into `formations` and `coefficients`, and its description into `datasets`.
pub(super) fn read(
    file: &Embedded<'_>,
    datasets: &mut Vec<Dataset>,
    formations: &mut Vec<Formation>,
    coefficients: &mut Vec<Coefficients>,
) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    let dataset = dataset::enter(datasets, &page.dataset, page.title, file, page.records.len());
    coefficients.extend(page.dhf_298_correlations.into_iter().map(|group| Coefficients {
        dataset: dataset.clone(),
        path: file.path.to_owned(),
        records: group.records.into_iter().map(Arc::from).collect(),
        r: group.r.concat(),
    }));
    formations.reserve(page.records.len());
    for record in page.records {
        let datum = |figure: &Figure<'_>, column, name| {
            Datum::read(figure, column, page.dataset.divisor).ok_or_else(|| TableFault::Figure {
                path: file.path.to_owned(),
                record: record.id.to_owned(),
                column: name,
            })
        };
        let maybe = |figure: &Option<Figure<'_>>, column, name| {
            figure.as_ref().map(|figure| datum(figure, column, name)).transpose()
        };
        formations.push(Formation {
            dataset: dataset.clone(),
            id: record.id.into(),
            formula: record.formula.into(),
            name: record.name.map(Arc::from),
            cas: record.cas.map(Arc::from),
            dhf: datum(&record.dhf_298, Column::Formation, "dhf_298")?,
            correlation: None, // Joined by the catalogue, which knows by which names records go.
            dhf_0: maybe(&record.dhf_0, Column::Formation, "dhf_0")?,
            s: maybe(&record.s_298, Column::Entropy, "s_298")?,
            cp: maybe(&record.cp_298, Column::Entropy, "cp_298")?,
            h298_minus_h0: maybe(&record.h298_minus_h0, Column::Energy, "h298_minus_h0")?,
            p_standard_pa: page.p_standard_pa,
            confirmation: record.confirmation,
            check: record.check.map(Arc::from),
            original_references: record.original_references.map(Arc::from),
            citation: Citation::new(record.source, record.obtained),
        });
    }
    Ok(())
}
