//! The script language of cells: the engine, made safe for numbers, and its faults in plain words.
//!
//! Reading order: `engine` (how it is set up), `numbers`, `compare` and `guards` (what is replaced), `prepare` (what
//! is read before the engine reads it), `fault` (errors in and out), `modules` (methods in files beside a notebook). The engine's types stay in here and in `session`.

pub mod bind;
pub mod compare;
pub mod curves;
pub mod engine;
pub mod fault;
pub mod files;
pub mod guards;
pub mod host;
pub mod literals;
pub mod memory;
pub mod module_text;
pub mod modules;
pub mod numbers;
pub mod operators;
pub mod prepare;
pub mod script_error;
pub mod show;
pub mod state;
pub mod syntax;
pub mod tables;
pub mod token;
pub mod verbs;
pub mod words;
