//! `hessbook audit`: runs sealed notebooks again and says what became of each value.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Args, ValueEnum};

use crate::archive::audits::Audits;
use crate::archive::order::{Order, Task};
use crate::archive::paths::{Shard, found};
use crate::archive::state::State;
use crate::archive::work::Work;
use crate::archive::worker;
use crate::notebook::audit_text;
use crate::notebook::signature::TrustedKey;
use crate::notebook::verdict::{AuditStatus, NotebookAudit};

use super::archive::{Printer, Workers, interrupted};
use super::{Done, err, stopped_by_interrupt};

/// Run sealed notebooks again, with the sealed data and with today's, and compare every reported value.
///
/// A notebook without a seal is compared with the results recorded in it. Each notebook is run by a process of its own kind,
/// several at a time; one that does not end, dies or cannot be read costs its own row.
///
/// Exit status: 0 when every value is the same under the sealed data, 1 when one differs, 2 when one could not be run.
#[derive(Args)]
pub struct Audit {
    /// Notebooks, folders of notebooks, and patterns such as "archive/**/2024-*.ipynb"
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
    /// Take the constants of this CODATA year for today's
    #[arg(long, value_name = "YEAR")]
    constants: Option<u16>,
    /// What is printed
    #[arg(long, value_enum, default_value_t = Format::Text)]
    format: Format,
    /// Audit one part of several, as in `--shard 2/4`; every notebook falls to exactly one
    #[arg(long, value_name = "I/N")]
    shard: Option<Shard>,
    /// Keep the audits in this file as they are done, and go on from it after a run that was stopped
    #[arg(long, value_name = "FILE")]
    resume: Option<PathBuf>,
    /// Run nothing: report on the audits in these files, those that --resume kept for all shards of an archive
    #[arg(long, conflicts_with_all = ["shard", "resume", "strict_data", "from_sources", "trust", "constants"])]
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
        if self.gathered {
            return self.report(&State::gathered(&self.paths)?);
        }
        let trusted = self.trust.iter().map(|path| TrustedKey::read(path)).collect::<Result<_, _>>()?;
        let order = Order::now(Task::Audit {
            strict_data: self.strict_data,
            from_sources: self.from_sources,
            constants: self.constants,
            trusted,
        });
        // What the workers could not read is said before any is started.
        order.prepared()?;
        let stop = stopped_by_interrupt();
        let mut work = Work::new(order, found(&self.paths)?, self.shard, self.resume.as_deref())?;
        if work.count() == 0 {
            err("hessbook: no notebook falls to this shard\n");
        }
        let mut printer = Printer::new(&work, self.format == Format::Text, &|audit, many| text_of(audit, many))?;
        let whole = work.finish(&self.workers.pool()?, &stop, &mut printer)?;
        printer.end();
        if !whole {
            return Err(interrupted(&work, self.resume.as_deref()));
        }
        self.report(work.state())
    }

    /// What is said at the end.
    fn report(&self, state: &State) -> Done {
        let mut worst = AuditStatus::Same;
        state.each(&mut |audit| {
            worst = worst.max(audit.status);
            Ok(())
        })?;
        Ok(ExitCode::from(worst.exit()))
    }
}

/// One notebook as text: where there are many, one that is the same takes one line.
fn text_of(audit: &NotebookAudit, many: bool) -> String {
    if many && audit.status == AuditStatus::Same {
        return format!(
            "{}: {}, {} values\n",
            audit_text::in_one_line(&audit.file),
            audit.status.word(),
            audit.values.len()
        );
    }
    audit_text::notebook(audit)
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
