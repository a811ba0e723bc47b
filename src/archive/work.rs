//! An archive being worked on: the list, the audits there are, and the processes that make the others.

use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};

use crate::archive::order::Order;
use crate::archive::paths::{Found, Shard};
use crate::archive::pool::{Done, Pool};
use crate::archive::state::{State, StateError};
use crate::fault::Fault;
use crate::notebook::audit::could_not_run;
use crate::notebook::verdict::{Against, NotebookAudit};

/// A list of notebooks with the audits of some of them.
pub struct Work {
    order: Order,
    notebooks: Vec<PathBuf>,
    /// Folders that could not be read, which are rows at the end.
    unreadable: Vec<(PathBuf, String)>,
    state: State,
    /// Digest of the paths as they were asked for.
    asked: String,
}

/// Told of what is done.
pub trait Progress {
    /// `nth` has its audit now, which `state` can read back.
    ///
    /// # Errors
    /// What the teller cannot go on without, such as a state that cannot be read.
    fn done(&mut self, state: &State, nth: usize, audit: &NotebookAudit) -> Result<(), Fault>;
}

impl Work {
    /// The notebooks that fall to the shard, with what is known of them from an earlier run.
    ///
    /// # Errors
    /// The state file cannot be used.
    pub fn new(order: Order, found: Found, shard: Option<Shard>, resume: Option<&Path>) -> Result<Work, StateError> {
        let Found { mut notebooks, mut unreadable, asked } = found;
        if let Some(shard) = shard {
            notebooks.retain(|path| shard.takes(path));
            unreadable.retain(|(path, _)| shard.takes(path));
        }
        let rows: Vec<PathBuf> = notebooks.iter().chain(unreadable.iter().map(|(path, _)| path)).cloned().collect();
        let state = match resume {
            Some(path) => State::resumed(path, &order, shard.map(|shard| shard.to_string()), &rows)?,
            None => State::temporary(&order, rows.len())?,
        };
        Ok(Work { order, notebooks, unreadable, state, asked })
    }

    /// Rows there are to be.
    pub fn count(&self) -> usize {
        self.notebooks.len() + self.unreadable.len()
    }

    /// Rows that are left to be made.
    pub fn left(&self) -> usize {
        self.state.open().len()
    }

    pub fn state(&self) -> &State {
        &self.state
    }

    /// Makes the audits that are missing. Gives whether all are there: not where `stop` was set.
    ///
    /// # Errors
    /// The state cannot be written, or `progress` gives up.
    pub fn finish(&mut self, pool: &Pool, stop: &AtomicBool, progress: &mut dyn Progress) -> Result<bool, Fault> {
        let open = self.state.open();
        let state = &mut self.state;
        let mut keep = |done: Done| -> Result<(), Fault> {
            let (nth, audit) = (done.nth, done.audit.clone());
            state.keep(done)?;
            progress.done(state, nth, &audit)
        };
        let readable = open.iter().take_while(|nth| **nth < self.notebooks.len());
        let paths: Vec<(usize, PathBuf)> = readable.map(|nth| (*nth, self.notebooks[*nth].clone())).collect();
        pool.run(&self.order, &paths, stop, &mut keep)?;
        if stop.load(Ordering::Relaxed) {
            return Ok(false);
        }
        for &nth in open.iter().filter(|nth| **nth >= self.notebooks.len()) {
            let (path, why) = &self.unreadable[nth - self.notebooks.len()];
            let fault = Fault::new(
                "folder-unreadable",
                format!("the folder cannot be read: {why}"),
                "check the rights to it; its notebooks were not audited",
            );
            let audit = could_not_run(&path.display().to_string(), Against::Nothing, "the folder", &fault);
            keep(Done { nth, audit, lost: true })?;
        }
        self.state.finish(&self.asked)?;
        Ok(true)
    }
}
