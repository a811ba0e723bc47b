//! The command line: one enum of subcommands, one file for each.
//!
//! A command gives the program's exit status, or a fault that is printed with its way out. The meaning of statuses
//! other than 0 is said in the help of the commands that have them.

mod archive;
mod audit;
mod data;
mod data_change;
mod explain;
mod install;
mod kernel;
mod keys;
mod run;
mod seal;

use std::collections::BTreeMap;
use std::io::{self, Write};
use std::process::ExitCode;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

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
    Seal(seal::Seal),
    Audit(audit::Audit),
    #[command(hide = true)]
    AuditWorker(audit::AuditWorker),
    Explain(explain::Explain),
    Data(data::Data),
    Keys(keys::Keys),
    Install(install::Install),
    Kernel(kernel::Kernel),
}

/// Runs the program.
pub fn run() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Run(command) => command.run(),
        Command::Seal(command) => command.run(),
        Command::Audit(command) => command.run(),
        Command::AuditWorker(command) => command.run(),
        Command::Explain(command) => command.run(),
        Command::Data(command) => command.run(),
        Command::Keys(command) => command.run(),
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

/// Writes to standard output. A reader that went away (`| head`) ends the output, not the work.
fn out(text: &str) {
    let _ = io::stdout().lock().write_all(text.as_bytes());
}

fn err(text: &str) {
    let _ = io::stderr().lock().write_all(text.as_bytes());
}

/// `name=text`, as `--set` takes it.
fn setting(text: &str) -> Result<(String, String), String> {
    match text.split_once('=') {
        Some((name, value)) if !name.trim().is_empty() => Ok((name.trim().to_owned(), value.to_owned())),
        _ => Err("write it as name=text, as in outlet=\"450 degC\"".to_owned()),
    }
}

/// Parameters by name, each set once.
fn settings(given: &[(String, String)]) -> Result<BTreeMap<String, String>, Fault> {
    let mut settings = BTreeMap::new();
    for (name, value) in given {
        if settings.insert(name.clone(), value.clone()).is_some() {
            return Err(Fault::new("parameter-set-twice", format!("`{name}` is set twice"), "set each parameter once"));
        }
    }
    Ok(settings)
}

/// A flag that Ctrl-C sets.
fn stopped_by_interrupt() -> Arc<AtomicBool> {
    let stop = Arc::new(AtomicBool::new(false));
    if let Err(error) = signal_hook::flag::register(signal_hook::consts::SIGINT, Arc::clone(&stop)) {
        err(&format!("hessbook: Ctrl-C cannot be listened for: {error}\n"));
    }
    stop
}

/// What every command gives.
type Done = Result<ExitCode, Fault>;
