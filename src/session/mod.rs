//! One analyst's session: runs a cell to an outcome or to nothing.

pub mod outcome;

use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use crate::fault::Fault;
use outcome::{Completeness, Host, Outcome};

pub struct Session {
    stop: Arc<AtomicBool>,
}

impl Session {
    /// `stop` ends the running cell when it becomes true; whoever sets it clears it.
    pub fn new(stop: Arc<AtomicBool>) -> Self {
        Session { stop }
    }

    /// Runs one cell. `cell` names it in places and faults: `cell-3`, or the file name of a script.
    pub fn run_cell(&mut self, cell: &str, code: &str, host: &mut dyn Host) -> Outcome {
        let _ = (cell, code, host, &self.stop);
        Outcome { shown: None, result: Err(Fault::new("not-built", "there is no engine yet", "build it")) }
    }

    /// Whether the text is a whole cell, for front ends that ask before running it.
    pub fn completeness(&self, code: &str) -> Completeness {
        let _ = code;
        Completeness::Unknown
    }

    /// Evaluates an expression beside the cell, without keeping anything: a front end's `user_expressions`.
    pub fn evaluate(&mut self, code: &str) -> Result<crate::render::Bundle, Fault> {
        let _ = code;
        Err(Fault::new("not-built", "there is no engine yet", "build it"))
    }
}
