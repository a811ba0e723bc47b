//! What makes a value defensible: where it came from, how sure it is, and what it assumes.

pub mod correlation;
pub mod evaluation;
pub mod freedom;
pub mod node;
pub mod register;
pub mod spread;
pub mod tape;

pub use correlation::Correlation;
pub use evaluation::{Evaluation, Shape};
pub use node::{Input, LeafKey, Node, Operator, Origin, Step};
pub use spread::{Sensitivity, Spread};
