//! An archive of notebooks: which files, worker processes that audit them, and the reports on the whole.

pub mod audits;
