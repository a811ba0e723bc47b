//! hessbook: a notebook engine for thermochemistry, in which a value keeps its unit, basis, uncertainty, sources and
//! assumptions, and each assumption is tested and priced.
//!
//! # Reading order
//! From what a number is to who asks for it; each module uses only those before it.
//! 1. [`fault`], [`source`], [`num`]: how errors read, where figures come from, plain numerics.
//! 2. [`units`], [`record`], [`quantity`]: dimensions that know what a mole is of, the graph behind a value, the value.
//! 3. [`chem`], [`data`]: formulas and balanced equations; the published tables.
//! 4. [`model`]: formulas as cards, tests of assumptions, and the review that a report is made from.
//! 5. [`render`]: a value or report as text, HTML, LaTeX and machine record.
//! 6. [`script`], [`session`]: the engine made safe for numbers, and cells that run as a whole or not at all.
//! 7. [`notebook`], [`kernel`], [`cli`]: files, the messaging protocol, the command line.
//!
//! # One cell
//! 1. A client's request reaches [`kernel`], or [`notebook::run`] takes the next cell. Both call
//!    [`session::Session::run_cell`] and lend it a [`session::outcome::Host`], which writes and shows while the cell runs.
//! 2. The session compiles the text and evaluates it in a copy of its variables. `q("450 degC")` becomes a
//!    [`quantity::Quantity`] with a leaf of its own in the graph.
//! 3. `shift.enthalpy(T)` finds its [`model::card::Card`]; [`model::card::call`] checks the arguments, runs the formula and
//!    keeps the call as one [`record::node::Node`] with its partial derivatives. Nothing is tested yet.
//! 4. `report("...", dH)` walks the graph: [`model::review`] tests each claim of each card once, prices it at the value
//!    reported and judges it by the tolerance. [`render::report::Report`] turns that into one record and its forms.
//! 5. If the cell succeeds, the copy becomes the session's state. If it fails, nothing of it is kept, and its
//!    [`fault::Fault`] says what, where, and the way out.
//!
//! # Invariants
//! - Modules point one way, in the order above; `notebook` and `kernel` do not know each other.
//! - `num` to `model` do no input or output, read no clock, and never panic on user input; the only random numbers are
//!   those of a seed that stands in the result.
//! - Order that reaches output comes from a `BTreeMap` or a `Vec`.
//! - rhai types stay in `script` and `session`, ZeroMQ in `kernel`, notebook JSON in `notebook`.
//! - Types below `notebook` and `kernel` are not `Serialize`, except the report record, whose name has its version.
//! - Elementary functions come from [`num::math`], so that every machine computes the same bits.
//! - Uncertainty, correlation, sources and assumptions are readings of one graph; a status is worked out when asked for.
//!
//! `tests/house.rs` checks what of this a program can check.

pub mod archive;
pub mod chem;
pub mod cli;
pub mod data;
pub mod fault;
pub mod kernel;
pub mod model;
pub mod notebook;
pub mod num;
pub mod quantity;
pub mod record;
pub mod render;
pub mod script;
pub mod session;
pub mod source;
pub mod units;
