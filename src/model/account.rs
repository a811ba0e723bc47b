//! Answers that are there to be read: a derivation, a comparison, an explanation of a gap.
//!
//! A formula gives one as [`Value::Account`](crate::model::card::Value); the render room makes text, HTML and LaTeX of
//! it. The surprise: nothing can be computed with it, so that no figure gets round the graph by way of a text.

use std::rc::Rc;

use crate::model::compare::Comparison;
use crate::model::derivation::Derivation;
use crate::model::gap::Gap;

/// An answer to be read.
#[derive(Clone)]
pub enum Account {
    Derivation(Rc<Derivation>),
    Comparison(Rc<Comparison>),
    Gap(Rc<Gap>),
}

impl Account {
    /// What it is, in words for messages.
    pub fn sort(&self) -> &'static str {
        match self {
            Account::Derivation(_) => "a derivation",
            Account::Comparison(_) => "a comparison",
            Account::Gap(_) => "an explanation of a gap",
        }
    }
}
