//! Notebook files: read leniently, run in order, written strictly; sealed, and audited.

pub mod audit;
pub mod audit_text;
pub mod beside;
pub mod causes;
pub mod comparison;
pub mod contradiction;
pub mod data_change;
pub mod edits;
pub mod file;
pub mod fixed_units;
pub mod holdings;
pub mod outputs;
pub mod parting;
pub mod rederive;
pub mod run;
pub mod seal;
pub mod sealing;
pub mod side_by_side;
pub mod signature;
pub mod skeleton;
pub mod trial;
pub mod verdict;
