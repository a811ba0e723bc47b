//! `hessbook audit`: runs sealed notebooks again and says what became of each value.

use std::io::{self, IsTerminal, Write, stdout};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::time::Instant;

use clap::{Args, ValueEnum};

use crate::archive::audits::Audits;
use crate::archive::order::{Order, Prepared, Task};
use crate::archive::paths::{Shard, found};
use crate::archive::report::{self, About};
use crate::archive::state::State;
use crate::archive::work::Work;
use crate::archive::worker;
use crate::fault::Fault;
use crate::notebook::audit::AuditOptions;
use crate::notebook::audit_text;
use crate::notebook::file::{FileError, write_whole_by};
use crate::notebook::signature::TrustedKey;
use crate::notebook::verdict::{AuditStatus, Difference, NotebookAudit, ValueAudit, Verdict};
use crate::render::harmless::in_one_line;
use crate::units::constants;

use super::archive::{Printer, Workers, interrupted};
use super::{Done, err, out, stopped_by_interrupt};

/// Run sealed notebooks again, with the sealed data and with today's, and compare every reported value.
///
/// A notebook without a seal is compared with the results recorded in it. Each notebook is run by a process of its own kind,
/// several at a time; one that does not end, dies or cannot be read costs its own row.
///
/// Exit status: 0 when every value is the same under the sealed data, 1 when one differs, 2 when one could not be run.
#[derive(Args)]
pub struct Audit {
    /// Notebooks, folders of notebooks, and patterns such as "archive/**/2024-*.ipynb"; with --gathered, state files
    #[arg(required = true)]
    paths: Vec<PathBuf>,
    /// Let moves under today's data count for the exit status too
    #[arg(long)]
    strict_data: bool,
    /// Derive each value again from its sealed steps and records too, without running the author's cells
    #[arg(long)]
    from_sources: bool,
    /// A public key, as `hessbook keys new` makes it, whose signatures you trust
    #[arg(long, value_name = "KEYFILE")]
    trust: Vec<PathBuf>,
    /// Let a notebook that is not signed with a trusted key count for the exit status too
    #[arg(long, requires = "trust")]
    strict_signature: bool,
    /// Take the constants of this CODATA year for today's
    #[arg(long, value_name = "YEAR")]
    constants: Option<u16>,
    /// What is printed
    #[arg(long, value_enum, default_value_t = Format::Text)]
    format: Format,
    /// Write a page of HTML to be filed, complete in itself
    #[arg(long, value_name = "FILE")]
    page: Option<PathBuf>,
    /// Write JUnit XML, for a build server
    #[arg(long, value_name = "FILE")]
    junit: Option<PathBuf>,
    /// Audit one part of several, as in `--shard 2/4`; every notebook falls to exactly one
    #[arg(long, value_name = "I/N")]
    shard: Option<Shard>,
    /// Keep the audits in this file as they are done, and go on from it after a run that was stopped
    #[arg(long, value_name = "FILE")]
    resume: Option<PathBuf>,
    /// Run nothing: the paths are state files that --resume kept, those of all shards of an archive; report on them
    #[arg(long, conflicts_with_all = ["shard", "resume", "strict_data", "from_sources", "trust", "strict_signature", "constants"])]
    gathered: bool,
    #[command(flatten)]
    workers: Workers,
}

#[derive(Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Format {
    Text,
    Json,
}

impl Audit {
    pub(super) fn run(self) -> Done {
        let start = Instant::now();
        for path in self.page.iter().chain(&self.junit) {
            placed(path)?;
        }
        if self.gathered {
            let state = State::gathered(&self.paths)?;
            let options = options_of(state.order())?;
            return self.report(&state, &options, start);
        }
        let trusted = self.trust.iter().map(|path| TrustedKey::read(path)).collect::<Result<_, _>>()?;
        let order = Order::now(Task::Audit {
            strict_data: self.strict_data,
            from_sources: self.from_sources,
            constants: self.constants.unwrap_or(constants::CURRENT),
            strict_signature: self.strict_signature,
            trusted,
        });
        // What the workers could not read is said before any is started.
        let options = options_of(&order)?;
        let stop = stopped_by_interrupt();
        let mut work = Work::new(order, found(&self.paths)?, self.shard, self.resume.as_deref())?;
        if work.count() == 0 {
            err("hessbook: no notebook falls to this shard\n");
        }
        let trusts = !self.trust.is_empty();
        let text = move |audit: &NotebookAudit, many: bool| text_of(audit, many, trusts);
        let mut printer = Printer::new(&work, self.format == Format::Text, &text)?;
        let whole = work.finish(&self.workers.pool()?, &stop, &mut printer)?;
        printer.end();
        if !whole {
            return Err(interrupted(&work, self.resume.as_deref()));
        }
        self.report(work.state(), &options, start)
    }

