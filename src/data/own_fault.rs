//! Why a file of one's own records cannot be used: in which file, which record and which field, what stands there, and
//! what may stand there.

use std::fmt;

use thiserror::Error;

use crate::fault::Explain;

/// A problem and where it is.
#[derive(Clone, Debug, PartialEq)]
pub struct OwnFault {
    /// As the file was named.
    pub file: String,
    /// Id of the record, or its number where it has none; empty for what is said of the whole file.
    pub record: String,
    /// Path of the field in its record: `heat_capacity.form`; empty for the record as a whole.
    pub field: String,
    pub problem: Box<Problem>,
}

/// What is wrong.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum Problem {
    #[error("it is no JSON: {why}")]
    NotJson { why: String },
    #[error("its schema is {found}, and this program reads `{wanted}`")]
    Schema { found: String, wanted: &'static str },
    #[error("`{name}` is missing")]
    Missing { name: &'static str, what: &'static str },
    #[error("there is no field `{name}` in this place")]
    Unknown { name: String, known: String },
    #[error("here stands {found}, and {wanted} is wanted")]
    Sort { found: String, wanted: &'static str },
    #[error("{why}")]
    Figure { text: String, why: String, hint: String },
    #[error("`{text}` is in {found}, and {what} is in {wanted}")]
    Unit { text: String, found: String, what: &'static str, wanted: &'static str },
    #[error("{why}")]
    Name { why: String, hint: String },
    #[error("the record stands twice in the file")]
    Twice,
    #[error("`{found}` is none of {known}")]
    Word { found: String, known: String },
    #[error("{why}")]
    Range { why: String },
    #[error("its heat capacity runs from {from_k} K to {to_k} K, and nothing joins it to its figures at 298.15 K")]
    Unjoined { from_k: f64, to_k: f64 },
    #[error("{why}")]
    Transition { why: String },
    #[error("the id `{id}` is that of a dataset which is there already")]
    IdTaken { id: String },
    #[error("it extends `{id}`, which is no dataset of formation enthalpies")]
    Extends { id: String, known: String },
    #[error("its formula has {own}, and the substance of that name on record has {known}")]
    OtherAtoms { own: String, known: String },
}

impl fmt::Display for OwnFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.file)?;
        if !self.record.is_empty() {
            write!(f, ", record {}", self.record)?;
        }
        if !self.field.is_empty() {
            write!(f, ", field `{}`", self.field)?;
        }
        write!(f, ": {}", self.problem)
    }
}

impl Explain for OwnFault {
    fn code(&self) -> &'static str {
        match *self.problem {
            Problem::NotJson { .. } => "records-not-json",
            Problem::Schema { .. } => "records-schema",
            Problem::Missing { .. } => "record-field-missing",
            Problem::Unknown { .. } => "record-field-unknown",
            Problem::Sort { .. } => "record-field-sort",
            Problem::Figure { .. } => "record-figure",
            Problem::Unit { .. } => "record-unit",
            Problem::Name { .. } => "record-name",
            Problem::Twice => "record-twice",
            Problem::Word { .. } => "record-word",
            Problem::Range { .. } => "record-range",
            Problem::Unjoined { .. } => "record-not-joined",
            Problem::Transition { .. } => "record-transition",
            Problem::IdTaken { .. } => "dataset-id-taken",
            Problem::Extends { .. } => "dataset-extends-unknown",
            Problem::OtherAtoms { .. } => "record-other-atoms",
        }
    }

    fn hint(&self) -> String {
        match &*self.problem {
            Problem::NotJson { .. } => {
                "look at that line: a comma, a quotation mark or a bracket is often missing just before it".to_owned()
            }
            Problem::Schema { wanted, .. } => format!("begin the file with `{{\"schema\": \"{wanted}\",`"),
            Problem::Missing { name, what } => format!("add `{name}`: {what}"),
            Problem::Unknown { known, .. } => format!("the fields here are {known}; remarks go into `note`"),
            Problem::Sort { wanted, .. } => format!("write {wanted}"),
            Problem::Figure { hint, .. } | Problem::Name { hint, .. } => hint.clone(),
            Problem::Unit { wanted, .. } => format!("give it in {wanted} or another unit of that kind, per mole"),
            Problem::Twice => "keep one of the two".to_owned(),
            Problem::Word { known, .. } => format!("choose one of {known}"),
            Problem::Range { .. } => {
                "give ranges in order of temperature, each beginning where the one before it ends".to_owned()
            }
            Problem::Unjoined { .. } => {
                "let a range hold 298.15 K, or give the transition that the phase forms by under `transitions`"
                    .to_owned()
            }
            Problem::Transition { .. } => {
                "a transition joins two phases whose heat capacities both reach its temperature".to_owned()
            }
            Problem::IdTaken { .. } => {
                "give the dataset an id of its own, such as one with the plant and the year".to_owned()
            }
            Problem::Extends { known, .. } => format!("choose one of {known}, or leave `extends` out"),
            Problem::OtherAtoms { .. } => "correct the formula, or give the substance a name of its own".to_owned(),
        }
    }
}
