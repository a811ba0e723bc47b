//! The reports on an archive: what was asked and with what, and one function for each form.
//!
//! All of them walk the audits once to count and once or a few times more to write, and keep counts, causes and notes: their
//! memory is that of one notebook and a tally, however large the archive is. The surprise: nothing here reads a clock or a
//! file, so that a report of the same audits is the same to the byte.

use std::io::Write;
use std::time::Duration;

use serde::Serialize;
use thiserror::Error;

use crate::archive::audits::Audits;
use crate::archive::tally::Tally;
use crate::archive::{json, junit, page, text};
use crate::fault::{Explain, Fault};
use crate::notebook::audit::AuditOptions;
use crate::notebook::sealing::engine_now;

/// What an audit was made of and with.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct About {
    /// Files, folders and patterns, as they were asked for.
    pub paths: Vec<String>,
    /// When it ended, in UTC: `2026-12-01T09:30:00Z`.
    pub time: String,
    /// How long it took, in seconds; none where it was made in several runs.
    pub took_s: Option<String>,
    /// `hessbook 0.1.0`
    pub program: String,
    /// SHA-256 over all shipped tables and procedures.
    pub tables: String,
    /// `CODATA 2022`
    pub constants: String,
    /// Names of the keys that are trusted.
    pub trusted: Vec<String>,
    /// Whether moves under today's data count for the result.
    pub strict_data: bool,
    /// Whether values were derived again without the author's cells.
    pub from_sources: bool,
    /// What was asked for and left out on purpose, in words: other shards, links that were not followed.
    pub left_out: Vec<String>,
}

impl About {
    /// An audit with these options that ended at `time`, in UTC.
    pub fn of(options: &AuditOptions, paths: Vec<String>, time: &str, took: Option<Duration>) -> About {
        let engine = engine_now();
        About {
            paths,
            time: time.to_owned(),
            took_s: took.map(|took| format!("{:.1}", took.as_secs_f64())),
            program: format!("hessbook {}", engine.version),
            tables: engine.stdlib,
            constants: format!("CODATA {}", options.today.constants.year),
            trusted: options.trusted.iter().map(|key| key.name.clone()).collect(),
            strict_data: options.strict_data,
            from_sources: options.from_sources,
            left_out: Vec::new(),
        }
    }
}

/// Why a report is not written.
#[derive(Debug, Error)]
pub enum ReportError {
    #[error("the report on the archive cannot be written: {why}")]
    Write { why: String },
    #[error("the report on the archive cannot be made: {why}")]
    Make { why: String },
}

impl Explain for ReportError {
    fn code(&self) -> &'static str {
        match self {
            ReportError::Write { .. } => "archive-report-unwritable",
            ReportError::Make { .. } => "archive-report-unmade",
        }
    }

    fn hint(&self) -> String {
        match self {
            ReportError::Write { .. } => "check the folder's rights and the space left".to_owned(),
            ReportError::Make { .. } => "take another form, as with --format json, and report this".to_owned(),
        }
    }
}

/// The same fault for everything that is written.
pub(super) fn unwritable(why: std::io::Error) -> Fault {
    ReportError::Write { why: why.to_string() }.into()
}

/// The closing summary for a terminal: counts, the verdict table, causes over the whole archive, and a line for each
/// notebook that is not the same. Walks twice. `colour` adds colour to words that say the same without it.
///
/// # Errors
/// The audits cannot be read back, or the text cannot be written.
pub fn text(audits: &dyn Audits, about: &About, colour: bool, out: &mut dyn Write) -> Result<(), Fault> {
    text::write(audits, &Tally::of(audits)?, about, colour, out)
}

/// One JSON document: what was asked, the tally, and the audits as they are. Walks twice and holds one audit at a time.
///
/// # Errors
/// The same.
pub fn json(audits: &dyn Audits, about: &About, out: &mut dyn Write) -> Result<(), Fault> {
    json::write(audits, &Tally::of(audits)?, about, out)
}

/// JUnit XML for a build server: a suite for each notebook, a case for each reported value. Walks twice and holds one suite
/// at a time.
///
/// # Errors
/// The same.
pub fn junit(audits: &dyn Audits, about: &About, out: &mut dyn Write) -> Result<(), Fault> {
    junit::write(audits, about, out)
}

/// A page of HTML to be filed, complete in itself. Walks once for each of its parts and holds one notebook at a time; the
/// page itself grows with what moved, of which it shows so many derivations and no more.
///
/// # Errors
/// The same.
pub fn page(audits: &dyn Audits, about: &About, out: &mut dyn Write) -> Result<(), Fault> {
    page::write(audits, &Tally::of(audits)?, about, out)
}
