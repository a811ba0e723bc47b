//! How the standard uncertainty of an input was evaluated: its distribution, its degrees of freedom, and what it is
//! correlated with (JCGM 100:2008, clauses 4 and 5.2; JCGM 101:2008, clause 6.4).

use std::sync::Arc;

use crate::record::correlation::Correlation;

/// The distribution assigned to an input.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Shape {
    /// Normal; Student's t where degrees of freedom are stated.
    #[default]
    Normal,
    /// All values between two limits alike: u is the half-width over √3.
    Rectangular,
    /// Between two limits, the middle most likely: u is the half-width over √6.
    Triangular,
}

impl Shape {
    pub fn word(self) -> &'static str {
        match self {
            Shape::Normal => "normal",
            Shape::Rectangular => "rectangular",
            Shape::Triangular => "triangular",
        }
    }
}

/// What is known of an input beside its value and its standard uncertainty.
#[derive(Clone, Debug)]
pub struct Evaluation {
    pub shape: Shape,
    /// Degrees of freedom of u; `None` where none are stated, which counts as infinitely many.
    pub dof: Option<f64>,
    /// Inputs that were determined together with this one; `None` for an independent input, which costs nothing.
    pub correlation: Option<Arc<Correlation>>,
}

/// What holds where nothing is stated.
static UNSTATED: Evaluation = Evaluation::UNSTATED;

impl Evaluation {
    pub const UNSTATED: Evaluation = Evaluation { shape: Shape::Normal, dof: None, correlation: None };

    /// As an input keeps it: nothing where nothing is stated, since most inputs are such and every node has room for one.
    pub fn kept(self) -> Option<Box<Evaluation>> {
        let unstated = self.shape == Shape::Normal && self.dof.is_none() && self.correlation.is_none();
        (!unstated).then(|| Box::new(self))
    }

    pub(super) fn of(kept: Option<&Evaluation>) -> &Evaluation {
        kept.unwrap_or(&UNSTATED)
    }
}
