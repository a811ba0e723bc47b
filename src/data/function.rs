//! Heat capacity, enthalpy and entropy of one phase as functions of temperature: constants and where they were printed.
//!
//! [`Function`] is data only; `model` evaluates it. The surprise: a phase that starts above 298.15 K carries the
//! formation enthalpy of the phase it forms from on heating, since its function continues that enthalpy scale.

use std::sync::Arc;

use serde::Deserialize;

use crate::num::powers::Power;
use crate::source::{Citation, Embedded};

use super::dataset::{self, Dataset, DatasetId, Datum, Heading, TableFault};

/// One temperature range of a function. Neighbours share their end, where both hold.
///
/// Cp/R = a1 T^-2 + a2 T^-1 + a3 + a4 T + a5 T^2 + a6 T^3 + a7 T^4 + Σ c T^n; b1 and b2 are the constants of
/// integration of H/R and S/R. Every published form is such a sum (`form.rs`); most have no further powers, and the seven
/// have places of their own since they are what nearly all evaluations run over.
#[derive(Clone, Debug, PartialEq)]
pub struct Interval {
    /// K
    pub t_min: f64,
    /// K
    pub t_max: f64,
    /// Factors of the powers -2 to 4 of T, in kelvin, in Cp/R.
    pub a: [f64; 7],
    /// b1 in K, b2 a pure number.
    pub b: [f64; 2],
    /// Powers of T, in kelvin, that have no place among the seven; never one that has.
    pub more: Box<[Power]>,
}

/// The function of one phase.
#[derive(Clone, Debug)]
pub struct Function {
    pub dataset: DatasetId,
    /// The record's name in its dataset: `H2O(l)`.
    pub id: Arc<str>,
    /// In words: `water`.
    pub name: Arc<str>,
    pub formula: Arc<str>,
    pub cas: Option<Arc<str>>,
    /// In order of temperature; never empty.
    pub intervals: Box<[Interval]>,
    /// What the sums are multiplied by, in J/(mol K): the gas constant of a source that gives Cp/R, the size of its unit
    /// where a source gives Cp.
    pub r_of_source: f64,
    /// Lower end of the first interval, K.
    pub t_min: f64,
    /// Upper end of the last interval, K.
    pub t_max: f64,
    /// Formation enthalpy at 298.15 K on which the enthalpy scale of this function rests, J/mol.
    pub dhf_298: f64,
    /// Which constants of integration the source gives: without them only differences of H and of S have a meaning.
    pub zero: Zero,
    /// What its author states of its uncertainty; the shipped tables state nothing.
    pub stated: Stated,
    /// H(298.15 K) - H(0 K), J/mol.
    pub h298_minus_h0: Option<f64>,
    /// What is known against this record, in words.
    pub warnings: Box<[Arc<str>]>,
    /// Whether the source marks this as a phase of a reference element; also high-temperature phases are marked.
    pub is_reference_element: bool,
    /// What the source itself cites.
    pub original_references: Arc<str>,
    /// Standard pressure of S, Pa.
    pub p_standard_pa: f64,
    pub citation: Citation,
}

/// Which scales of a function have their zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Zero {
    /// H is counted from the elements at 298.15 K.
    pub enthalpy: bool,
    /// S is the third-law entropy.
    pub entropy: bool,
}

/// Uncertainties that belong to a function as a whole.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Stated {
    /// The entropy at 298.15 K that the entropy scale rests on.
    pub entropy_298: Option<Datum>,
    /// Relative standard uncertainty of Cp, as one factor for all temperatures.
    pub cp_relative_u: Option<f64>,
}

impl Function {
    /// Whether the Gibbs energy can be compared with that of another phase.
    pub fn has_gibbs_energy(&self) -> bool {
        self.zero.enthalpy && self.zero.entropy
    }

    /// Cp by the plain sum of powers, in J/(mol K), at a temperature within its range.
    pub(super) fn cp_plainly(&self, t_k: f64) -> f64 {
        let home = self.intervals.iter().find(|one| one.t_min <= t_k && t_k <= one.t_max);
        self.r_of_source * home.map_or(f64::NAN, |one| one.powers().map(|power| power.value(t_k)).sum())
    }

    /// H in the same manner, in J/mol.
    pub(super) fn h_plainly(&self, t_k: f64) -> f64 {
        let home = self.intervals.iter().find(|one| one.t_min <= t_k && t_k <= one.t_max);
        self.r_of_source * home.map_or(f64::NAN, |one| one.h_and_s(t_k).0)
    }

    /// Whether a temperature lies within the function's range, ends included.
    pub fn covers(&self, t_k: f64) -> bool {
        self.t_min <= t_k && t_k <= self.t_max
    }
}

pub const SCHEMA: &str = "hessbook-functions/1";

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow)]
    dataset: Heading<'a>,
    title: &'a str,
    obtained: &'a str,
    r_j_mol_k: f64,
    p_standard_gas_pa: f64,
    p_standard_condensed_pa: f64,
    #[serde(borrow)]
    records: Vec<Record<'a>>,
}

#[derive(Deserialize)]
struct Record<'a> {
    id: &'a str,
    name: &'a str,
    formula: &'a str,
    cas: Option<&'a str>,
    dhf_298: f64,
    h298_minus_h0: Option<f64>,
    intervals: Vec<Range>,
    reference_element: bool,
    #[serde(borrow)]
    warnings: Vec<&'a str>,
    original_references: &'a str,
    source: &'a str,
}

#[derive(Deserialize)]
struct Range {
    t: [f64; 2],
    a: [f64; 7],
    b: [f64; 2],
}

/// Reads a file of functions into `functions` and its description into `datasets`.
pub(super) fn read(
    file: &Embedded<'_>,
    datasets: &mut Vec<Dataset>,
    functions: &mut Vec<Function>,
) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    let dataset = dataset::enter(datasets, &page.dataset, page.title, file, page.records.len());
    let obtained: Arc<str> = page.obtained.into();
    functions.reserve(page.records.len());
    for record in page.records {
        let intervals: Box<[Interval]> = record
            .intervals
            .iter()
            .map(|range| Interval {
                t_min: range.t[0],
                t_max: range.t[1],
                a: range.a,
                b: range.b,
                more: Box::default(),
            })
            .collect();
        let (Some(first), Some(last)) = (intervals.first(), intervals.last()) else {
            let why = format!("{} has no interval", record.id);
            return Err(TableFault::Unreadable { path: file.path.to_owned(), why });
        };
        let gas = record.id.ends_with("(g)");
        functions.push(Function {
            dataset: dataset.clone(),
            id: record.id.into(),
            name: record.name.into(),
            formula: record.formula.into(),
            cas: record.cas.map(Arc::from),
            r_of_source: page.r_j_mol_k,
            t_min: first.t_min,
            t_max: last.t_max,
            intervals,
            dhf_298: record.dhf_298,
            zero: Zero { enthalpy: true, entropy: true },
            stated: Stated::default(),
            h298_minus_h0: record.h298_minus_h0,
            warnings: record.warnings.into_iter().map(Arc::from).collect(),
            is_reference_element: record.reference_element,
            original_references: record.original_references.into(),
            p_standard_pa: if gas { page.p_standard_gas_pa } else { page.p_standard_condensed_pa },
            citation: Citation { source: record.source.into(), obtained: obtained.clone() },
        });
    }
    Ok(())
}
