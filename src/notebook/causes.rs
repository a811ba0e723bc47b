//! Why a value moved: what was edited, and which record or constant was revised, with the share of each.
//!
//! [`Grounds`] holds what can be said without exchanging data: altered seals, edited cells, other programs. [`exchanged`]
//! runs the notebook again with one revised record, or one constant, in place of the sealed one. The surprise: shares found
//! one at a time need not add up to the move, and what is left is stated as a remainder.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use crate::data::records::{Record, RecordKey, Records};
use crate::fault::Fault;
use crate::notebook::audit::{Runner, Then};
use crate::notebook::edits::{Edit, ExchangedEdits, altered_texts};
use crate::notebook::holdings::{Holdings, altered_records, constants_of, records_of};
use crate::notebook::seal::{Seal, SealedValue};
use crate::notebook::sealing::engine_now;
use crate::notebook::trial::{Trial, Tried};
use crate::notebook::verdict::CauseKind;
use crate::quantity::Quantity;
use crate::record::node::LeafKey;
use crate::source::sha256;

/// More revised records than this are exchanged dataset by dataset.
const MOST_EXCHANGED: usize = 64;

/// What is known before data are exchanged.
pub struct Grounds<'a> {
    pub seal: &'a Seal,
    /// Whether the seal's digest is that of its content.
    pub whole: bool,
    /// What each edited cell and module moved; none where nothing was edited, or nothing moved.
    pub edits: Option<ExchangedEdits>,
    /// How the program differs, in words.
    engine: Option<String>,
    /// Records of the seal that were altered in it, each with the values that the true record gives, where it is known.
    altered: Vec<(String, Option<Values>)>,
}

/// Values by label, in SI units, with their standard uncertainty.
pub type Values = BTreeMap<String, (f64, Option<f64>)>;

/// What a run gave.
pub fn values_of(trial: &Trial) -> Values {
    let of = |tried: &Tried| (tried.report.record.label.clone(), (tried.value.si(), tried.value.spread().u()));
    trial.reports.iter().map(of).collect()
}

