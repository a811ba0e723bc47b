//! Audits one notebook: runs it with the sealed records and with today's, and says of each value what became of it and why.
//!
//! [`audit_one`] gives a [`NotebookAudit`]. The surprise: where nothing of what a notebook used was revised, the two runs are
//! one, and it is made once.

use std::collections::BTreeMap;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use serde::Deserialize;

use crate::fault::Fault;
use crate::notebook::beside::files_beside;
use crate::notebook::causes::{Exchanged, Grounds, exchanged};
use crate::notebook::comparison::{Compared, compare};
use crate::notebook::contradiction::{contradictions, figure_compared, with_decisions};
use crate::notebook::edits::{Edit, edits, exchanged_edits};
use crate::notebook::file::{NotebookFile, bytes_of};
use crate::notebook::fixed_units;
use crate::notebook::holdings::{Holdings, constants_of, files_of, records_of};
use crate::notebook::outputs::outputs;
use crate::notebook::rederive::rederive;
use crate::notebook::run::{FaultRecord, Source};
use crate::notebook::seal::{Seal, SealedValue};
use crate::notebook::sealing::{engine_now, read_seal};
use crate::notebook::side_by_side::side_by_side;
use crate::notebook::signature::{TrustedKey, checked};
use crate::notebook::skeleton::what_of;
use crate::notebook::trial::{Trial, Unwatched, trial};
use crate::notebook::verdict::{
    Against, AuditFault, AuditStatus, Difference, Figure, Justification, NotebookAudit, Outcome, SealFacts, Signed,
    ValueAudit, Verdict,
};
use crate::num::math;
use crate::render::report::{MIME, Record};
use crate::session::on_big_stack;
use crate::source::sha256;
use crate::units::What;

/// What an audit is made with.
#[derive(Clone, Debug)]
pub struct AuditOptions {
    /// Today's records and constants.
    pub today: Holdings,
    /// Whether moves under today's data count for the status.
    pub strict_data: bool,
    /// Whether values are derived again from their steps and records too, without the author's cells.
    pub from_sources: bool,
    /// Keys that the auditor trusts.
    pub trusted: Vec<TrustedKey>,
    /// Whether a notebook that is not signed with one of them differs for that alone.
    pub strict_signature: bool,
    /// Ends a run from outside.
    pub stop: Arc<AtomicBool>,
}

impl Default for AuditOptions {
    fn default() -> Self {
        AuditOptions {
            today: Holdings::shipped(),
            strict_data: false,
            from_sources: false,
            trusted: Vec::new(),
            strict_signature: false,
            stop: Arc::default(),
        }
    }
}

/// Audits a notebook file. Whatever is wrong with it becomes part of the outcome.
pub fn audit_one(path: &Path, options: &AuditOptions) -> NotebookAudit {
    on_big_stack(|| audited(path, options))
}

fn audited(path: &Path, options: &AuditOptions) -> NotebookAudit {
    let file = path.display().to_string();
    let bytes = match bytes_of(path) {
        Ok(bytes) => bytes,
        Err(error) => return could_not_run(&file, Against::Nothing, "the file", &error.into()),
    };
    let sha256 = Some(sha256(&bytes));
    let notebook = match NotebookFile::of_bytes(path, &bytes) {
        Ok(notebook) => notebook,
        Err(error) => {
            let unread = could_not_run(&file, Against::Nothing, "the file", &error.into());
            return NotebookAudit { sha256, ..unread };
        }
    };
    drop(bytes);
    let audit = match read_seal(&file, &notebook) {
        Err(error) => Ok(could_not_run(&file, Against::Seal, "the file", &error.into())),
        Ok(Some(seal)) => of_sealed(&file, &notebook, &seal, options),
        Ok(None) => of_unsealed(&file, &notebook, options),
    };
    let audit = audit.unwrap_or_else(|fault| could_not_run(&file, Against::Seal, "the records", &fault));
    let mut audit = NotebookAudit { sha256, ..audit };
    if options.strict_signature && !audit.is_signed_by_trusted() {
        audit.unmet.push("it is not signed with a trusted key, as was demanded".to_owned());
        audit.status = audit.status.max(AuditStatus::Differs);
    }
    audit
}

fn empty(file: &str, against: Against) -> NotebookAudit {
    NotebookAudit {
        file: file.to_owned(),
        sha256: None,
        unmet: Vec::new(),
        beside: Vec::new(),
        against,
        status: AuditStatus::Same,
        seal: None,
        environment: Vec::new(),
        values: Vec::new(),
        justifications: Vec::new(),
        untested: Vec::new(),
        outputs: Vec::new(),
        not_compared: Vec::new(),
        faults: Vec::new(),
        from_sources: None,
    }
}

