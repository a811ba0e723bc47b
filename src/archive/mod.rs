//! An archive of notebooks: which files, worker processes that audit them, and the reports on the whole.

pub mod audits;
pub mod order;
pub mod paths;
pub mod pool;
pub mod state;
pub mod work;
pub mod worker;
