//! Formulas: one file per family, each with its doc, its function, its cards and its tests.
//!
//! [`CARDS`] is the one list of what the program can compute. Script binding, help, catalogue and checks read it.

pub mod answer;
pub mod basis;
pub mod budget;
pub mod card;
pub mod claims;
pub mod conditions;
pub mod expanded;
pub mod function;
pub mod gather;
pub mod linearity;
pub mod monte_carlo;
pub mod property;
pub mod quantities;
pub mod reaction;
pub mod readings;
pub mod review;
pub mod tolerance;

use card::Card;

/// Every formula the program offers, in the order the catalogue prints them.
pub const CARDS: &[&Card] = &[
    &reaction::REACTION,
    &reaction::BALANCE,
    &property::ENTHALPY,
    &property::INTERNAL_ENERGY,
    &property::GIBBS_ENERGY,
    &property::HELMHOLTZ_ENERGY,
    &property::ENTROPY,
    &property::HEAT_CAPACITY,
    &property::EQUILIBRIUM_CONSTANT,
    &basis::PER,
    &quantities::MEAN,
    &quantities::TO,
    &quantities::VALUE,
    &quantities::UNCERTAINTY,
    &quantities::AGREES,
    &quantities::ASSUME,
    &readings::READINGS,
    &readings::CORRELATION,
    &budget::BUDGET,
    &expanded::EXPANDED,
    &monte_carlo::MONTE_CARLO,
    &linearity::TESTED,
];
