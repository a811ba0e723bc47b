//! What a cell gives, and what it may ask for while it runs.

use crate::fault::Fault;
use crate::render::Bundle;

/// Whoever runs cells: the kernel, the notebook runner and the tests are three hosts. Called while the cell runs.
pub trait Host {
    /// Text printed by the cell.
    fn write(&mut self, stderr: bool, text: &str);
    /// Something to show in the middle of a cell: a report, a picture.
    fn show(&mut self, bundle: &Bundle);
}

/// What one cell gave.
#[derive(Debug)]
pub struct Outcome {
    /// The value of the last expression, unless the cell ends in `;` or the value is nothing.
    pub shown: Option<Bundle>,
    pub result: Result<(), Fault>,
}

/// Whether a text is a whole cell.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Completeness {
    Complete,
    Incomplete,
    Invalid,
    Unknown,
}