/// A notebook that gave nothing, for a fault that came up with `under`.
pub fn could_not_run(file: &str, against: Against, under: &str, fault: &Fault) -> NotebookAudit {
    let faults = vec![AuditFault { under: under.to_owned(), fault: FaultRecord::of(fault, file) }];
    NotebookAudit { status: AuditStatus::CouldNotRun, faults, ..empty(file, against) }
}

/// The run of a notebook on some records, with the settings that were sealed.
pub struct Runner<'a> {
    pub file: &'a str,
    pub notebook: &'a NotebookFile,
    pub settings: BTreeMap<String, String>,
    pub stop: &'a Arc<AtomicBool>,
}

impl Runner<'_> {
    pub fn run(&self, holdings: &Holdings) -> Result<Trial, Fault> {
        let cells = self.notebook.code_cells();
        self.run_cells(cells.into_iter().map(|cell| (cell.name, cell.source)).collect(), holdings)
    }

    /// Runs these cells, each with its name, in place of the notebook's.
    pub fn run_cells(&self, cells: Vec<(String, String)>, holdings: &Holdings) -> Result<Trial, Fault> {
        let mut source = Source::Cells(cells);
        trial(self.file, &mut source, &self.settings, holdings, self.stop, &mut Unwatched)
    }
}

pub(super) fn of_sealed(
    file: &str,
    notebook: &NotebookFile,
    seal: &Seal,
    options: &AuditOptions,
) -> Result<NotebookAudit, Fault> {
    let set = seal.parameters.iter().filter_map(|one| Some((one.name.clone(), one.set.clone()?)));
    let runner = Runner { file, notebook, settings: set.collect(), stop: &options.stop };
    let then = sealed_holdings(file, seal, &options.today);
    let edits = edits(file, notebook, seal);
    let mut grounds = Grounds::of(seal, &runner, &then, &options.today);
    let under_sealed = runner.run(&then.holdings)?;
    if !edits.is_empty() && parts_from(seal, &under_sealed) {
        grounds.edits = Some(exchanged_edits(&runner, &then.holdings, seal, edits.clone(), &under_sealed)?);
    }
    let today = (!then.is_today).then(|| runner.run(&options.today)).transpose()?;
    let under_today = today.as_ref().unwrap_or(&under_sealed);
    let shares = match &today {
        Some(today) if differ(&under_sealed, today) => exchanged(&runner, &then.holdings, &options.today, seal)?,
        _ => Vec::new(),
    };

    let mut values = Vec::new();
    for sealed in &seal.values {
        values.push(value_audit(sealed, &under_sealed, under_today, &grounds, &shares, then.is_today));
    }
    for tried in &under_sealed.reports {
        let record = &tried.report.record;
        if !seal.values.iter().any(|sealed| sealed.record.label == record.label) {
            values.push(new_value(record, under_today.of_label(&record.label).map(|now| &now.report.record)));
        }
    }
    let mut faults: Vec<AuditFault> = Vec::new();
    for (under, trial) in [("sealed data", Some(&under_sealed)), ("today's data", today.as_ref())] {
        let of = trial.into_iter().flat_map(|trial| &trial.faults);
        faults.extend(of.map(|fault| AuditFault { under: under.to_owned(), fault: fault.clone() }));
    }
    let facts = SealFacts {
        sealed: seal.sealed.clone(),
        author: seal.author.clone(),
        draft: seal.draft,
        whole: grounds.whole,
        signed: checked(seal, &options.trusted),
        set: runner.settings.clone(),
        contradictions: if grounds.whole { Vec::new() } else { contradictions(seal, &under_sealed) },
    };
    let outputs = outputs(notebook, seal);
    let mut audit = NotebookAudit {
        seal: Some(facts),
        environment: environment(&edits, seal, &options.today),
        justifications: justifications(seal, &under_sealed, under_today),
        untested: untested(seal),
        outputs: outputs.differ,
        not_compared: {
            let texts = seal.cells.iter().map(|cell| cell.source.as_str());
            let texts = texts.chain(seal.modules.iter().map(|module| module.content.as_str()));
            let mut list = not_compared(notebook, Some(seal));
            list.extend(outputs.not_there);
            list.extend(fixed_units::said(texts, [then.holdings.constants, options.today.constants]));
            list
        },
        values,
        faults,
        from_sources: options.from_sources.then(|| rederive(seal, &then.holdings)).transpose()?,
        beside: files_beside(file, Some(seal), [&under_sealed, under_today]),
        ..empty(file, Against::Seal)
    };
    audit.status = status(&audit, options.strict_data);
    Ok(audit)
}

