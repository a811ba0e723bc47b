//! `hessbook install`: makes the kernel known to notebook clients.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::Args;

use crate::cli::Done;
use crate::kernel::install::{Place, install};

/// Make this program known to notebook clients as a kernel.
#[derive(Args)]
pub struct Install {
    /// Install for the present user alone (this is the default).
    #[arg(long, conflicts_with = "prefix")]
    user: bool,
    /// Install into an environment: the kernel goes to DIR/share/jupyter/kernels.
    #[arg(long, value_name = "DIR")]
    prefix: Option<PathBuf>,
}

impl Install {
    pub fn run(self) -> Done {
        let place = self.prefix.map_or(Place::User, Place::Prefix);
        let folder = install(&place)?;
        println!("the kernel is installed in {}", folder.display());
        Ok(ExitCode::SUCCESS)
    }
}
