//! An archive of notebooks: which files, worker processes that audit them, and the reports on the whole.

pub mod audits;
mod json;
mod junit;
pub mod order;
mod page;
pub mod paths;
pub mod pool;
pub mod report;
mod rows;
pub mod state;
pub mod tally;
mod text;
mod words;
pub mod work;
pub mod worker;
