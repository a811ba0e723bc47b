//! What is wrong with an argument of a formula, in the words of its card.

use thiserror::Error;

use crate::fault::Explain;

/// An argument that does not suit its formula.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ArgumentError {
    #[error("`{function}` wants {wanted} for `{argument}`, not {given}")]
    Sort { function: &'static str, argument: &'static str, wanted: String, given: String },
    #[error("`{function}` was given {given} arguments and takes {}", counts(*least, *most))]
    Count { function: &'static str, given: usize, least: usize, most: usize, usage: String },
    #[error("`{function}` knows no option `{option}`")]
    Option { function: &'static str, option: String, known: String },
    #[error("`{function}` was not given `{option}`")]
    OptionMissing { function: &'static str, option: &'static str, doc: &'static str },
    #[error("`{word}` is no choice for `{argument}` of `{function}`")]
    Word { function: &'static str, argument: &'static str, word: String, choices: String },
    #[error("a difference of {difference_k} K was given to `{function}` where a temperature is wanted")]
    Difference { function: &'static str, difference_k: f64 },
    #[error("{t_k} K is not a temperature above absolute zero, as `{function}` wants")]
    NotPositive { function: &'static str, t_k: f64 },
}

fn counts(least: usize, most: usize) -> String {
    if least == most { least.to_string() } else { format!("{least} to {most}") }
}

impl Explain for ArgumentError {
    fn code(&self) -> &'static str {
        match self {
            ArgumentError::Sort { .. } => "argument-sort",
            ArgumentError::Count { .. } => "formula-argument-count",
            ArgumentError::Option { .. } => "option-unknown",
            ArgumentError::OptionMissing { .. } => "option-missing",
            ArgumentError::Word { .. } => "word-unknown",
            ArgumentError::Difference { .. } => "difference-for-point",
            ArgumentError::NotPositive { .. } => "temperature-not-positive",
        }
    }

    fn hint(&self) -> String {
        match self {
            ArgumentError::Sort { wanted, .. } => format!("give {wanted}"),
            ArgumentError::Count { usage, .. } => format!("use it as in `{usage}`"),
            ArgumentError::Option { known, .. } => format!("its options are {known}"),
            ArgumentError::OptionMissing { option, doc, .. } => format!("add `{option}:`, {doc}"),
            ArgumentError::Word { choices, .. } => format!("choose one of {choices}"),
            ArgumentError::Difference { .. } => "give the temperature itself, as in `q(\"450 degC\")`".to_owned(),
            ArgumentError::NotPositive { .. } => "check the sign and the scale of the temperature".to_owned(),
        }
    }
}

/// "`a`, `b` and `c`".
pub fn listed<'a>(words: impl IntoIterator<Item = &'a str>) -> String {
    let words: Vec<String> = words.into_iter().map(|word| format!("`{word}`")).collect();
    match words.split_last() {
        None => "none".to_owned(),
        Some((last, [])) => last.clone(),
        Some((last, rest)) => format!("{} and {last}", rest.join(", ")),
    }
}