/// The records and constants of a seal.
pub(super) struct Then {
    pub holdings: Holdings,
    /// Nothing of it was revised since.
    pub is_today: bool,
}

pub(super) fn sealed_holdings(file: &str, seal: &Seal, today: &Holdings) -> Then {
    let (records, entities) = records_of(seal);
    let constants = constants_of(&seal.constants);
    let files = files_of(seal);
    let same_files = seal.files.iter().all(|sealed| {
        let beside = Path::new(file).parent().unwrap_or(Path::new("")).join(&sealed.name);
        bytes_of(&beside).is_ok_and(|bytes| sha256(&bytes) == sealed.sha256)
    });
    let same_text = |a: &crate::data::records::Records, b: &crate::data::records::Records| {
        let texts = |records: &crate::data::records::Records| -> BTreeMap<_, _> {
            records.all().into_iter().map(|(key, record)| (key, record.content)).collect()
        };
        texts(a) == texts(b)
    };
    if same_text(&records, &today.records.about(&entities)) {
        let holdings = today.with_constants(constants).with_files(files);
        return Then { is_today: same_files && std::ptr::eq(constants, today.constants), holdings };
    }
    let holdings = Holdings::of(today.records.with_sealed(&records, &entities)).with_constants(constants);
    Then { holdings: holdings.with_files(files), is_today: false }
}

/// Whether a run gives anything but the sealed records.
fn parts_from(seal: &Seal, trial: &Trial) -> bool {
    !seal.values.iter().map(|value| &value.record).eq(trial.reports.iter().map(|tried| &tried.report.record))
}

/// Whether two runs part in any figure, row or fault.
fn differ(one: &Trial, other: &Trial) -> bool {
    let records = |trial: &Trial| trial.reports.iter().map(|tried| tried.report.record.clone()).collect::<Vec<_>>();
    records(one) != records(other) || one.faults != other.faults
}

fn value_audit(
    sealed: &SealedValue,
    under_sealed: &Trial,
    under_today: &Trial,
    grounds: &Grounds,
    shares: &[Exchanged],
    is_today: bool,
) -> ValueAudit {
    let record = &sealed.record;
    let outcome = |trial: &Trial, shares: &[Exchanged]| match trial.of_label(&record.label) {
        None => Outcome {
            verdict: if trial.faults.is_empty() { Verdict::Missing } else { Verdict::CouldNotRun },
            figure: None,
            moved: None,
            notes: Vec::new(),
        },
        Some(tried) => {
            let with_sealed_data = under_sealed.of_label(&record.label);
            let compared = Compared { sealed, now: tried, with_sealed_data };
            with_decisions(compare(&compared, grounds, shares), sealed, trial, grounds)
        }
    };
    let under_sealed_data = outcome(under_sealed, &[]);
    let today = if is_today { under_sealed_data.clone() } else { outcome(under_today, shares) };
    let beside = |trial: &Trial, outcome: &Outcome, under: &str| {
        // Where the figure is the sealed one to the last bit, so is its derivation.
        let differs = outcome.moved.is_some() || outcome.verdict == Verdict::UnitOrBasisChanged;
        let now = trial.of_label(&record.label).filter(|_| differs)?;
        side_by_side(grounds.seal, sealed, &now.value, under)
    };
    let steps = if under_sealed_data == today {
        vec![beside(under_sealed, &under_sealed_data, "both data")]
    } else {
        vec![beside(under_sealed, &under_sealed_data, "the sealed data"), beside(under_today, &today, "today's data")]
    };
    ValueAudit {
        steps: steps.into_iter().flatten().collect(),
        label: record.label.clone(),
        unit: record.unit.clone(),
        sealed: Some(figure_compared(figure(record), record, under_sealed.of_label(&record.label))),
        under_sealed: under_sealed_data,
        under_today: today,
    }
}

/// The figures of a record.
pub(super) fn figure(record: &Record) -> Figure {
    Figure { value: record.value.clone(), u: record.u.clone(), unit: record.unit.clone(), shown: record.shown.clone() }
}

fn new_value(record: &Record, today: Option<&Record>) -> ValueAudit {
    let outcome = |record: &Record| Outcome {
        verdict: Verdict::New,
        figure: Some(figure(record)),
        moved: None,
        notes: Vec::new(),
    };
    ValueAudit {
        label: record.label.clone(),
        unit: record.unit.clone(),
        sealed: None,
        under_sealed: outcome(record),
        under_today: today.map_or_else(|| outcome(record), outcome),
        steps: Vec::new(),
    }
}

