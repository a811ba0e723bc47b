//! `hessbook audit`: runs sealed notebooks again and says what became of each value.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::Args;

use crate::fault::Fault;
use crate::notebook::audit::{AuditOptions, audit_one};
use crate::notebook::audit_text;
use crate::notebook::holdings::Holdings;
use crate::notebook::signature::TrustedKey;
use crate::notebook::verdict::AuditStatus;
use crate::units::constants;

use super::{Done, out, stopped_by_interrupt};

/// Run sealed notebooks again, with the sealed data and with today's, and compare every reported value.
///
/// A notebook without a seal is compared with the results recorded in it.
///
/// Exit status: 0 when every value is the same under the sealed data, 1 when one differs, 2 when one could not be run.
#[derive(Args)]
pub struct Audit {
    /// .ipynb notebooks
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
}

impl Audit {
    pub(super) fn run(self) -> Done {
        let mut today = Holdings::shipped();
        if let Some(year) = self.constants {
            let set = constants::set(year).ok_or_else(|| unknown_year(year))?;
            today = today.with_constants(set);
        }
        let trusted = self.trust.iter().map(|path| TrustedKey::read(path)).collect::<Result<_, _>>()?;
        let options = AuditOptions {
            today,
            strict_data: self.strict_data,
            from_sources: self.from_sources,
            trusted,
            stop: stopped_by_interrupt(),
        };
        let mut worst = AuditStatus::Same;
        for path in &self.paths {
            let audit = audit_one(path, &options);
            worst = worst.max(audit.status);
            out(&audit_text::notebook(&audit));
        }
        Ok(ExitCode::from(worst.exit()))
    }
}

fn unknown_year(year: u16) -> Fault {
    let known: Vec<String> = constants::years().map(|year| year.to_string()).collect();
    Fault::new(
        "constant-set-unknown",
        format!("there is no constant set of {year}"),
        format!("choose one of {}", known.join(", ")),
    )
}
