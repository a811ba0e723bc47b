//! The notebook kernel: the open notebook messaging protocol on one side, a session on the other.
//!
//! [`server::serve`] runs it. Sockets, control and heartbeat live on the first thread and never wait for a cell;
//! one worker thread owns the session and sends everything that belongs to a request, from `busy` to `idle`,
//! through one bounded channel, so that order holds. ZeroMQ types stay inside this module.

pub mod arrivals;
pub mod connection;
mod gate;
mod handle;
mod history;
mod host;
pub mod install;
pub mod message;
mod outbox;
mod parent;
pub mod server;
pub mod wire;
mod worker;
