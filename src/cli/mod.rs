//! The command line: one enum of subcommands, one file for each.
//!
//! A command gives the program's exit status, or a fault that is printed with its way out. The meaning of statuses
//! other than 0 is said in the help of the commands that have them.

mod audit;
mod data;
mod data_change;
mod install;
mod kernel;
mod keys;
mod run;
mod seal;

use std::collections::BTreeMap;
use std::io::{self, Write};
use std::path::{Path, PathBuf};
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

/// The notebooks in a folder and those below it, by path; a file is itself.
fn notebooks_below(path: &Path) -> Vec<PathBuf> {
    if !path.is_dir() {
        return vec![path.to_owned()];
    }
    let mut paths: Vec<PathBuf> =
        std::fs::read_dir(path).into_iter().flatten().flatten().map(|entry| entry.path()).collect();
    paths.sort();
    let is_notebook = |path: &Path| path.extension().is_some_and(|extension| extension == "ipynb");
    let hidden = |path: &Path| path.file_name().is_some_and(|name| name.to_string_lossy().starts_with('.'));
    // A link to a folder may lead round in a circle, and is passed over.
    let kept =
        paths.into_iter().filter(|path| !hidden(path) && (is_notebook(path) || (path.is_dir() && !path.is_symlink())));
    kept.flat_map(|path| notebooks_below(&path)).collect()
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
