//! Seals a notebook: runs it in a fresh session, and writes down what it stands on and what it gave.
//!
//! Strained and broken rows that nobody dealt with refuse the seal, unless a draft is asked for; untested rows do not, and
//! are named in it. The surprise: a notebook whose content is sealed already keeps its seal, date and all, so that sealing
//! an archive again changes no file without a reason.

use std::collections::BTreeMap;
use std::fmt;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::review::{Dealing, Decided};
use crate::notebook::file::NotebookFile;
use crate::notebook::holdings::{Holdings, sealed_constants, sealed_tables};
use crate::notebook::run::{FaultRecord, Source};
use crate::notebook::seal::{
    Decision, Engine, FORMAT, KEY, OpenRow, Seal, SealedCell, SealedFile, SealedModule, SealedParameter, SealedValue,
    source_digest, source_text,
};
use crate::notebook::signature::{PrivateKey, checked};
use crate::notebook::skeleton::{Skeleton, sealed_kind};
use crate::notebook::trial::{Trial, Tried, Unwatched, trial};
use crate::notebook::verdict::Signed;
use crate::source::{STDLIB, sha256};

/// The largest file whose content a seal keeps, in bytes.
const MOST_KEPT: usize = 4 << 20;

/// How a notebook is to be sealed.
#[derive(Default)]
pub struct Sealing {
    pub author: Option<String>,
    /// Seal although rows are not dealt with.
    pub draft: bool,
    /// Parameters set from outside.
    pub settings: BTreeMap<String, String>,
    /// In UTC.
    pub date: String,
    /// To sign with.
    pub key: Option<PrivateKey>,
}

/// Why a notebook is not sealed.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum SealError {
    #[error("{file} is not sealed: {fault}", fault = in_words(file, fault))]
    Fault { file: String, fault: Box<FaultRecord> },
    #[error("{file} is not sealed: it reports nothing")]
    NothingReported { file: String },
    #[error("{file} is not sealed: {count} of its assumptions {are} not dealt with\n{rows}", count = rows.len(), are = if rows.len() == 1 { "is" } else { "are" }, rows = Rows(rows))]
    NotDealtWith { file: String, rows: Vec<OpenRow> },
    #[error("{file} is a script, and a seal is kept in a notebook")]
    Script { file: String },
    #[error("the seal of {file} cannot be read: {why}")]
    Unreadable { file: String, why: String },
    #[error("the seal of {file} has the shape `{format}`, and this program reads {FORMAT}")]
    Format { file: String, format: String },
}

fn in_words(file: &str, fault: &FaultRecord) -> String {
    // What is wrong with the run as a whole, such as a setting that no cell takes, stands under the file's name.
    if fault.cell == file { fault.message.clone() } else { format!("a cell fails, {}: {}", fault.cell, fault.message) }
}

struct Rows<'a>(&'a [OpenRow]);

impl fmt::Display for Rows<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let words =
            |row: &OpenRow| format!("  {}: {} {}, {}; {}", row.label, row.status, row.id, row.subject, row.note);
        f.write_str(&self.0.iter().map(words).collect::<Vec<_>>().join("\n"))
    }
}

impl Explain for SealError {
    fn code(&self) -> &'static str {
        match self {
            SealError::Fault { .. } => "seal-of-failing-cell",
            SealError::NothingReported { .. } => "seal-of-nothing",
            SealError::NotDealtWith { .. } => "seal-of-open-rows",
            SealError::Script { .. } => "seal-of-script",
            SealError::Unreadable { .. } => "seal-unreadable",
            SealError::Format { .. } => "seal-format",
        }
    }

    fn hint(&self) -> String {
        match self {
            SealError::Fault { file, fault } if fault.cell == *file => fault.hint.clone(),
            SealError::Fault { .. } => "run it with `hessbook run`, and mend the cell".to_owned(),
            SealError::NothingReported { .. } => "report a result, as in `report(\"heat of reaction\", dH)`".to_owned(),
            SealError::NotDealtWith { .. } => {
                "widen the value, correct it where the other way is better, or justify the row; or seal a draft with --draft".to_owned()
            }
            SealError::Script { .. } => "keep the calculation in a .ipynb notebook".to_owned(),
            SealError::Unreadable { .. } => "restore the file from an earlier copy, or seal it again".to_owned(),
            SealError::Format { .. } => "audit it with the version that sealed it, or seal it again".to_owned(),
        }
    }
}

