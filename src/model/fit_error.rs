//! Why measured heat capacities cannot be fitted, or a fit not be asked.

use thiserror::Error;

use crate::fault::Explain;

#[derive(Clone, Debug, PartialEq, Error)]
pub enum FitError {
    #[error("measured heat capacities are wanted, and this is {given}")]
    Table { given: String },
    #[error("{name} has no {what}")]
    Column { name: String, what: &'static str, there: String },
    #[error("{name} has {temperatures} temperatures and {capacities} heat capacities")]
    Lengths { name: String, temperatures: usize, capacities: usize },
    #[error("row {row} of {name} is in {found}, and {what} is wanted")]
    Unit { name: String, row: usize, found: String, what: &'static str },
    #[error("{stated} of the {rows} heat capacities of {name} state an uncertainty")]
    SomeUncertain { name: String, stated: usize, rows: usize },
    #[error("row {row} of {name} states an uncertainty of zero")]
    Exact { name: String, row: usize },
    #[error("row {row} of {name} states an uncertainty of its temperature")]
    Temperature { name: String, row: usize },
    #[error("{rows} rows of {name} cannot be fitted by {terms} terms")]
    TooFew { name: String, rows: usize, terms: usize, needed: usize },
    #[error("the terms of a fit are exponents of T, and this is {given}")]
    Terms { given: String },
    #[error("the exponent {exponent} stands twice among the terms")]
    TermTwice { exponent: f64 },
    #[error("the rows of {name} cannot tell the term T^{exponent} from those before it")]
    Dependent { name: String, exponent: f64 },
    #[error(
        "an interpolation goes over ascending temperatures, and row {row} of {name} is at {t_k} K after {before_k} K"
    )]
    NotAscending { name: String, row: usize, t_k: f64, before_k: f64 },
    #[error("{name} was measured from {low} K to {high} K, and enthalpy and entropy count from 298.15 K")]
    Reference { name: String, low: f64, high: f64 },
    #[error("`{name}` is to stand in a reaction, and {given} is no substance of one's own")]
    NotOwn { name: String, given: String },
}

impl Explain for FitError {
    fn code(&self) -> &'static str {
        match self {
            FitError::Table { .. } => "fit-of-no-table",
            FitError::Column { .. } => "fit-column-missing",
            FitError::Lengths { .. } => "fit-columns-unlike",
            FitError::Unit { .. } => "fit-unit",
            FitError::SomeUncertain { .. } => "fit-some-uncertain",
            FitError::Exact { .. } => "fit-row-exact",
            FitError::Temperature { .. } => "fit-temperature-uncertain",
            FitError::TooFew { .. } => "fit-rows-too-few",
            FitError::Terms { .. } => "fit-terms",
            FitError::TermTwice { .. } => "fit-term-twice",
            FitError::Dependent { .. } => "fit-terms-dependent",
            FitError::NotAscending { .. } => "interpolation-not-ascending",
            FitError::Reference { .. } => "fit-without-298",
            FitError::NotOwn { .. } => "own-substance-wanted",
        }
    }

    fn hint(&self) -> String {
        match self {
            FitError::Table { .. } => {
                "give a table, or a map such as #{ T: [q(\"300 K\"), ...], Cp: [q(\"75.3(2) J/(mol K)\"), ...] }"
                    .to_owned()
            }
            FitError::Column { there, .. } => {
                format!("name the columns `T` and `Cp`; it has {there}")
            }
            FitError::Lengths { .. } => "give one heat capacity for each temperature".to_owned(),
            FitError::Unit { .. } => "state the unit of each column, per mole: `T / K`, `Cp / (J/(K mol))`".to_owned(),
            FitError::SomeUncertain { .. } => {
                "state u at every row, and the fit is weighted by it; or at none, and the scatter gives it".to_owned()
            }
            FitError::Exact { .. } => {
                "a measured value has an uncertainty: state it, or leave all of them out".to_owned()
            }
            FitError::Temperature { .. } => {
                "enter it in the uncertainty of Cp, as dCp/dT times it, and leave it out here".to_owned()
            }
            FitError::TooFew { needed, .. } => format!("give at least {needed} rows, or fewer terms"),
            FitError::Terms { .. } => {
                "give a list of exponents, as [0, 1, -2], or the name of a published form, as \"maier-kelley\""
                    .to_owned()
            }
            FitError::TermTwice { .. } => "name each exponent once".to_owned(),
            FitError::Dependent { .. } => "leave that term out, or measure at more temperatures".to_owned(),
            FitError::NotAscending { .. } => {
                "put the rows in order and take the mean of those at one temperature; or fit terms to them".to_owned()
            }
            FitError::Reference { low, .. } => {
                let end = if *low > 298.15 { "298.15 K" } else { "298.15 K or above" };
                format!("measure to there, or ask for it: #{{ extrapolate: \"{end}\" }}")
            }
            FitError::NotOwn { .. } => "give what `fit_heat_capacity` gave, or a molecule".to_owned(),
        }
    }
}
