//! The seal of a notebook: what it reported, from which cells, records and constants, in one block of its metadata.
//!
//! [`Seal`] is the shape that is written; sealing, auditing and deriving again are in files of their own. Every figure is
//! a decimal text that reads back as the same double, and a record of data is the text of its table, since notebook
//! editors rewrite JSON numbers. The surprise: the digest is taken over a canonical form, with sorted keys and no spaces,
//! since editors sort and indent what they save.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};
use serde_json::Value;

use crate::render::report::Record;
use crate::source::sha256;

/// Name and version of this shape. Another version is another shape, and this program says so.
pub const FORMAT: &str = "hessbook-seal/2";

/// Where it stands in the notebook's metadata.
pub const KEY: &str = "hessbook_seal";

/// The seal.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Seal {
    pub format: String,
    pub engine: Engine,
    /// When it was sealed, in UTC: `2026-12-01T09:30:00Z`.
    pub sealed: String,
    /// Only where the analyst gave it.
    pub author: Option<String>,
    /// Sealed although rows are strained or broken and nobody dealt with them.
    pub draft: bool,
    /// Assumptions that stayed open: every `untested` row, and in a draft what was not dealt with.
    pub open: Vec<OpenRow>,
    pub constants: Constants,
    pub cells: Vec<SealedCell>,
    /// Methods in files beside the notebook, which its cells used.
    pub modules: Vec<SealedModule>,
    pub parameters: Vec<SealedParameter>,
    pub values: Vec<SealedValue>,
    /// Steps of all values, inputs before their users, each once. Steps point at each other by their position, from 0.
    pub steps: Vec<SealedStep>,
    /// What steps took that is no value: streams, molecules, fits, as the calls that made them, each before its users.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub objects: Vec<SealedObject>,
    pub data: Vec<SealedTable>,
    /// Files beside the notebook that its cells read: records of the analyst's own, measured figures.
    pub files: Vec<SealedFile>,
    /// Names of the substances whose records `data` holds: all that is known of them, and nothing else is used for them.
    pub entities: Vec<String>,
    /// SHA-256 of the canonical form of everything above.
    pub digest: String,
    pub signature: Option<Signature>,
}

/// The program that sealed.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Engine {
    pub version: String,
    /// SHA-256 over all shipped tables and procedures.
    pub stdlib: String,
}

/// A row of the register that stayed open.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct OpenRow {
    pub label: String,
    pub id: String,
    pub status: String,
    pub subject: String,
    /// What is missing for the test, or how it was tested.
    pub note: String,
}

/// The physical constants in force.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Constants {
    /// CODATA year.
    pub year: String,
    pub values: Vec<SealedConstant>,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedConstant {
    pub name: String,
    pub symbol: String,
    pub value: String,
    /// Standard uncertainty; `0` where the value is exact.
    pub u: String,
    pub unit: String,
}

/// A code cell. Its text is kept so that an audit can tell what each of several edits moved.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SealedCell {
    /// `cell-3`: the third code cell.
    pub name: String,
    /// Of its text.
    pub sha256: String,
    /// Its lines joined and ended by a line feed alone.
    pub source: String,
}

/// A module: a file of methods beside the notebook.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SealedModule {
    /// `plant.rhai`
    pub name: String,
    pub sha256: String,
    pub content: String,
}

/// A declared input.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedParameter {
    pub name: String,
    /// The value in force.
    pub value: String,
    /// The text it was set to from outside, if it was; an audit sets it again.
    pub set: Option<String>,
}

/// A reported value: its record with register and decisions, and where its derivation ends.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedValue {
    pub record: Record,
    pub kind: SealedKind,
    /// Decisions about rows, as data; the record has them in words.
    pub decisions: Vec<Decision>,
    /// Position of its last step.
    pub step: String,
    /// How many steps of its derivation were folded to keep the seal small.
    pub folded: String,
}

/// What was decided about one row.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Decision {
    pub id: String,
    pub subject: String,
    pub cell: String,
    /// Why the value stays as it is.
    pub reason: Option<String>,
    /// How large the price may be, as written.
    pub limit: Option<String>,
}

/// What sort of quantity a value is.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedKind {
    /// `H`, `temperature point`, ...
    pub what: String,
    pub state: Option<SealedState>,
}

/// The state a state function was taken in; what is absent is not one value.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedState {
    /// From where it is counted.
    pub zero: Option<SealedZero>,
    /// K
    pub t: Option<String>,
    /// Pa
    pub p: Option<String>,
    pub standard: bool,
    pub reaction: bool,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum SealedZero {
    #[serde(rename = "elements-298.15-K")]
    Elements298,
    ElementsAtT,
    #[serde(rename = "elements-0-K")]
    Elements0,
    /// The substance itself at this temperature, K.
    From(String),
    Named(String),
}

/// One step of a derivation.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedStep {
    pub made: Made,
    /// In SI units.
    pub si: String,
    /// SI unit with basis: `kg m^2/(s^2 mol[rxn])`.
    pub unit: String,
    pub kind: SealedKind,
    /// Steps it was computed from, each with the partial derivative in SI units.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub inputs: Vec<(String, String)>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub place: Option<SealedPlace>,
    /// What an open mole was taken for here.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub bound: Option<String>,
}