/// A sealed notebook, not yet written.
pub struct Sealed {
    pub notebook: NotebookFile,
    pub seal: Seal,
    /// The seal that the notebook had, and that says the same, was kept.
    pub kept: bool,
    /// The key of a signature that did not hold, and that was taken away with its seal.
    pub bad_signature: Option<String>,
}

/// Runs a notebook and seals it. To be called on a thread with a large stack.
///
/// # Errors
/// It cannot be read, fails, reports nothing, or has rows that nobody dealt with.
pub fn seal(path: &Path, how: &Sealing, holdings: &Holdings, stop: &Arc<AtomicBool>) -> Result<Sealed, Fault> {
    let file = path.display().to_string();
    let mut source = Source::read(path)?;
    if matches!(source, Source::Script { .. }) {
        return Err(SealError::Script { file }.into());
    }
    let tried = trial(&file, &mut source, &how.settings, holdings, stop, &mut Unwatched)?;
    if let Some(fault) = tried.faults.first() {
        return Err(SealError::Fault { file, fault: Box::new(fault.clone()) }.into());
    }
    if tried.reports.is_empty() {
        return Err(SealError::NothingReported { file }.into());
    }
    let refused = not_dealt_with(&tried);
    if !refused.is_empty() && !how.draft {
        return Err(SealError::NotDealtWith { file, rows: refused }.into());
    }
    let Source::Notebook(mut notebook) = source else { unreachable!("a script was refused") };
    let mut made = of_trial(&notebook, &tried, how, holdings, &refused);
    made.digest = made.digest_now();
    made.signature = how.key.as_ref().map(|key| key.sign(&made));
    let earlier = read_seal(&file, &notebook).ok().flatten();
    let bad_signature = earlier.as_ref().and_then(|earlier| match checked(earlier, &[]) {
        Signed::Invalid { key, .. } => Some(key),
        _ => None,
    });
    let same = |earlier: &Seal| {
        bad_signature.is_none()
            && earlier.is_whole()
            && earlier.says_the_same_as(&made)
            && earlier.is_signed_like(&made)
    };
    let kept = earlier.filter(same);
    let (seal, kept) = kept.map_or((made, false), |earlier| (earlier, true));
    put_seal(&mut notebook, &seal);
    Ok(Sealed { notebook, seal, kept, bad_signature })
}

/// The seal of a run that is not written anywhere.
pub(super) fn in_memory(notebook: &NotebookFile, tried: &Trial, how: &Sealing, holdings: &Holdings) -> Seal {
    let mut made = of_trial(notebook, tried, how, holdings, &[]);
    made.digest = made.digest_now();
    made
}

/// Puts a seal into a notebook.
pub fn put_seal(notebook: &mut NotebookFile, seal: &Seal) {
    let tree = serde_json::to_value(seal).unwrap_or_else(|e| unreachable!("a seal is plain texts: {e}"));
    notebook.set_metadata(KEY, tree);
}

/// The seal of a notebook, if it has one.
///
/// # Errors
/// It has something in its place that is no seal, or one of another shape.
pub fn read_seal(file: &str, notebook: &NotebookFile) -> Result<Option<Seal>, SealError> {
    let Some(tree) = notebook.metadata(KEY) else { return Ok(None) };
    let format = tree.get("format").and_then(serde_json::Value::as_str).unwrap_or_default();
    if format != FORMAT {
        return Err(SealError::Format { file: file.to_owned(), format: format.chars().take(40).collect() });
    }
    let unreadable = |e: serde_json::Error| SealError::Unreadable { file: file.to_owned(), why: e.to_string() };
    serde::Deserialize::deserialize(tree).map(Some).map_err(unreadable)
}

/// The program as it seals.
pub fn engine_now() -> Engine {
    let listed: Vec<String> = STDLIB.iter().map(|file| format!("{} {}\n", file.path, file.sha256)).collect();
    Engine { version: env!("CARGO_PKG_VERSION").to_owned(), stdlib: sha256(listed.concat().as_bytes()) }
}