impl<'a> Grounds<'a> {
    pub(super) fn of(seal: &'a Seal, runner: &Runner, then: &Then, today: &Holdings) -> Grounds<'a> {
        let now = engine_now();
        let engine = (seal.engine.version != now.version)
            .then(|| format!("hessbook {} then, {} now", seal.engine.version, now.version));
        let whole = seal.is_whole();
        let altered = altered_records(seal).into_iter().map(|name| {
            let values = restored(seal, &name, then, today).and_then(|holdings| runner.run(&holdings).ok());
            (name, values.map(|trial| values_of(&trial)))
        });
        Grounds { seal, whole, edits: None, engine, altered: if whole { Vec::new() } else { altered.collect() } }
    }

    /// Causes of what moved a value while its records and constants stayed: together they are the move.
    pub(super) fn causes(
        &self,
        sealed: &SealedValue,
        now: &Tried,
        moved: f64,
    ) -> Vec<(CauseKind, String, Option<f64>)> {
        let record = &sealed.record;
        let (mut causes, mut left) = (Vec::new(), moved);
        if !self.whole {
            if let Some((words, share)) = self.contradiction(sealed) {
                left -= share;
                causes.push((CauseKind::Seal, words, Some(share)));
            }
            for (name, values) in &self.altered {
                let true_si = values.as_ref().and_then(|values| values.get(&record.label));
                let share = true_si.map(|(si, _)| (now.value.si() - si) / super::comparison::factor_of(&record.unit));
                if share != Some(0.0) {
                    left -= share.unwrap_or(0.0);
                    causes.push((CauseKind::Seal, format!("its record of {name} was altered"), share));
                }
            }
        }
        let rounding = 16.0 * f64::EPSILON * now.value.si().abs() / super::comparison::factor_of(&record.unit);
        if left.abs() <= rounding && !causes.is_empty() {
            return causes;
        }
        if let Some(edits) = &self.edits {
            let told = self.edit_causes(edits, sealed, now, left, rounding);
            causes.extend(told);
            return causes;
        }
        let (kind, what) = self.otherwise();
        causes.push((kind, what, Some(left)));
        causes
    }

    /// What moved a value that nobody edited.
    fn otherwise(&self) -> (CauseKind, String) {
        if !self.whole {
            let altered = altered_texts(self.seal);
            let of = if altered.is_empty() { String::new() } else { format!(": the text of {}", altered.join(", ")) };
            return (CauseKind::Seal, format!("its content is not what was sealed{of}"));
        }
        let same = || format!("hessbook {} gives another value from the same cells and data", self.seal.engine.version);
        (CauseKind::Engine, self.engine.clone().unwrap_or_else(same))
    }

    /// What the sealed cells give today, and then each edit; edits that cannot run alone have what is left.
    fn edit_causes(
        &self,
        edits: &ExchangedEdits,
        sealed: &SealedValue,
        now: &Tried,
        mut left: f64,
        rounding: f64,
    ) -> Vec<(CauseKind, String, Option<f64>)> {
        let label = &sealed.record.label;
        let factor = super::comparison::factor_of(&sealed.record.unit);
        let mut causes = Vec::new();
        let base = edits.as_sealed.get(label).map(|(si, _)| *si);
        if let Some(base) = base {
            let by_program = left - (now.value.si() - base) / factor;
            if by_program.abs() > rounding {
                let (kind, what) = self.otherwise();
                causes.push((kind, what, Some(by_program)));
                left -= by_program;
            }
        }
        let mut together: Vec<&Edit> = Vec::new();
        let single = edits.each.len() == 1;
        for (edit, values) in &edits.each {
            let share = values.get(label).map(|(si, _)| *si).zip(base).map(|(si, base)| (si - base) / factor);
            match share {
                _ if single => together.push(edit),
                Some(0.0) => {}
                Some(share) => {
                    left -= share;
                    causes.push((edit.kind, edit.what.clone(), Some(share)));
                }
                None => together.push(edit),
            }
        }
        if let Some(first) = together.first() {
            let what = together.iter().map(|edit| edit.what.as_str()).collect::<Vec<_>>().join("; ");
            let what = if together.len() > 1 { format!("{what}: together") } else { what };
            causes.push((first.kind, what, Some(left)));
        }
        causes
    }

    /// Whether the sealed figure is not the one its own derivation ends at, and by how much.
    fn contradiction(&self, sealed: &SealedValue) -> Option<(String, f64)> {
        let step = self.seal.steps.get(sealed.step.parse::<usize>().ok()?)?;
        let unit = crate::units::parse::unit(&sealed.record.unit).ok()?;
        let derived = unit.from_si(step.si.parse().ok()?);
        let stated: f64 = sealed.record.value.parse().ok()?;
        let words = format!(
            "it says {stated} {unit}, and its own derivation ends at {derived} {unit}",
            unit = sealed.record.unit
        );
        (derived != stated).then_some((words, derived - stated))
    }
}

/// The sealed records with one altered record as it is today, if today's is the one that was sealed.
fn restored(seal: &Seal, name: &str, then: &Then, today: &Holdings) -> Option<Holdings> {
    let (records, entities) = records_of(seal);
    let here = today.records.about(&entities);
    let (key, record) = here.all().into_iter().find(|(key, _)| key.to_string() == name)?;
    let sealed_digest = seal.data.iter().find_map(|table| {
        let own = table.schema == *key.schema && table.dataset == *key.dataset;
        let of = |one: &&crate::notebook::seal::SealedRecord| one.list == *key.list && one.id == *key.id;
        own.then(|| match key.list.is_empty() {
            true => Some(table.head_sha256.clone()),
            false => table.records.iter().find(of).map(|record| record.sha256.clone()),
        })?
    })?;
    if *sealed_digest != *record.sha256 {
        return None;
    }
    let mut mended = records;
    mended.put(&key, Some(&record), &here);
    let mended = Holdings::of(today.records.with_sealed(&mended, &entities));
    Some(mended.with_constants(then.holdings.constants).with_files(then.holdings.files.clone()))
}

/// One revised record, dataset or constant in place of the sealed one, and what the notebook gives with it.
pub struct Exchanged {
    pub kind: CauseKind,
    pub what: String,
    pub values: Values,
    touches: Touches,
}

enum Touches {
    Records(Vec<RecordKey>),
    Constant(String),
}

impl Exchanged {
    /// Variance of a value by the inputs that were exchanged, in SI units; none where one states no uncertainty, or where
    /// it is not known which inputs they were.
    pub fn variance(&self, value: &Quantity) -> Option<f64> {
        if matches!(&self.touches, Touches::Records(keys) if keys.is_empty()) {
            return None;
        }
        let mut sum = Some(0.0);
        for one in value.sensitivities() {
            let touched = match (one.key(), &self.touches) {
                (Some(LeafKey::Datum { dataset, record, t_bits, .. }), Touches::Records(keys)) => {
                    keys.iter().any(|key| {
                        let function = *key.schema == *crate::data::function::SCHEMA;
                        *key.dataset == **dataset
                            && (key.id.is_empty() || *key.id == **record)
                            && function == (*t_bits != 0)
                    })
                }
                (Some(LeafKey::Constant { name, .. }), Touches::Constant(constant)) => name == constant,
                _ => false,
            };
            if touched {
                sum = sum.zip(one.part()).map(|(sum, part)| sum + part * part);
            }
        }
        sum
    }
}

/// Runs the notebook on the sealed records with each revised one, and each other constant, put in alone.
///
/// # Errors
/// The records make no catalogue.
pub fn exchanged(runner: &Runner, then: &Holdings, today: &Holdings, seal: &Seal) -> Result<Vec<Exchanged>, Fault> {
    let (sealed, entities) = records_of(seal);
    let here = today.records.about(&entities);
    let mut list = Vec::new();
    for (what, keys) in revised(&sealed, &here) {
        let mut records = sealed.clone();
        let now = here.all();
        for key in &keys {
            records.put(key, now.get(key), &here);
        }
        let holdings = Holdings::of(today.records.with_sealed(&records, &entities));
        let holdings = holdings.with_constants(then.constants).with_files(then.files.clone());
        let values = holdings.catalog().ok().and_then(|_| runner.run(&holdings).ok());
        let values = values.map(|trial| values_of(&trial)).unwrap_or_default();
        let touches = Touches::Records(keys.into_iter().map(|key| today.records.in_use(key)).collect());
        list.push(Exchanged { kind: CauseKind::Data, what, values, touches });
    }
    for file in seal.files.iter().filter(|file| file.content.is_some()) {
        let mut files = then.files.clone();
        files.remove(&file.name);
        let trial = runner.run(&then.with_files(files))?;
        if trial.files.get(&file.name).is_some_and(|bytes| sha256(bytes) == file.sha256) {
            continue;
        }
        let what = format!("file {}, which is not what was sealed", file.name);
        let touches = Touches::Records(Vec::new());
        list.push(Exchanged { kind: CauseKind::Data, what, values: values_of(&trial), touches });
    }
    let sealed_set = constants_of(&seal.constants);
    for (was, is) in sealed_set.all().into_iter().zip(today.constants.all()) {
        if (was.value, was.u) == (is.value, is.u) {
            continue;
        }
        let holdings = then.with_constants(sealed_set.with(&[(is.name, is.value, is.u)]));
        list.push(Exchanged {
            kind: CauseKind::Constants,
            what: format!("{} {}: {} then, {} now", is.name, is.symbol, was.value, is.value),
            values: values_of(&runner.run(&holdings)?),
            touches: Touches::Constant(is.name.to_owned()),
        });
    }
    Ok(list)
}

/// What was revised, in pieces to be exchanged one at a time: records, and datasets that the seal does not know at all.
fn revised(sealed: &Records, here: &Records) -> Vec<(String, Vec<RecordKey>)> {
    let (then, now) = (sealed.all(), here.all());
    let known: BTreeSet<&Arc<str>> = then.keys().map(|key| &key.dataset).collect();
    let content = |record: Option<&Record>| record.map(|record| record.content.clone());
    let keys: BTreeSet<&RecordKey> = then.keys().chain(now.keys()).collect();
    let changed: Vec<&RecordKey> =
        keys.into_iter().filter(|key| content(then.get(key)) != content(now.get(key))).collect();
    let by_dataset = changed.len() > MOST_EXCHANGED;
    let mut pieces: Vec<(String, Vec<RecordKey>)> = Vec::new();
    for key in changed {
        let new = !known.contains(&key.dataset);
        let what = match (now.contains_key(key), then.contains_key(key)) {
            _ if new => format!("dataset {}, which is new", key.dataset),
            _ if by_dataset => format!("records of {}", key.dataset),
            (true, true) => key.to_string(),
            (true, false) => format!("{key}, which is new"),
            (false, _) => format!("{key}, which is gone"),
        };
        match pieces.iter_mut().find(|(known, _)| *known == what) {
            Some((_, keys)) => keys.push(key.clone()),
            None => pieces.push((what, vec![key.clone()])),
        }
    }
    pieces
}
