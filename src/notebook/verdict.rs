//! What an audit says: the verdict on each value, the causes of a move with their sizes, and what was not compared.
//!
//! [`NotebookAudit`] is the outcome for one notebook, plain data that processes hand on as JSON. The surprise: causes are
//! kept with exact figures, so that shares and remainder add up to the move, and with a rounded text for people.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::notebook::beside::FileBeside;
use crate::notebook::run::FaultRecord;
use crate::render::report::Assumption;

/// The verdict on one value, from nothing to worst.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Verdict {
    /// The same to the last bit, register and all.
    Identical,
    /// Other bits, and the same figures as printed.
    SameAsPrinted,
    /// Moved by revised data or constants, and by no more than the uncertainty that these inputs stated.
    WithinU,
    /// The value is the same, and the register under it is not.
    AssumptionChanged,
    /// What an analyst justified now costs more than at signing.
    JustificationLapsed,
    Moved,
    UnitOrBasisChanged,
    /// Reported now, and not in the seal.
    New,
    /// In the seal, and not reported now.
    Missing,
    CouldNotRun,
}

impl Verdict {
    pub const ALL: [Verdict; 10] = [
        Verdict::Identical,
        Verdict::SameAsPrinted,
        Verdict::WithinU,
        Verdict::AssumptionChanged,
        Verdict::JustificationLapsed,
        Verdict::Moved,
        Verdict::UnitOrBasisChanged,
        Verdict::New,
        Verdict::Missing,
        Verdict::CouldNotRun,
    ];

    pub fn word(self) -> &'static str {
        match self {
            Verdict::Identical => "identical",
            Verdict::SameAsPrinted => "same as printed",
            Verdict::WithinU => "within u",
            Verdict::AssumptionChanged => "assumption changed",
            Verdict::JustificationLapsed => "justification lapsed",
            Verdict::Moved => "moved",
            Verdict::UnitOrBasisChanged => "unit or basis changed",
            Verdict::New => "new",
            Verdict::Missing => "missing",
            Verdict::CouldNotRun => "could not run",
        }
    }

    /// Whether a reader of the sealed figures would see no difference.
    pub fn is_same(self) -> bool {
        matches!(self, Verdict::Identical | Verdict::SameAsPrinted)
    }
}

/// What the values of a run were compared with.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Against {
    Seal,
    /// The outputs that stand in an unsealed notebook.
    RecordedOutputs,
    /// There is neither seal nor recorded result.
    Nothing,
}

/// The outcome for a notebook as a whole.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum AuditStatus {
    /// Every value is the same.
    Same,
    /// Nothing to compare with.
    NothingToCompare,
    Differs,
    CouldNotRun,
}

impl AuditStatus {
    /// Exit status of a program whose worst notebook has this status.
    pub fn exit(self) -> u8 {
        match self {
            AuditStatus::Same | AuditStatus::NothingToCompare => 0,
            AuditStatus::Differs => 1,
            AuditStatus::CouldNotRun => 2,
        }
    }

    pub fn word(self) -> &'static str {
        match self {
            AuditStatus::Same => "same",
            AuditStatus::NothingToCompare => "nothing to compare",
            AuditStatus::Differs => "differs",
            AuditStatus::CouldNotRun => "could not run",
        }
    }
}

/// One notebook, audited.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct NotebookAudit {
    pub file: String,
    /// SHA-256 of the file as it was audited; none where it could not be read.
    pub sha256: Option<String>,
    /// What was demanded of it and is not so, in words.
    pub unmet: Vec<String>,
    /// Files beside it that the audit rests on.
    pub beside: Vec<FileBeside>,
    pub against: Against,
    pub status: AuditStatus,
    pub seal: Option<SealFacts>,
    /// What was otherwise when it was sealed: findings, not errors.
    pub environment: Vec<Difference>,
    pub values: Vec<ValueAudit>,
    /// Decisions in force, for the register of an archive.
    pub justifications: Vec<Justification>,
    /// Rows that were untested when it was sealed, each once for all values it touches.
    pub untested: Vec<String>,
    /// Results that stand in the outputs and are not those of the seal.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub outputs: Vec<OutputDiffers>,
    /// What this audit says nothing of.
    pub not_compared: Vec<String>,
    /// Why it could not be read or run, and under which data.
    pub faults: Vec<AuditFault>,
    /// Values recomputed from their derivation and records alone; none where it was not asked for.
    pub from_sources: Option<Vec<Rederived>>,
}