fn status(audit: &NotebookAudit, strict_data: bool) -> AuditStatus {
    let mut verdicts: Vec<Verdict> = audit.values.iter().map(|value| value.under_sealed.verdict).collect();
    if strict_data {
        verdicts.extend(audit.values.iter().map(|value| value.under_today.verdict));
    }
    let faults = |fault: &AuditFault| fault.under != "today's data" || strict_data;
    let doubtful = audit.seal.as_ref().is_some_and(|seal| !seal.whole || matches!(seal.signed, Signed::Invalid { .. }));
    if verdicts.contains(&Verdict::CouldNotRun) || audit.faults.iter().any(faults) {
        AuditStatus::CouldNotRun
    } else if doubtful
        || !audit.outputs.is_empty()
        || audit.from_sources.iter().flatten().any(|one| !one.is_same())
        || !verdicts.into_iter().all(Verdict::is_same)
    {
        AuditStatus::Differs
    } else {
        AuditStatus::Same
    }
}

/// What differs about the surroundings.
fn environment(edits: &[Edit], seal: &Seal, today: &Holdings) -> Vec<Difference> {
    let mut found = Vec::new();
    let mut differs = |what: &str, sealed: &str, now: &str| {
        if sealed != now {
            found.push(Difference { what: what.to_owned(), sealed: sealed.to_owned(), now: now.to_owned() });
        }
    };
    let now = engine_now();
    differs(Difference::PROGRAM, &seal.engine.version, &now.version);
    differs(Difference::TABLES, &seal.engine.stdlib, &now.stdlib);
    differs(Difference::CONSTANTS, &seal.constants.year, &today.constants.year.to_string());
    for edit in edits {
        let word = |digest: &Option<String>| digest.clone().unwrap_or_else(|| "not there".to_owned());
        differs(&edit.what, &word(&edit.then), &word(&edit.now));
    }
    found
}

fn justifications(seal: &Seal, under_sealed: &Trial, under_today: &Trial) -> Vec<Justification> {
    let mut listed = Vec::new();
    for value in &seal.values {
        let record = &value.record;
        for decision in value.decisions.iter().filter(|decision| decision.reason.is_some()) {
            let row = |record: &Record| {
                let of =
                    |row: &&crate::render::report::Assumption| row.id == decision.id && row.subject == decision.subject;
                record.assumptions.iter().find(of).and_then(|row| row.price.clone())
            };
            let price_in = |trial: &Trial| trial.of_label(&record.label).and_then(|now| row(&now.report.record));
            let logarithmic = what_of(&value.kind.what) == Some(What::K);
            let price = row(record);
            let (price_sealed_data, price_today) = (price_in(under_sealed), price_in(under_today));
            let lapses = |trial: &Trial, now: &Option<String>| {
                trial.of_label(&record.label).is_some_and(|tried| {
                    lapsed(record, price.as_deref(), &tried.report.record, now.as_deref(), logarithmic)
                })
            };
            listed.push(Justification {
                label: record.label.clone(),
                id: decision.id.clone(),
                subject: decision.subject.clone(),
                reason: decision.reason.clone().unwrap_or_default(),
                lapsed: lapses(under_sealed, &price_sealed_data) || lapses(under_today, &price_today),
                price,
                price_sealed_data,
                price_today,
            });
        }
    }
    listed
}

/// Whether a price is beyond what was signed for: the price at signing plus the tolerance. Prices of an equilibrium constant
/// are compared in its logarithm, as they are shown: where K itself shrank, a price may shrink and yet be a larger part of it.
pub(super) fn lapsed(sealed: &Record, signed: Option<&str>, is: &Record, now: Option<&str>, logarithmic: bool) -> bool {
    let number = |text: &str| text.parse::<f64>().ok();
    let Some(now) = now.and_then(number) else { return false };
    let (signed, tolerance) = (signed.and_then(number).unwrap_or(0.0), number(&sealed.tolerance).unwrap_or(0.0));
    if let (true, Some(then), Some(value)) = (logarithmic, number(&sealed.value), number(&is.value)) {
        return lapsed_in_logarithm((signed, then), (now, value), tolerance);
    }
    now.abs() > signed.abs() + tolerance
}

