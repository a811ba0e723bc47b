//! The audits of many notebooks, walked one at a time, so that an archive of any size needs the memory of one notebook.

use crate::fault::Fault;
use crate::notebook::verdict::NotebookAudit;

/// Audits in the order of their files, which can be walked as often as a report needs.
pub trait Audits {
    /// Hands each audit over, until one is refused.
    ///
    /// # Errors
    /// What `take` gives, and audits that cannot be read back.
    fn each(&self, take: &mut dyn FnMut(&NotebookAudit) -> Result<(), Fault>) -> Result<(), Fault>;
}

impl Audits for [NotebookAudit] {
    fn each(&self, take: &mut dyn FnMut(&NotebookAudit) -> Result<(), Fault>) -> Result<(), Fault> {
        self.iter().try_for_each(take)
    }
}
