//! The open Jupyter messaging protocol, spoken over ZeroMQ.
