//! Counts over an archive, made by one walk: what the reports say first.
//!
//! [`Tally`] stays small however large the archive is. The surprise: what belongs to one notebook alone, such as an edited
//! cell, is counted by its kind; only what several notebooks can share, such as a revised record, is named.

use std::borrow::Cow;
use std::collections::BTreeMap;

use serde::Serialize;

use crate::archive::audits::Audits;
use crate::fault::Fault;
use crate::notebook::verdict::{
    Against, AuditStatus, Cause, CauseKind, NotebookAudit, Rederived, SealFacts, Signed, ValueAudit, Verdict,
};
use crate::units;

/// No list of a tally grows beyond this.
const MOST: usize = 1000;

/// How many notebooks a note names.
const EXAMPLES: usize = 3;

/// Counts over an archive.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Tally {
    pub notebooks: BTreeMap<AuditStatus, usize>,
    /// What they were compared with: a seal, recorded outputs, nothing.
    pub sealed: usize,
    pub recorded: usize,
    pub nothing: usize,
    /// Values of sealed notebooks by verdict.
    pub under_sealed: BTreeMap<Verdict, usize>,
    pub under_today: BTreeMap<Verdict, usize>,
    /// Values of notebooks without seal, against their recorded outputs.
    pub against_recorded: BTreeMap<Verdict, usize>,
    /// Values that are not identical under some data, and their derivations side by side: a value may have two.
    pub not_identical: usize,
    pub derivations: usize,
    pub justifications_in_force: usize,
    pub justifications_lapsed: usize,
    pub seals: Seals,
    /// Notebooks whose recorded outputs are not what was sealed.
    pub outputs_differ: usize,
    pub faults: usize,
    /// Cells and modules that are not what was sealed, and in how many notebooks.
    pub edits: usize,
    pub notebooks_edited: usize,
    /// Values derived again without the author's cells; none where that was not asked for.
    pub rederived: Option<RederivedCounts>,
    /// Most values first.
    pub causes: Vec<CauseSum>,
    /// Causes beyond what a tally keeps.
    pub causes_left_out: usize,
    /// What the notebooks run on and were not sealed with.
    pub surroundings: Notes,
    /// Rows that were open when the notebooks were sealed.
    pub untested: Notes,
    pub not_compared: Notes,
}

/// Seals by what is known of them.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Seals {
    pub not_signed: usize,
    pub signed_trusted: usize,
    pub signed_untrusted: usize,
    pub signature_invalid: usize,
    /// In the place of a seal stands what is none that can be read, or whose records make no catalogue.
    pub unreadable: usize,
    /// Whose content is not what their digest says.
    pub altered: usize,
    pub drafts: usize,
}

/// Values derived again.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct RederivedCounts {
    /// Every step was done again, and gave the sealed value and u.
    pub whole: usize,
    /// The same, with some steps taken as they were sealed.
    pub in_part: usize,
    pub otherwise: usize,
    /// No figure came of it, so that nothing was compared.
    pub not_at_all: usize,
}

/// A cause over the whole archive.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct CauseSum {
    pub kind: CauseKind,
    /// None for a kind that belongs to each notebook alone.
    pub what: Option<String>,
    pub values: usize,
    pub notebooks: usize,
    /// Values of which its share is not known.
    pub without_share: usize,
    /// The largest share in each unit.
    pub largest: BTreeMap<String, Largest>,
}

#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Largest {
    pub share: String,
    pub shown: String,
    pub label: String,
    pub file: String,
}

/// Texts, each with the number of notebooks that it is said of.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Notes {
    pub said: BTreeMap<String, Note>,
    /// Sayings beyond what a tally keeps.
    pub left_out: usize,
}

#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Note {
    pub notebooks: usize,
    /// The first of them.
    pub examples: Vec<String>,
}

/// The longest saying that a tally keeps, in characters: what is counted over an archive has to stay small.
const LONGEST: usize = 400;

