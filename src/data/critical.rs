//! Critical temperatures: above them a pure gas has no liquid to turn into, at any pressure.
//!
//! Single facts of several publications, each with its own source, so this is a table without a dataset.

use std::sync::Arc;

use serde::Deserialize;

use crate::source::{Citation, Embedded};

use super::dataset::{self, TableFault};

/// The critical temperature of one substance.
#[derive(Clone, Debug)]
pub struct CriticalTemperature {
    /// The gas, by the id of its substance.
    pub id: Arc<str>,
    /// K
    pub t_k: f64,
    pub citation: Citation,
    /// How the figure compares with other sources.
    pub check: Arc<str>,
}

pub(super) const SCHEMA: &str = "hessbook-critical-temperatures/1";

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow)]
    records: Vec<Record<'a>>,
}

#[derive(Deserialize)]
struct Record<'a> {
    id: &'a str,
    t: &'a str,
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
}

/// Reads a file of critical temperatures.
pub(super) fn read(file: &Embedded<'_>, all: &mut Vec<CriticalTemperature>) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    for record in page.records {
        let unreadable =
            || TableFault::Figure { path: file.path.to_owned(), record: record.id.to_owned(), column: "t" };
        let t_k: f64 = record.t.parse().map_err(|_| unreadable())?;
        if !(t_k.is_finite() && t_k > 0.0) {
            return Err(unreadable());
        }
        let citation = Citation::new(record.source, record.obtained);
        all.push(CriticalTemperature { id: record.id.into(), t_k, citation, check: record.check.into() });
    }
    Ok(())
}
