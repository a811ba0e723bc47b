//! `hessbook keys`: keys to sign seals with.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Args, Subcommand};

use crate::notebook::signature::new_keys;

use super::{Done, out};

/// Make keys to sign seals with.
#[derive(Args)]
pub struct Keys {
    #[command(subcommand)]
    command: KeysCommand,
}

#[derive(Subcommand)]
enum KeysCommand {
    /// Make a pair of keys: the private one in FILE, the public one in FILE.pub
    New {
        /// Where the private key goes; keep it to yourself
        file: PathBuf,
    },
}

impl Keys {
    pub(super) fn run(self) -> Done {
        let KeysCommand::New { file } = self.command;
        let public = new_keys(&file)?;
        out(&format!("{}: private key, to sign with; keep it to yourself\n", file.display()));
        out(&format!("{}: public key, for those who audit\n", public.display()));
        Ok(ExitCode::SUCCESS)
    }
}
