//! All shipped tables, read once.
//!
//! [`Tables`] sorts files by the schema that each names in its first line, so a new dataset is one new file and a
//! dataset that is taken away is missed by nobody. Files of other schemas belong to other modules and are passed over.

use std::collections::BTreeMap;

use crate::chem::element::{self, AtomicWeight, Element};
use crate::source::Embedded;

use super::dataset::{Dataset, TableFault};
use super::formation::{Coefficients, Formation};
use super::function::Function;
use super::molecule::Constants;
use super::names::Names;
use super::transition::Transition;
use super::{formation, function, molecule, names, pressure, transition};

#[derive(Debug, Default)]
pub(super) struct Tables {
    /// In order of precedence; those without formation enthalpies last.
    pub datasets: Vec<Dataset>,
    pub functions: Vec<Function>,
    pub formations: Vec<Formation>,
    pub coefficients: Vec<Coefficients>,
    pub transitions: Vec<Transition>,
    pub pressure: pressure::Read,
    pub molecules: Vec<Constants>,
    pub names: Names,
    /// Of the first table that has the element.
    pub weights: BTreeMap<Element, AtomicWeight>,
}

impl Tables {
    pub fn read(files: &[Embedded<'_>]) -> Result<Tables, TableFault> {
        let mut tables = Tables::default();
        for file in files {
            match schema(file.bytes) {
                Some(function::SCHEMA) => function::read(file, &mut tables.datasets, &mut tables.functions)?,
                Some(formation::SCHEMA) => {
                    formation::read(file, &mut tables.datasets, &mut tables.formations, &mut tables.coefficients)?;
                }
                Some(transition::SCHEMA) => transition::read(file, &mut tables.datasets, &mut tables.transitions)?,
                Some(pressure::SCHEMA) => pressure::read(file, &mut tables.pressure)?,
                Some(molecule::SCHEMA) => molecule::read(file, &mut tables.molecules)?,
                Some(names::SCHEMA) => names::read(file, &mut tables.names)?,
                Some(element::SCHEMA) => {
                    let unreadable = |why| TableFault::Unreadable { path: file.path.to_owned(), why };
                    for (element, weight) in element::read_weights(file.bytes).map_err(unreadable)? {
                        tables.weights.entry(element).or_insert(weight);
                    }
                }
                _ => {}
            }
        }
        tables.datasets.sort_by_key(|dataset| dataset.rank.unwrap_or(u32::MAX));
        Ok(tables)
    }
}

/// The schema that a file names as its first member.
pub(super) fn schema(bytes: &[u8]) -> Option<&str> {
    // The cut may fall into a character; what is looked for stands before it.
    let head = bytes.get(..bytes.len().min(128))?.utf8_chunks().next()?.valid();
    let rest = head.trim_start().strip_prefix('{')?.trim_start().strip_prefix("\"schema\"")?;
    let rest = rest.trim_start().strip_prefix(':')?.trim_start().strip_prefix('"')?;
    rest.split_once('"').map(|(schema, _)| schema)
}