impl NotebookAudit {
    /// Whether its seal is signed with a key that the auditor trusts.
    pub fn is_signed_by_trusted(&self) -> bool {
        self.seal.as_ref().is_some_and(|seal| matches!(seal.signed, Signed::Valid { trusted: Some(_), .. }))
    }
}

/// Facts about a seal.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealFacts {
    pub sealed: String,
    pub author: Option<String>,
    pub draft: bool,
    /// Whether its digest is that of its content.
    pub whole: bool,
    pub signed: Signed,
    /// Parameters that were set from outside when it was sealed, with what they were set to.
    #[serde(default, skip_serializing_if = "BTreeMap::is_empty")]
    pub set: BTreeMap<String, String>,
    /// What of an altered seal contradicts itself, in words.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub contradictions: Vec<String>,
}

impl SealFacts {
    /// `; outlet set to 500 degC when it was sealed`, empty where nothing was set from outside.
    pub fn set_words(&self) -> String {
        if self.set.is_empty() {
            return String::new();
        }
        let set: Vec<String> = self.set.iter().map(|(name, text)| format!("{name} set to {text}")).collect();
        format!("; with {} from outside the cells", set.join(", "))
    }
}

/// A recorded output that does not say what the seal says.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct OutputDiffers {
    pub label: String,
    /// What stands in the outputs.
    pub output: String,
    /// What was sealed; none for a result that the seal does not have.
    pub seal: Option<String>,
}

impl OutputDiffers {
    pub fn words(&self) -> String {
        let OutputDiffers { label, output, seal } = self;
        match seal {
            Some(seal) => format!("the recorded output of {label} says {output}, the seal {seal}"),
            None => format!("the recorded output of {label} says {output}, and the seal has no such result"),
        }
    }
}

/// What is known of a seal's signature.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Signed {
    Not,
    /// The signature belongs to the seal; `trusted` is the name of the key among those that the auditor trusts.
    Valid {
        key: String,
        trusted: Option<String>,
    },
    /// The signature does not belong to the seal.
    Invalid {
        key: String,
        why: String,
    },
}

/// Something about the surroundings that differs.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Difference {
    pub what: String,
    pub sealed: String,
    pub now: String,
}

impl Difference {
    pub const PROGRAM: &'static str = "program";
    pub const TABLES: &'static str = "shipped tables and procedures";
    pub const CONSTANTS: &'static str = "constant set";

    /// Whether it is an edit of the notebook, its cells or its modules, and not of what it runs on.
    pub fn is_edit(&self) -> bool {
        ![Self::PROGRAM, Self::TABLES, Self::CONSTANTS].contains(&self.what.as_str())
    }
}

/// One value.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct ValueAudit {
    pub label: String,
    /// In which its figures are, `kJ/mol[rxn]`.
    pub unit: String,
    /// None for a new value.
    pub sealed: Option<Figure>,
    /// The author's cells with the sealed records and constants.
    pub under_sealed: Outcome,
    /// The author's cells with today's records and constants.
    pub under_today: Outcome,
    /// The derivation as sealed beside that of each run which gave another figure, so none for most values.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub steps: Vec<SideBySide>,
}

/// The derivation of a value as sealed, and as it is under some data.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SideBySide {
    /// `the sealed data`, `today's data`, `both data`.
    pub under: String,
    /// Inputs before their users; what a step was computed from is named by the numbers of these pairs.
    pub pairs: Vec<StepPair>,
    /// Pairs that are not listed, since they are the same on both sides.
    pub same_left_out: usize,
    /// Pairs that differ and are not listed, since there are too many.
    pub others_left_out: usize,
}

/// A step as sealed beside the step that takes its place now; a side without step has none like it.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct StepPair {
    /// From 1, over all pairs, listed or not.
    pub number: usize,
    pub then: Option<StepSide>,
    pub now: Option<StepSide>,
    /// Whether it is the first at which the derivation parts.
    pub parts: bool,
}

/// A step on one side.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct StepSide {
    /// How it was made: the text of an input, an operation, the symbol of a formula and what it was applied to.
    pub words: String,
    /// Cell and line.
    pub place: Option<String>,
    /// In `unit`; reads back as the same double.
    pub value: String,
    pub unit: String,
    /// With unit, and with as many digits as a difference from the other side needs.
    pub shown: String,
}

