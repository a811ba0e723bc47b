//! Critical constants: where a liquid ends, and what scales a gas by corresponding states.
//!
//! Single facts of several publications, each with its own source, so this is part of a table without a dataset. The surprise:
//! a quantum gas and an associating vapour are marked, since their constants do not scale them to other gases.

use std::sync::Arc;

use serde::Deserialize;

use crate::source::Citation;

use super::dataset::TableFault;

/// Why the constants of a gas scale it to no other.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Apart {
    /// Light molecules, whose motion is quantised even in the gas.
    Quantum,
    /// Molecules that pair in the vapour.
    Associating,
}

/// The critical temperature of one substance, and what else is on record of the gas.
#[derive(Clone, Debug)]
pub struct CriticalTemperature {
    /// The gas, by the id of its substance.
    pub id: Arc<str>,
    /// K
    pub t_k: f64,
    /// Critical pressure, Pa.
    pub p_pa: Option<f64>,
    /// The acentric factor, with its own source.
    pub acentric: Option<(f64, Citation)>,
    /// Dipole moment in debye, with its own source.
    pub dipole_debye: Option<(f64, Citation)>,
    pub apart: Option<Apart>,
    pub citation: Citation,
    /// How the figures compare with other sources.
    pub check: Arc<str>,
    /// What is known against them, in words.
    pub warnings: Box<[Arc<str>]>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Record<'a> {
    pub id: &'a str,
    t: &'a str,
    p_mpa: Option<&'a str>,
    acentric: Option<&'a str>,
    acentric_source: Option<&'a str>,
    dipole_debye: Option<&'a str>,
    dipole_source: Option<&'a str>,
    class: Option<Apart>,
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
    #[serde(default)]
    warnings: Vec<&'a str>,
}

impl Record<'_> {
    pub fn read(self, path: &str) -> Result<CriticalTemperature, TableFault> {
        let unreadable = |column| TableFault::Figure { path: path.to_owned(), record: self.id.to_owned(), column };
        let number = |text: &str, column| text.parse::<f64>().ok().filter(|x| x.is_finite()).ok_or(unreadable(column));
        let positive = |text: &str, column| match number(text, column)? {
            x if x > 0.0 => Ok(x),
            _ => Err(unreadable(column)),
        };
        let sourced = |text: Option<&str>, source: Option<&str>, column| {
            text.map(|text| {
                let source = source.filter(|source| !source.is_empty()).ok_or_else(|| unreadable(column))?;
                Ok((number(text, column)?, Citation::new(source, self.obtained)))
            })
            .transpose()
        };
        Ok(CriticalTemperature {
            id: self.id.into(),
            t_k: positive(self.t, "t")?,
            p_pa: self.p_mpa.map(|text| positive(text, "p_mpa")).transpose()?.map(|mpa| mpa * 1e6),
            acentric: sourced(self.acentric, self.acentric_source, "acentric")?,
            dipole_debye: sourced(self.dipole_debye, self.dipole_source, "dipole_debye")?,
            apart: self.class,
            citation: Citation::new(self.source, self.obtained),
            check: self.check.into(),
            warnings: self.warnings.into_iter().map(Arc::from).collect(),
        })
    }
}
