//! The command line: one enum of subcommands, one file for each.

mod run;

use std::process::ExitCode;

use clap::{Parser, Subcommand};

use crate::fault::Fault;

#[derive(Parser)]
#[command(name = "hessbook", version, about, arg_required_else_help = true)]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    Run(run::Run),
}

pub fn run() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Run(command) => command.run(),
    };
    done.unwrap_or_else(|fault| {
        eprintln!("hessbook: {fault}");
        2.into()
    })
}

type Done = Result<ExitCode, Fault>;