impl StepPair {
    /// Whether both sides give the same from the same.
    pub fn is_same(&self) -> bool {
        let of = |side: &Option<StepSide>| {
            side.as_ref().map(|side| (side.words.clone(), side.value.clone(), side.unit.clone()))
        };
        of(&self.then) == of(&self.now)
    }
}

/// A figure with its uncertainty, exact and as printed.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Figure {
    pub value: String,
    pub u: Option<String>,
    pub unit: String,
    pub shown: String,
}

/// What became of a value under some data.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Outcome {
    pub verdict: Verdict,
    /// None where it is missing or could not be computed.
    pub figure: Option<Figure>,
    pub moved: Option<Move>,
    /// Rows, decisions and words that changed with it.
    pub notes: Vec<String>,
}

/// By how much a value moved, and why.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Move {
    /// Value now minus value sealed, in the value's unit.
    pub by: String,
    pub shown: String,
    pub causes: Vec<Cause>,
    /// The move minus all shares, in the value's unit.
    pub remainder: String,
    pub remainder_shown: String,
    /// Standard uncertainty that the revised inputs stated, as it reaches the value; none where one states none.
    pub u_of_changed: Option<String>,
    pub u_of_changed_shown: Option<String>,
    /// The first step at which the derivation parts from the sealed one.
    pub parts_at: Option<String>,
}

/// The sort of a cause.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum CauseKind {
    /// A record that was revised, added or taken away.
    Data,
    Constants,
    /// The program computes otherwise.
    Engine,
    Cell,
    Module,
    /// The seal was changed after it was made.
    Seal,
    /// An uncertainty or a setting without a move of the value.
    Parameter,
}

impl CauseKind {
    pub fn word(self) -> &'static str {
        match self {
            CauseKind::Data => "data",
            CauseKind::Constants => "constants",
            CauseKind::Engine => "engine",
            CauseKind::Cell => "edited cell",
            CauseKind::Module => "module",
            CauseKind::Seal => "altered seal",
            CauseKind::Parameter => "parameter",
        }
    }
}

/// One cause of a move.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Cause {
    pub kind: CauseKind,
    /// What it is, in words: `formation properties of CO2(g) in atct-1.112`.
    pub what: String,
    /// Its share of the move, in the value's unit; none where it cannot be told from others.
    pub share: Option<String>,
    pub shown: Option<String>,
}

/// A decision about an assumption, as sealed.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Justification {
    pub label: String,
    pub id: String,
    pub subject: String,
    pub reason: String,
    /// At signing.
    pub price: Option<String>,
    /// Now, under the sealed data and under today's.
    pub price_sealed_data: Option<String>,
    pub price_today: Option<String>,
    pub lapsed: bool,
}

/// A fault with the data it came up under.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct AuditFault {
    /// `the file`, `sealed data`, `today's data`.
    pub under: String,
    pub fault: FaultRecord,
}

/// A value recomputed without the author's cells.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Rederived {
    pub label: String,
    /// In the value's unit; none where a step could not be taken.
    pub value: Option<String>,
    /// Recomputed minus sealed.
    pub off_by: Option<String>,
    /// Whether the recomputed value is the sealed one to the last bit.
    pub same: bool,
    /// Standard uncertainty in the value's unit, and whether it is the sealed one: only where every step was derived again.
    pub u: Option<String>,
    pub u_same: Option<bool>,
    pub steps: usize,
    /// Steps taken as they were recorded, in words.
    pub not_rederived: Vec<String>,
    /// The first step that gives another value than recorded.
    pub parts_at: Option<String>,
}

impl Rederived {
    /// Whether it is the sealed one, as far as it could be derived.
    pub fn is_same(&self) -> bool {
        self.same && self.u_same != Some(false)
    }

    /// What came of it, where that is another thing than was sealed.
    pub fn otherwise_words(&self) -> String {
        match &self.value {
            None => "could not be derived again".to_owned(),
            Some(_) if self.same => {
                let u = self.u.as_deref().map_or_else(|| "not stated".to_owned(), |u| format!("derived again as {u}"));
                format!("the value is the same, and its u is {u}, which is not what was sealed")
            }
            Some(value) => {
                format!("derived again as {value}, off by {}", self.off_by.as_deref().unwrap_or("an unknown amount"))
            }
        }
    }
}

/// One row of the register for readers: id, subject and status.
pub fn row_words(row: &Assumption) -> String {
    format!("{} ({})", row.id, row.subject)
}
