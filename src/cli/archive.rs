//! What the commands that work on an archive have in common: their processes, progress on a terminal, text in order.

use std::io::{IsTerminal, stderr};
use std::path::Path;
use std::time::Duration;

use clap::Args;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use crate::archive::pool::Pool;
use crate::archive::state::State;
use crate::archive::work::{Progress, Work};
use crate::fault::Fault;
use crate::notebook::verdict::{AuditStatus, NotebookAudit};

use super::out;

/// Notebooks from which on text is short about those that are the same.
const MANY: usize = 10;

/// The processes that run notebooks.
#[derive(Args)]
pub struct Workers {
    /// Notebooks that are run at a time; one for each core, if left out
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    jobs: Option<u16>,
    /// Seconds that a notebook may take
    #[arg(long, value_name = "SECONDS", default_value_t = 120, value_parser = clap::value_parser!(u64).range(1..=1_000_000))]
    time_limit: u64,
    /// MiB of memory that a notebook may take
    #[arg(long, value_name = "MIB", default_value_t = 1024, value_parser = clap::value_parser!(u64).range(64..=1_048_576))]
    memory_limit: u64,
}

impl Workers {
    pub(super) fn pool(&self) -> Result<Pool, Fault> {
        let unknown = |error: std::io::Error| {
            Fault::new(
                "program-not-found",
                format!("the path of this program is not known: {error}"),
                "start it by its full path",
            )
        };
        let cores = || std::thread::available_parallelism().map_or(1, usize::from);
        Ok(Pool {
            jobs: self.jobs.map_or_else(cores, usize::from),
            time_limit: Duration::from_secs(self.time_limit),
            memory_limit_mib: self.memory_limit,
            program: std::env::current_exe().map_err(unknown)?,
        })
    }
}

/// What is printed of a notebook; whether there are many.
type Text = dyn Fn(&NotebookAudit, bool) -> String;

/// Prints notebooks in the order of the list as they are done, and progress on a terminal.
pub struct Printer<'a> {
    text: Option<&'a Text>,
    many: bool,
    /// The first notebook that is not printed yet.
    next: usize,
    bar: ProgressBar,
    counts: [usize; 3],
}

impl<'a> Printer<'a> {
    /// Prints what an earlier run left.
    ///
    /// # Errors
    /// Its audits cannot be read back.
    pub(super) fn new(work: &Work, prints: bool, text: &'a Text) -> Result<Printer<'a>, Fault> {
        let bar = if stderr().is_terminal() && work.left() > 1 {
            ProgressBar::with_draw_target(Some(work.count() as u64), ProgressDrawTarget::stderr())
        } else {
            ProgressBar::hidden()
        };
        let style = ProgressStyle::with_template("{bar:30} {pos} of {len} notebooks, {msg}; {eta} left");
        bar.set_style(style.unwrap_or_else(|e| unreachable!("the template is fixed: {e}")));
        let mut printer =
            Printer { text: prints.then_some(text), many: work.count() > MANY, next: 0, bar, counts: [0; 3] };
        for nth in 0..work.count() {
            if let Some(audit) = work.state().audit(nth)? {
                printer.count(&audit);
            }
        }
        printer.print(work.state())?;
        Ok(printer)
    }

    fn count(&mut self, audit: &NotebookAudit) {
        let at = match audit.status {
            AuditStatus::Same | AuditStatus::NothingToCompare => 0,
            AuditStatus::Differs => 1,
            AuditStatus::CouldNotRun => 2,
        };
        self.counts[at] += 1;
        let [same, differ, failed] = self.counts;
        self.bar.set_message(format!("{same} the same, {differ} differ, {failed} could not run"));
        self.bar.set_position((same + differ + failed) as u64);
    }

    fn print(&mut self, state: &State) -> Result<(), Fault> {
        let Some(text) = self.text else { return Ok(()) };
        while let Some(audit) = state.audit(self.next)? {
            self.bar.suspend(|| out(&text(&audit, self.many)));
            self.next += 1;
        }
        Ok(())
    }

    /// Takes the progress off the terminal.
    pub(super) fn end(&self) {
        self.bar.finish_and_clear();
    }
}

impl Progress for Printer<'_> {
    fn done(&mut self, state: &State, _nth: usize, audit: &NotebookAudit) -> Result<(), Fault> {
        self.count(audit);
        self.print(state)
    }
}

/// What is said of an audit that was stopped.
pub(super) fn interrupted(work: &Work, resume: Option<&Path>) -> Fault {
    let done = work.count() - work.left();
    let way_out = match resume {
        Some(path) => format!("run the same command again: it goes on with what {} holds", path.display()),
        None => "run it again; with --resume FILE it would go on where it stopped".to_owned(),
    };
    Fault::new("audit-interrupted", format!("stopped after {done} of {} notebooks", work.count()), way_out)
}
