//! Streams and what a plant asks of them: heat duty, adiabatic temperature, temperature rise.
//!
//! Everything is one balance, Σ n H of what leaves minus Σ n H of what was fed, each stream at its own temperature, with
//! enthalpies counted from the elements at 298.15 K in one dataset of formation enthalpies. One file for each noun:
//! [`stream`], [`contents`] (what is fed, what reacts, what leaves), [`balance`], [`adiabatic`], [`rise`].

pub mod adiabatic;
pub mod amount;
pub mod balance;
pub mod claims;
pub mod contents;
pub mod dissociation;
pub mod equilibrium;
pub mod error;
pub mod rise;
pub mod stream;
pub mod tally;
pub mod words;
