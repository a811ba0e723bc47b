//! An archive of notebooks: which files, worker processes that audit them, and the reports on the whole.

pub mod audits;
mod json;
mod junit;
mod page;
pub mod report;
mod rows;
pub mod tally;
mod text;
mod words;