fn cut(words: &str) -> Cow<'_, str> {
    match words.char_indices().nth(LONGEST) {
        Some((end, _)) => Cow::Owned(format!("{} …", &words[..end])),
        None => Cow::Borrowed(words),
    }
}

impl Notes {
    fn add(&mut self, words: &str, file: &str) {
        let words: &str = &cut(words);
        if self.said.len() >= MOST && !self.said.contains_key(words) {
            self.left_out += 1;
            return;
        }
        let note = self.said.entry(words.to_owned()).or_default();
        note.notebooks += 1;
        if note.examples.len() < EXAMPLES {
            note.examples.push(file.to_owned());
        }
    }
}

impl Tally {
    /// Counts over all audits.
    ///
    /// # Errors
    /// They cannot be read back.
    pub fn of(audits: &dyn Audits) -> Result<Tally, Fault> {
        let mut tally = Tally::default();
        let mut causes = Causes::default();
        audits.each(&mut |audit| {
            tally.add(audit);
            causes.add(audit);
            Ok(())
        })?;
        tally.causes_left_out = causes.left_out;
        tally.causes = causes.known.into_values().collect();
        tally.causes.sort_by(|a, b| b.values.cmp(&a.values).then(a.kind.cmp(&b.kind)).then(a.what.cmp(&b.what)));
        Ok(tally)
    }

    pub fn all(&self) -> usize {
        self.notebooks.values().sum()
    }

    pub fn with_status(&self, status: AuditStatus) -> usize {
        self.notebooks.get(&status).copied().unwrap_or(0)
    }

    /// Notebooks that differ or could not be run.
    pub fn not_same(&self) -> usize {
        self.with_status(AuditStatus::Differs) + self.with_status(AuditStatus::CouldNotRun)
    }

    /// Notebooks that were read and have no seal.
    pub fn without_seal(&self) -> usize {
        self.recorded + self.with_status(AuditStatus::NothingToCompare)
    }

    /// Files that could not be read as notebooks, so that nobody knows whether they have a seal.
    pub fn not_read(&self) -> usize {
        self.nothing.saturating_sub(self.with_status(AuditStatus::NothingToCompare))
    }

    fn add(&mut self, audit: &NotebookAudit) {
        *self.notebooks.entry(audit.status).or_default() += 1;
        match audit.against {
            Against::Seal => self.sealed += 1,
            Against::RecordedOutputs => self.recorded += 1,
            Against::Nothing => self.nothing += 1,
        }
        for value in &audit.values {
            let count = |verdicts: &mut BTreeMap<Verdict, usize>, verdict| *verdicts.entry(verdict).or_default() += 1;
            if audit.against == Against::Seal {
                count(&mut self.under_sealed, value.under_sealed.verdict);
                count(&mut self.under_today, value.under_today.verdict);
            } else {
                count(&mut self.against_recorded, value.under_today.verdict);
            }
            self.not_identical += usize::from(!is_identical(value));
            self.derivations += value.steps.len();
        }
        let lapsed = audit.justifications.iter().filter(|one| one.lapsed).count();
        self.justifications_lapsed += lapsed;
        self.justifications_in_force += audit.justifications.len() - lapsed;
        match &audit.seal {
            Some(seal) => self.seals.add(seal),
            None => self.seals.unreadable += usize::from(audit.against == Against::Seal),
        }
        self.outputs_differ += usize::from(!audit.outputs.is_empty());
        self.faults += audit.faults.len();
        let edits = audit.environment.iter().filter(|difference| difference.is_edit()).count();
        self.edits += edits;
        self.notebooks_edited += usize::from(edits > 0);
        for derived in audit.from_sources.iter().flatten() {
            self.rederived.get_or_insert_default().add(derived);
        }
        for difference in audit.environment.iter().filter(|difference| !difference.is_edit()) {
            let words = format!("{}: {} then, {} now", difference.what, difference.sealed, difference.now);
            self.surroundings.add(&words, &audit.file);
        }
        audit.untested.iter().for_each(|row| self.untested.add(row, &audit.file));
        audit.not_compared.iter().for_each(|what| self.not_compared.add(what, &audit.file));
    }
}

