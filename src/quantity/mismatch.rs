//! Why two quantities cannot meet, or one cannot be shown as asked.

use thiserror::Error;

use crate::fault::Explain;
use crate::units::{Base, Dimension, Entity, KindMismatch, Of, Unit, UnitError, basis_words, unit_for};

/// Everything that can go wrong between finished quantities.
#[derive(Clone, Debug, Error)]
pub enum Mismatch {
    #[error("cannot {verb} {} {} {}", basis(left), joiner(verb), basis(right))]
    Basis { verb: &'static str, left: Dimension, right: Dimension },
    #[error("cannot {verb} a value in {} {} one in {}", unit_name(left), joiner(verb), unit_name(right))]
    Dimensions { verb: &'static str, left: Dimension, right: Dimension },
    #[error("a mole of nothing in particular could be a mole of {first} or of {second} here")]
    OpenMole { first: &'static str, second: &'static str },
    #[error(transparent)]
    Kinds(#[from] KindMismatch),
    #[error("a value in {} is not one in {wanted}", unit_name(value))]
    Unit { value: Dimension, wanted: String, unit: Dimension },
    #[error("a difference of {difference_k} K is not a temperature on the scale {unit}")]
    DifferenceAsPoint { difference_k: f64, unit: String },
    #[error(transparent)]
    UnitText(#[from] UnitError),
    #[error("the result is not a finite number")]
    NotFinite,
    #[error("the exponent {exponent} gives {} no whole power of its units", unit_name(dim))]
    Exponent { exponent: f64, dim: Dimension },
    #[error("the product's units have an exponent past any use, {}", dim)]
    PowerTooHigh { dim: Dimension },
    #[error("{function} wants a pure number, not a value in {}", unit_name(dim))]
    NotPure { function: &'static str, dim: Dimension },
    #[error("{function} is taken of a positive number only, not of {number}")]
    NotPositive { function: &'static str, number: f64 },
    #[error("nothing is stated about the uncertainty of the two values, so whether they agree cannot be said")]
    AgreementWithoutUncertainty,
}

impl Mismatch {
    /// Two dimensions that cannot be combined by `verb` ("add", "subtract", "compare").
    pub fn between(verb: &'static str, left: &Dimension, right: &Dimension) -> Self {
        let (left, right) = (left.clone(), right.clone());
        if left.without_basis() == right.without_basis() {
            Mismatch::Basis { verb, left, right }
        } else {
            Mismatch::Dimensions { verb, left, right }
        }
    }

    pub fn unit(value: &Dimension, unit: &Unit) -> Self {
        Mismatch::Unit { value: value.clone(), wanted: unit.text.to_string(), unit: unit.dim.clone() }
    }
}

fn joiner(verb: &str) -> &'static str {
    if verb == "compare" { "with" } else { "and" }
}

fn unit_name(dim: &Dimension) -> String {
    unit_for(dim).text.to_string()
}

fn basis(dim: &Dimension) -> String {
    basis_words(dim).map_or_else(|| "a total".to_owned(), |words| format!("a value {words}"))
}

/// The one entity a dimension is per mole of, if it is per mole of just one thing.
fn per_mole_of(dim: &Dimension) -> Option<Entity> {
    match dim.entities() {
        [(Of::Amount, entity, -2)] => Some(*entity),
        _ => None,
    }
}

/// The name of the one substance whose mass, against a bare mass, is all that keeps a value from a unit.
fn uncancelled_mass(value: &Dimension, unit: &Dimension) -> Option<&'static str> {
    let ratio = value.over(unit);
    let [(Of::Mass, entity, halves)] = *ratio.entities() else { return None };
    let bare = Dimension::base(Base::Kilogram).powered(-i32::from(halves))?;
    (ratio.without_basis() == bare).then(|| entity.name())
}

impl Explain for Mismatch {
    fn code(&self) -> &'static str {
        match self {
            Mismatch::Basis { .. } => "basis-mismatch",
            Mismatch::Dimensions { .. } => "dimensions-differ",
            Mismatch::OpenMole { .. } => "open-mole-ambiguous",
            Mismatch::Kinds(kinds) => kinds.code(),
            Mismatch::Unit { .. } => "unit-does-not-fit",
            Mismatch::DifferenceAsPoint { .. } => "difference-as-point",
            Mismatch::UnitText(unit) => unit.code(),
            Mismatch::NotFinite => "not-finite",
            Mismatch::Exponent { .. } => "exponent-not-whole",
            Mismatch::PowerTooHigh { .. } => "power-too-high",
            Mismatch::NotPure { .. } => "not-a-pure-number",
            Mismatch::NotPositive { .. } => "not-positive",
            Mismatch::AgreementWithoutUncertainty => "agreement-without-uncertainty",
        }
    }

    fn hint(&self) -> String {
        match self {
            Mismatch::Basis { left, right, .. } => basis_hint(left, right),
            Mismatch::Dimensions { left, right, .. } => {
                format!("multiply or divide until both are in {} or both in {}", unit_name(left), unit_name(right))
            }
            Mismatch::OpenMole { .. } => "name what the moles are of, as in `q(\"1 kJ/mol[CH4]\")`".to_owned(),
            Mismatch::Kinds(kinds) => kinds.hint(),
            Mismatch::Unit { value, unit, .. } => match uncancelled_mass(value, unit) {
                Some(of) => format!(
                    "a kg of nothing in particular does not cancel a kg of {of}: say of what it is where it comes in, as in \
                     `q(\"1 kg[{of}]\")` or `q(\"1 t[{of}]/h\")`"
                ),
                None => format!("ask for it in {}, or in a unit of the same dimension", unit_name(value)),
            },
            Mismatch::DifferenceAsPoint { .. } => "a difference is shown in K: `.to(\"K\")`".to_owned(),
            Mismatch::UnitText(unit) => unit.hint(),
            Mismatch::NotFinite => {
                "look for a division by zero or an exponent out of range; for a very large or small \
                equilibrium constant ask `r.gibbs_energy(T)` instead"
                    .to_owned()
            }
            Mismatch::Exponent { .. } => {
                "whole and half exponents keep their units, as in `x ** 2` and `x ** 0.5`".to_owned()
            }
            Mismatch::PowerTooHigh { .. } => "divide before multiplying on".to_owned(),
            Mismatch::NotPure { function, dim } => {
                let unit = unit_name(dim);
                format!(
                    "divide by a value of the same dimension first, or name the unit: `{function}(x.value(\"{unit}\"))`"
                )
            }
            Mismatch::NotPositive { function, .. } => format!("check the sign of what `{function}` is given"),
            Mismatch::AgreementWithoutUncertainty => {
                "state an uncertainty for one of them, as in `q(\"-285.830(20) kJ/mol\")`".to_owned()
            }
        }
    }
}

fn basis_hint(left: &Dimension, right: &Dimension) -> String {
    let (of_left, of_right) = (per_mole_of(left), per_mole_of(right));
    let (reaction, substance) = match (of_left, of_right) {
        (Some(a), Some(b)) if a == Entity::RXN => (true, b),
        (Some(a), Some(b)) if b == Entity::RXN => (true, a),
        (Some(a), Some(b)) => {
            return format!(
                "multiply one by the ratio of the two, `exact(\"1 mol[{}]/mol[{}]\")` with the number that holds",
                a.name(),
                b.name()
            );
        }
        _ => return "multiply the molar or specific value by its amount or mass first".to_owned(),
    };
    debug_assert!(reaction);
    let name = substance.name();
    format!(
        "multiply the value per mole of {name} by its stoichiometric number, as in `x * exact(\"1 mol[{name}]/mol[rxn]\")`, \
         or take the reaction value per mole of {name} with `.per(\"{name}\")`"
    )
}
