//! A substance in one phase, with what the shipped datasets say of it.
//!
//! [`Substance`] gathers the records of several datasets under one species; which of them a calculation uses is the
//! calculation's choice, and all species of a reaction take their formation enthalpies from one dataset.

use std::fmt;
use std::sync::Arc;

use crate::chem::species::Species;

use super::dataset::DatasetId;
use super::formation::Formation;
use super::function::Function;
use super::pressure::Constants;

/// One phase of a substance.
#[derive(Clone, Debug)]
pub struct Substance {
    pub species: Species,
    /// In words, where a dataset or the table of names says it: `water`.
    pub name: Option<Arc<str>>,
    pub cas: Option<Arc<str>>,
    /// Heat capacity, enthalpy and entropy over temperature.
    pub function: Option<Arc<Function>>,
    /// For the dependence on pressure; where none is on record it is not known here.
    pub pressure: Constants,
    /// Formation properties at 298.15 K, one per dataset, in order of precedence.
    pub formations: Vec<Arc<Formation>>,
}

impl Substance {
    /// Name with phase: `C(cr,graphite)`.
    pub fn id(&self) -> &str {
        &self.species.id
    }

    /// What one dataset says of it at 298.15 K.
    pub fn formation(&self, dataset: &DatasetId) -> Option<&Arc<Formation>> {
        self.formations.iter().find(|formation| formation.dataset == *dataset)
    }
}

impl fmt::Display for Substance {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.id())
    }
}