/// Whether a value is identical under all data.
pub fn is_identical(value: &ValueAudit) -> bool {
    value.under_sealed.verdict == Verdict::Identical && value.under_today.verdict == Verdict::Identical
}

impl Seals {
    fn add(&mut self, seal: &SealFacts) {
        match &seal.signed {
            Signed::Not => self.not_signed += 1,
            Signed::Valid { trusted: Some(_), .. } => self.signed_trusted += 1,
            Signed::Valid { trusted: None, .. } => self.signed_untrusted += 1,
            Signed::Invalid { .. } => self.signature_invalid += 1,
        }
        self.altered += usize::from(!seal.whole);
        self.drafts += usize::from(seal.draft);
    }
}

impl RederivedCounts {
    fn add(&mut self, one: &Rederived) {
        match (one.is_same(), one.not_rederived.is_empty()) {
            (true, true) => self.whole += 1,
            (true, false) => self.in_part += 1,
            (false, _) if one.value.is_none() => self.not_at_all += 1,
            (false, _) => self.otherwise += 1,
        }
    }
}

#[derive(Default)]
struct Causes {
    known: BTreeMap<(CauseKind, Option<String>), CauseSum>,
    left_out: usize,
}

impl Causes {
    fn add(&mut self, audit: &NotebookAudit) {
        let mut here: Vec<(CauseKind, Option<String>)> = Vec::new();
        for value in &audit.values {
            // With each cause, whether its share is unknown in some run.
            let mut of_value: Vec<((CauseKind, Option<String>), bool)> = Vec::new();
            let moves = [&value.under_sealed.moved, &value.under_today.moved].into_iter().flatten();
            for cause in moves.flat_map(|moved| &moved.causes) {
                let shared = matches!(cause.kind, CauseKind::Data | CauseKind::Constants | CauseKind::Engine);
                let key = (cause.kind, shared.then(|| cause.what.clone()));
                if self.known.len() >= MOST && !self.known.contains_key(&key) {
                    self.left_out += 1;
                    continue;
                }
                let sum = self.known.entry(key.clone()).or_insert_with(|| CauseSum {
                    kind: key.0,
                    what: key.1.clone(),
                    values: 0,
                    notebooks: 0,
                    without_share: 0,
                    largest: BTreeMap::new(),
                });
                sum.largest_of(cause, value, &audit.file);
                let unknown = cause.share.is_none();
                match of_value.iter_mut().find(|(known, _)| *known == key) {
                    None => {
                        sum.values += 1;
                        sum.without_share += usize::from(unknown);
                        of_value.push((key.clone(), unknown));
                    }
                    Some((_, before)) => {
                        sum.without_share += usize::from(unknown && !*before);
                        *before |= unknown;
                    }
                }
                if !here.contains(&key) {
                    sum.notebooks += 1;
                    here.push(key);
                }
            }
        }
    }
}

impl CauseSum {
    fn largest_of(&mut self, cause: &Cause, value: &ValueAudit, file: &str) {
        let (Some(share), Some(shown)) = (&cause.share, &cause.shown) else { return };
        let size = |text: &str| text.parse::<f64>().map_or(0.0, f64::abs);
        let unit =
            units::parse::unit(&value.unit).map_or_else(|_| value.unit.clone(), |unit| units::reader_text(&unit));
        if self.largest.get(&unit).is_some_and(|known| size(&known.share) >= size(share)) {
            return;
        }
        if self.largest.len() < MOST {
            let (label, file) = (value.label.clone(), file.to_owned());
            self.largest.insert(unit, Largest { share: share.clone(), shown: shown.clone(), label, file });
        }
    }

    /// `data: formation properties of CO2(g) in atct-1.112`
    pub fn words(&self) -> String {
        match &self.what {
            Some(what) => format!("{}: {what}", self.kind.word()),
            None => format!("{}, of the notebook itself", self.kind.word()),
        }
    }
}
