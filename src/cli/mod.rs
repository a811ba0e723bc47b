//! The command line: one enum of subcommands, one file for each.
//!
//! A command gives the program's exit status, or a fault that is printed with its way out. The meaning of statuses
//! other than 0 is said in the help of the commands that have them.

mod install;
mod kernel;
mod run;

use std::io::{self, Write};
use std::process::ExitCode;

use clap::{Parser, Subcommand};

use crate::fault::Fault;

/// A notebook engine for thermochemistry: values that carry unit, basis, uncertainty, sources and priced assumptions.
#[derive(Parser)]
#[command(name = "hessbook", version, arg_required_else_help = true)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    Run(run::Run),
    Install(install::Install),
    Kernel(kernel::Kernel),
}

/// Runs the program.
pub fn run() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Run(command) => command.run(),
        Command::Install(command) => command.run(),
        Command::Kernel(command) => command.run(),
    };
    done.unwrap_or_else(|fault| {
        // There is nobody to tell when stderr is closed.
        let _ = writeln!(io::stderr(), "hessbook: {fault}");
        FAILED.into()
    })
}

/// The exit status of a command that could not do its work.
const FAILED: u8 = 2;

/// What every command gives.
type Done = Result<ExitCode, Fault>;
