//! `hessbook kernel CONNECTION_FILE`: serves one notebook client to its end.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::Args;

use crate::cli::Done;
use crate::kernel::connection::Connection;
use crate::kernel::server::{ServerError, serve};

/// Serve a notebook client (notebook clients start this themselves).
#[derive(Args)]
pub struct Kernel {
    /// The file in which the client says where to listen and how to sign.
    connection_file: PathBuf,
}

impl Kernel {
    pub fn run(&self) -> Done {
        let connection = Connection::read(&self.connection_file).map_err(ServerError::from)?;
        serve(&connection)?;
        Ok(ExitCode::SUCCESS)
    }
}