/// The same for equilibrium constants, each a price with the value it is the price of; the tolerance is that of the first.
fn lapsed_in_logarithm(signed: (f64, f64), now: (f64, f64), tolerance: f64) -> bool {
    let lg = |(price, value): (f64, f64)| match value / (value - price) {
        ratio if ratio > 0.0 && ratio.is_finite() => math::log10(ratio).abs(),
        _ => f64::INFINITY,
    };
    lg(now) > lg(signed) + tolerance / signed.1.abs() / std::f64::consts::LN_10
}

fn untested(seal: &Seal) -> Vec<String> {
    let mut rows: Vec<String> = Vec::new();
    for row in &seal.open {
        let words = format!("{} {} ({})", row.status, row.id, row.subject);
        if !rows.contains(&words) {
            rows.push(words);
        }
    }
    rows
}

fn not_compared(notebook: &NotebookFile, seal: Option<&Seal>) -> Vec<String> {
    let mut list = vec!["texts between the cells, printed text and pictures".to_owned()];
    let empty = notebook.code_cells().iter().filter(|cell| cell.source.trim().is_empty()).count();
    let unkept = seal.into_iter().flat_map(|seal| &seal.files).filter(|file| file.content.is_none());
    list.extend(unkept.map(|file| format!("what was in {}: the seal has its digest alone", file.name)));
    if empty > 0 {
        list.push(format!("{empty} empty code cells"));
    }
    list
}

/// A notebook without seal, against the results that stand in it.
fn of_unsealed(file: &str, notebook: &NotebookFile, options: &AuditOptions) -> Result<NotebookAudit, Fault> {
    let recorded: Vec<Record> =
        notebook.recorded(MIME).into_iter().filter_map(|tree| Record::deserialize(tree).ok()).collect();
    if recorded.is_empty() {
        let said = "it has no seal and no recorded result, so nothing can be compared; seal it with `hessbook seal`";
        return Ok(NotebookAudit {
            status: AuditStatus::NothingToCompare,
            not_compared: vec![said.to_owned()],
            ..empty(file, Against::Nothing)
        });
    }
    let runner = Runner { file, notebook, settings: BTreeMap::new(), stop: &options.stop };
    let now = runner.run(&options.today)?;
    let mut values = Vec::new();
    for record in &recorded {
        let outcome = match now.of_label(&record.label) {
            None => Outcome {
                verdict: if now.faults.is_empty() { Verdict::Missing } else { Verdict::CouldNotRun },
                figure: None,
                moved: None,
                notes: Vec::new(),
            },
            Some(tried) => crate::notebook::comparison::against_record(record, tried),
        };
        values.push(ValueAudit {
            label: record.label.clone(),
            unit: record.unit.clone(),
            sealed: Some(figure(record)),
            under_sealed: outcome.clone(),
            under_today: outcome,
            steps: Vec::new(),
        });
    }
    for tried in &now.reports {
        let record = &tried.report.record;
        if !recorded.iter().any(|known| known.label == record.label) {
            values.push(new_value(record, None));
        }
    }
    let mut list = vec![
        "it has no seal: causes of moves cannot be told, and nothing says what its cells and records were".to_owned(),
    ];
    list.extend(not_compared(notebook, None));
    let faults = now.faults.iter();
    let mut audit = NotebookAudit {
        values,
        not_compared: list,
        faults: faults.map(|fault| AuditFault { under: "sealed data".to_owned(), fault: fault.clone() }).collect(),
        beside: files_beside(file, None, [&now, &now]),
        ..empty(file, Against::RecordedOutputs)
    };
    audit.faults.iter_mut().for_each(|fault| fault.under = "today's data, since none are sealed".to_owned());
    audit.status = status(&audit, options.strict_data);
    Ok(audit)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_price_of_a_smaller_equilibrium_constant_is_compared_in_the_logarithm() {
        // K falls from 10 to 5; the alternative was 0.055 above it in lg K and now is 0.11, tolerance 0.021 in lg K. As plain
        // numbers the prices are -1.35 and -1.44, which the tolerance of 0.48 would cover. (Chosen figures.)
        let price = |value: f64, lg: f64| value * (1.0 - math::pow(10.0, lg));
        let (signed, tolerance) = ((price(10.0, 0.055), 10.0), 0.021 * 10.0 * std::f64::consts::LN_10);
        assert!(lapsed_in_logarithm(signed, (price(5.0, 0.11), 5.0), tolerance));
        assert!(!lapsed_in_logarithm(signed, (price(5.0, 0.075), 5.0), tolerance));
        assert!(!lapsed_in_logarithm(signed, (price(20.0, 0.055), 20.0), tolerance));
    }
}