/// Cell, line and column.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SealedPlace(pub String, pub String, pub String);

/// How a step came to be.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Made {
    Input(Box<SealedInput>),
    Arithmetic {
        operator: String,
        /// The bare number it works with.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        by: Option<String>,
    },
    /// A call of a formula, receiver first.
    Formula {
        card: String,
        arguments: Vec<Argument>,
    },
    /// A long run of steps, as its linear form over the inputs.
    Folded {
        steps: String,
        /// Whether it may have been more.
        at_least: bool,
        /// Whether the linear form holds at any distance.
        linear: bool,
    },
}

/// A figure that was not computed here.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedInput {
    pub of: InputOf,
    /// Standard uncertainty in SI units; none where none is stated.
    pub u: Option<String>,
    /// The text as typed, or the analyst's name for it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub label: Option<String>,
    /// SI value of one unit in the last digit printed or typed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub digit: Option<String>,
    /// Degrees of freedom of u.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub dof: Option<String>,
    /// Distribution, where it is not normal.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub shape: Option<String>,
    /// Whether it is correlated with other inputs, which a seal does not keep.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub correlated: bool,
}

/// Which input.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum InputOf {
    Datum { dataset: String, record: String, field: String, t: Option<String>, way: String },
    Constant { year: String, name: String },
    Typed { ordinal: String },
    Repeated { first: String, count: String },
    Own { name: String },
}

/// An argument of a formula.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Argument {
    /// The value of the step at this position.
    Step(String),
    Number(String),
    Flag(bool),
    Text(String),
    List(Vec<Argument>),
    Options(BTreeMap<String, Argument>),
    /// As written.
    Reaction(String),
    /// By its name with phase.
    Substance(String),
    /// The thing at this position among `objects`, with its name.
    Object {
        at: String,
        words: String,
    },
    /// Something that cannot be kept, such as a function of the author's; in words.
    Other(String),
    Nothing,
}

/// A thing that steps took, as the call of a formula that made it; `read_csv` stands for a table read from a sealed file.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedObject {
    pub card: String,
    pub arguments: Vec<Argument>,
    /// The part of what the call gives; none for the whole.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub part: Option<String>,
}

/// The records of one table that the notebook could have used.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedTable {
    pub path: String,
    pub schema: String,
    pub dataset: String,
    /// What the table says of all its records: JSON in a text.
    pub head: String,
    pub head_sha256: String,
    /// Names of its lists; a list may have no records here.
    pub lists: Vec<String>,
    pub records: Vec<SealedRecord>,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct SealedRecord {
    pub list: String,
    pub id: String,
    pub sha256: String,
    /// JSON in a text.
    pub content: String,
}

/// A file that cells read.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct SealedFile {
    /// As the cell named it.
    pub name: String,
    pub sha256: String,
    /// Its text; none for a file that is no text or larger than a seal keeps.
    pub content: Option<String>,
}

/// A signature under the digest.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct Signature {
    /// `ed25519`
    pub algorithm: String,
    /// In hexadecimal.
    pub public_key: String,
    pub signature: String,
}

impl Seal {
    /// SHA-256 of the canonical form of everything but digest and signature.
    pub fn digest_now(&self) -> String {
        let mut tree = serde_json::to_value(self).unwrap_or_else(|e| unreachable!("a seal is plain texts: {e}"));
        if let Value::Object(tree) = &mut tree {
            tree.shift_remove("digest");
            tree.shift_remove("signature");
        }
        sha256(canonical(&tree).as_bytes())
    }

    /// Whether the seal says what it said when it was made. Who changes both content and digest is not found out by this;
    /// a signature finds that out.
    pub fn is_whole(&self) -> bool {
        self.digest == self.digest_now()
    }

    /// The same content, whatever the date.
    pub fn says_the_same_as(&self, other: &Seal) -> bool {
        let undated =
            |seal: &Seal| Seal { sealed: String::new(), digest: String::new(), signature: None, ..seal.clone() };
        undated(self) == undated(other)
    }
}

impl Seal {
    /// Whether a seal is signed with the key of another, or both are not signed. An unsigned one asks for no signature.
    pub fn is_signed_like(&self, wanted: &Seal) -> bool {
        let key = |seal: &Seal| seal.signature.as_ref().map(|signature| signature.public_key.clone());
        wanted.signature.is_none() || key(self) == key(wanted)
    }
}

/// JSON with sorted keys and without spaces.
pub fn canonical(value: &Value) -> String {
    match value {
        Value::Object(members) => {
            let sorted: BTreeMap<&String, &Value> = members.iter().collect();
            let members: Vec<String> = sorted
                .into_iter()
                .map(|(name, value)| format!("{}:{}", Value::from(name.as_str()), canonical(value)))
                .collect();
            format!("{{{}}}", members.join(","))
        }
        Value::Array(items) => format!("[{}]", items.iter().map(canonical).collect::<Vec<_>>().join(",")),
        other => other.to_string(),
    }
}

/// A cell's source, whatever line ends its editor writes.
pub fn source_text(source: &str) -> String {
    source.replace("\r\n", "\n")
}

/// The digest of a cell's source.
pub fn source_digest(source: &str) -> String {
    sha256(source_text(source).as_bytes())
}