    /// What is written and said at the end.
    fn report(&self, state: &State, options: &AuditOptions, start: Instant) -> Done {
        let paths = self.paths.iter().map(|path| path.display().to_string()).collect();
        let took = (!state.is_in_parts()).then(|| start.elapsed());
        let mut about = About::of(options, paths, state.ended().unwrap_or_default(), took);
        // Gathered audits were made by the program that stands in them.
        let program = &state.order().program;
        (about.program, about.tables) = (format!("hessbook {}", program.version), program.stdlib.clone());
        about.left_out.extend(self.shard.map(|shard| format!("notebooks of other shards than {shard}")));
        if let Some(path) = &self.page {
            written(path, |out| report::page(state, &about, out))?;
        }
        if let Some(path) = &self.junit {
            written(path, |out| report::junit(state, &about, out))?;
        }
        match self.format {
            Format::Json => report::json(state, &about, &mut stdout().lock())?,
            // One notebook has said all there is to say.
            Format::Text if state.count() != 1 || self.gathered => {
                let colour = stdout().is_terminal() && std::env::var_os("NO_COLOR").is_none();
                let mut text = Vec::new();
                report::text(state, &about, colour, &mut text)?;
                out(&String::from_utf8_lossy(&text));
            }
            Format::Text => {}
        }
        let mut worst = AuditStatus::Same;
        state.each(&mut |audit| {
            worst = worst.max(audit.status);
            Ok(())
        })?;
        Ok(ExitCode::from(worst.exit()))
    }
}

fn options_of(order: &Order) -> Result<AuditOptions, Fault> {
    match order.prepared()? {
        Prepared::Audit(options) => Ok(*options),
        Prepared::Revision { .. } => Err(Fault::new(
            "state-of-a-revision",
            "the state file is of a comparison of two tables",
            "give state files that `hessbook audit --resume FILE` wrote",
        )),
    }
}

/// Writes a report as a whole or not at all.
fn written(path: &Path, write: impl FnOnce(&mut dyn Write) -> Result<(), Fault>) -> Result<(), Fault> {
    /// What went wrong: with the file, or with what is written to it.
    enum Failed {
        File(io::Error),
        Report(Fault),
    }
    impl From<io::Error> for Failed {
        fn from(error: io::Error) -> Failed {
            Failed::File(error)
        }
    }
    write_whole_by(path, |file| write(file).map_err(Failed::Report)).map_err(|failed| match failed {
        Failed::File(error) => FileError::Write { path: path.to_owned(), why: error.to_string() }.into(),
        Failed::Report(fault) => fault,
    })
}

/// Whether a report can be written there, asked before an audit that may take long.
fn placed(path: &Path) -> Result<(), Fault> {
    let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    if folder.is_dir() && !path.is_dir() {
        return Ok(());
    }
    let what = if path.is_dir() { "it is a folder" } else { "its folder is not there" };
    Err(Fault::new(
        "report-without-place",
        format!("the report cannot be written to {}: {what}", path.display()),
        "name a file in a folder that is there; nothing was audited",
    ))
}

/// One notebook as text. Where there are many, one of which there is nothing to say takes one line.
fn text_of(audit: &NotebookAudit, many: bool, trusts: bool) -> String {
    let same = |value: &ValueAudit| value.under_today.verdict == Verdict::Identical;
    let quiet = audit.status == AuditStatus::Same
        && audit.faults.is_empty()
        && audit.values.iter().all(same)
        && !audit.environment.iter().any(Difference::is_edit)
        && (!trusts || audit.is_signed_by_trusted());
    if !(many && quiet) {
        return audit_text::notebook(audit);
    }
    let values = if audit.values.len() == 1 { "1 value".to_owned() } else { format!("{} values", audit.values.len()) };
    format!("{}: {}, {values}\n", in_one_line(&audit.file), audit.status.word())
}

/// Audit the notebooks that are named on stdin; `hessbook audit` starts this itself.
#[derive(Args)]
pub struct AuditWorker {}

impl AuditWorker {
    pub(super) fn run(self) -> Done {
        worker::serve()?;
        Ok(ExitCode::SUCCESS)
    }
}