/// The code cells of a notebook as a seal keeps them.
pub fn sealed_cells(notebook: &NotebookFile) -> Vec<SealedCell> {
    let sealed = |cell: crate::notebook::file::CodeCell| SealedCell {
        sha256: source_digest(&cell.source),
        source: source_text(&cell.source),
        name: cell.name,
    };
    notebook.code_cells().into_iter().map(sealed).collect()
}

/// Rows that are strained or broken and that nobody dealt with.
fn not_dealt_with(tried: &Trial) -> Vec<OpenRow> {
    open_rows(tried, |status, answered| !answered && (status == "strained" || status == "broken"))
}

fn open_rows(tried: &Trial, is_open: impl Fn(&str, bool) -> bool) -> Vec<OpenRow> {
    let mut open = Vec::new();
    for Tried { report, .. } in &tried.reports {
        for (row, &answered) in report.record.assumptions.iter().zip(&report.answered) {
            if is_open(&row.status, answered) {
                open.push(OpenRow {
                    label: report.record.label.clone(),
                    id: row.id.clone(),
                    status: row.status.clone(),
                    subject: row.subject.clone(),
                    note: row.note.clone(),
                });
            }
        }
    }
    open
}

fn of_trial(notebook: &NotebookFile, tried: &Trial, how: &Sealing, holdings: &Holdings, refused: &[OpenRow]) -> Seal {
    let mut skeleton = Skeleton::default();
    let mut values = Vec::with_capacity(tried.reports.len());
    for Tried { value, report } in &tried.reports {
        let ending = skeleton.enter(value);
        values.push(SealedValue {
            record: report.record.clone(),
            kind: sealed_kind(value.kind()),
            decisions: decisions(&tried.dealings, &report.record.label),
            step: ending.step.to_string(),
            folded: ending.folded.to_string(),
        });
    }
    let mut open = refused.to_vec();
    open.extend(open_rows(tried, |status, _| status == "untested"));
    let parameters = tried.parameters.iter().map(|parameter| SealedParameter {
        name: parameter.name.clone(),
        value: parameter.value.clone(),
        set: how.settings.get(&parameter.name).cloned(),
    });
    Seal {
        format: FORMAT.to_owned(),
        engine: engine_now(),
        sealed: how.date.clone(),
        author: how.author.clone(),
        draft: !refused.is_empty(),
        open,
        constants: sealed_constants(holdings.constants),
        cells: sealed_cells(notebook),
        modules: tried.modules.iter().map(|(name, bytes)| sealed_module(name, bytes)).collect(),
        parameters: parameters.collect(),
        values,
        steps: skeleton.steps,
        objects: skeleton.objects,
        data: sealed_tables(&holdings.records.about(&tried.asked)),
        files: tried.files.iter().map(|(name, bytes)| sealed_file(name, bytes)).collect(),
        entities: tried.asked.iter().map(ToString::to_string).collect(),
        digest: String::new(),
        signature: None,
    }
}

/// A module is always kept whole: it was read as UTF-8, and its size is limited where it is read.
fn sealed_module(name: &str, bytes: &[u8]) -> SealedModule {
    let content = String::from_utf8_lossy(bytes).into_owned();
    SealedModule { name: name.to_owned(), sha256: sha256(bytes), content }
}

/// A text of at most [`MOST_KEPT`] is kept whole; of others the digest.
fn sealed_file(name: &str, bytes: &[u8]) -> SealedFile {
    let text = std::str::from_utf8(bytes).ok().filter(|text| text.len() <= MOST_KEPT);
    SealedFile { name: name.to_owned(), sha256: sha256(bytes), content: text.map(str::to_owned) }
}

/// What was decided about a value.
pub(super) fn decisions(dealings: &[Dealing], label: &str) -> Vec<Decision> {
    let decision = |dealing: &Dealing| {
        let (reason, limit) = match &dealing.decided {
            Decided::Justified { reason } => (Some(reason.clone()), None),
            Decided::Tolerated { written, .. } => (None, Some(written.clone())),
        };
        Decision { id: dealing.id.clone(), subject: dealing.subject.clone(), cell: dealing.cell.clone(), reason, limit }
    };
    dealings.iter().filter(|dealing| dealing.label == label).map(decision).collect()
}
