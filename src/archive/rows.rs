//! What the parts of the page say of each notebook, as plain values for their templates.
//!
//! Nothing here is HTML: texts stay as they are, and the templates escape them.

use std::collections::BTreeMap;

use serde::Serialize;
use serde_json::{Value, json};

use crate::archive::report::About;
use crate::archive::tally::{Notes, Tally, is_identical};
use crate::archive::text::sizes;
use crate::archive::words::{
    causes_words, counted, edits, fault_words, left_out_words, price, reasons, signature_words, status_words,
    verdict_counts,
};
use crate::notebook::verdict::{
    Against, AuditStatus, Figure, Justification, NotebookAudit, Outcome, OutputDiffers, SideBySide, StepPair,
    ValueAudit, Verdict,
};

/// Derivations up to this number are unfolded from the start.
const UNFOLDED: usize = 20;

/// Derivations that a page shows: a revision may move every value of an archive, and nobody can read or print them all.
const MOST_DERIVATIONS: usize = 200;

/// Where a walk has come to.
pub struct At<'a> {
    pub about: &'a About,
    /// Derivations of the notebooks before this one.
    pub derivations: usize,
}

/// A tally as the page shows it.
#[derive(Serialize)]
pub struct Shown<'a> {
    tally: &'a Tally,
    all: usize,
    not_same: usize,
    /// The result in one sentence.
    result: String,
    statuses: Vec<Counted>,
    verdicts: Vec<VerdictRow>,
    all_sealed: usize,
    all_today: usize,
    against_recorded: Vec<Counted>,
    /// What an auditor looks at first, of what there is some.
    attention: Vec<String>,
    causes: Vec<(String, String)>,
    untested: Vec<(String, usize, String)>,
    not_compared: Vec<(String, usize, String)>,
    surroundings: Vec<(String, usize, String)>,
    justifications: usize,
    not_rederived: usize,
    unfolded: bool,
    derivations_left_out: usize,
}

/// A count with its words, and whether it wants attention.
#[derive(Serialize)]
struct Counted {
    words: String,
    count: usize,
    loud: bool,
}

/// A row of the verdict table.
#[derive(Serialize)]
struct VerdictRow {
    word: &'static str,
    means: &'static str,
    sealed: usize,
    today: usize,
    loud: bool,
}

pub fn tally(tally: &Tally) -> Shown<'_> {
    let of = |counts: &BTreeMap<Verdict, usize>, verdict: &Verdict| counts.get(verdict).copied().unwrap_or(0);
    let row = |verdict: &Verdict| VerdictRow {
        word: verdict.word(),
        means: meaning(*verdict),
        sealed: of(&tally.under_sealed, verdict),
        today: of(&tally.under_today, verdict),
        loud: !verdict.is_same(),
    };
    let status = |(status, count): (&AuditStatus, &usize)| Counted {
        words: status_words(*status, *count),
        count: *count,
        loud: status.exit() > 0,
    };
    let recorded = |(verdict, count): (&Verdict, &usize)| Counted {
        words: verdict.word().to_owned(),
        count: *count,
        loud: !verdict.is_same(),
    };
    Shown {
        all: tally.all(),
        not_same: tally.not_same(),
        result: result(tally),
        statuses: tally.notebooks.iter().map(status).collect(),
        verdicts: Verdict::ALL.iter().map(row).filter(|row| row.sealed + row.today > 0).collect(),
        all_sealed: tally.under_sealed.values().sum(),
        all_today: tally.under_today.values().sum(),
        against_recorded: tally.against_recorded.iter().map(recorded).collect(),
        attention: attention(tally),
        causes: tally.causes.iter().map(|cause| (cause.words(), sizes(cause))).collect(),
        untested: notes(&tally.untested),
        not_compared: notes(&tally.not_compared),
        surroundings: notes(&tally.surroundings),
        justifications: tally.justifications_in_force + tally.justifications_lapsed,
        not_rederived: tally
            .rederived
            .as_ref()
            .map_or(0, |derived| derived.in_part + derived.otherwise + derived.not_at_all),
        unfolded: tally.derivations <= UNFOLDED,
        derivations_left_out: tally.derivations.saturating_sub(MOST_DERIVATIONS),
        tally,
    }
}

fn result(tally: &Tally) -> String {
    let (all, same) = (tally.all(), tally.with_status(AuditStatus::Same));
    if all == 0 {
        return "No notebook was audited.".to_owned();
    }
    let bare = tally.with_status(AuditStatus::NothingToCompare);
    let bare =
        if bare > 0 { format!(" {}.", status_words(AuditStatus::NothingToCompare, bare)) } else { String::new() };
    match tally.not_same() {
        0 if same == all => format!("{same} of {all} notebooks give the figures again that they were compared with."),
        0 => format!("{same} of {all} notebooks give the figures again that they were compared with;{bare}"),
        not_same => {
            let counts = [AuditStatus::Differs, AuditStatus::CouldNotRun].map(|one| (one, tally.with_status(one)));
            let words = counts.iter().filter(|(_, count)| *count > 0).map(|(one, count)| status_words(*one, *count));
            let (are, words) = (if not_same == 1 { "is" } else { "are" }, words.collect::<Vec<_>>().join(", "));
            format!("{not_same} of {all} notebooks {are} not the same: {words}.{bare}")
        }
    }
}

/// The README has the same meanings; they stand here too, since a page is read without it.
fn meaning(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Identical => "the same to the last bit, with the same assumptions",
        Verdict::SameAsPrinted => "other bits, and the same figures as printed",
        Verdict::WithinU => {
            "moved by revised data or constants, by no more than the standard uncertainty that these inputs stated"
        }
        Verdict::AssumptionChanged => "what the value rests on is not what was sealed",
        Verdict::JustificationLapsed => "what was justified in writing now costs more than at signing",
        Verdict::Moved => "the figure is another one; its causes are in the table of moves",
        Verdict::UnitOrBasisChanged => "reported in another unit, on another basis, or as another quantity",
        Verdict::New => "reported now, and not in the seal",
        Verdict::Missing => "in the seal, and not reported now",
        Verdict::CouldNotRun => "no figure, since a cell failed",
    }
}

fn attention(tally: &Tally) -> Vec<String> {
    let seals = &tally.seals;
    let said = [
        (seals.altered, "notebook", "with a seal that was altered after it was made"),
        (seals.signature_invalid, "notebook", "with a signature that does not hold"),
        (seals.drafts, "notebook", "sealed as a draft, with assumptions that nobody dealt with"),
        (
            seals.not_signed,
            "notebook",
            "sealed and not signed: nothing shows who sealed, or that the seal was not replaced",
        ),
        (seals.signed_untrusted, "notebook", "signed with a key that is not among the trusted"),
        (seals.signed_trusted, "notebook", "signed with a trusted key"),
        (tally.without_seal(), "notebook", "without a seal"),
        (seals.unreadable, "notebook", "with a seal that cannot be read"),
        (tally.not_read(), "file", "that could not be read as a notebook"),
        (tally.outputs_differ, "notebook", "with recorded outputs that are not what was sealed"),
        (tally.notebooks_edited, "notebook", "with cells or modules edited since they were sealed"),
        (tally.justifications_lapsed, "justification", "lapsed"),
        (tally.untested.said.len(), "assumption", "open when its notebook was sealed"),
    ];
    said.into_iter().filter(|(n, ..)| *n > 0).map(|(n, one, words)| format!("{} {words}", counted(n, one))).collect()
}

/// Each saying with the number of notebooks, and the first of them.
fn notes(notes: &Notes) -> Vec<(String, usize, String)> {
    let examples = |files: &[String], all: usize| {
        let more = all - files.len();
        let more = if more > 0 { format!(" and {more} more") } else { String::new() };
        format!("{}{more}", files.join(", "))
    };
    let said = notes.said.iter();
    said.map(|(words, note)| (words.clone(), note.notebooks, examples(&note.examples, note.notebooks))).collect()
}

pub fn not_same(audit: &NotebookAudit, at: &At) -> Vec<Value> {
    if audit.status.exit() == 0 {
        return Vec::new();
    }
    let mut reasons = reasons(audit, at.about.strict_data);
    reasons.extend(audit.seal.iter().flat_map(|seal| seal.contradictions.iter().cloned()));
    reasons.extend(audit.outputs.iter().map(OutputDiffers::words));
    vec![json!({ "file": audit.file, "status": audit.status.word(), "reasons": reasons })]
}

pub fn faults(audit: &NotebookAudit, _at: &At) -> Vec<Value> {
    let fault = |fault| {
        let (words, hint) = fault_words(fault, &audit.file);
        json!({ "file": audit.file, "words": words, "code": fault.fault.code, "hint": hint })
    };
    audit.faults.iter().map(fault).collect()
}

pub fn moves(audit: &NotebookAudit, at: &At) -> Vec<Value> {
    let mut derivations = at.derivations;
    let mut rows = Vec::new();
    for (nth, value) in audit.values.iter().enumerate() {
        let has_steps = !value.steps.is_empty() && derivations < MOST_DERIVATIONS;
        derivations += value.steps.len();
        if is_identical(value) {
            continue;
        }
        let was = value.sealed.as_ref().map(|figure| {
            let (figures, words) = parted(&figure.shown);
            json!({ "figures": figures, "words": words.trim_start_matches(", "), "exact": exact(figure) })
        });
        rows.push(json!({
            "at": nth, "file": audit.file, "label": value.label, "was": was,
            "outcomes": outcomes(value, audit.against), "has_steps": has_steps,
        }));
    }
    rows
}

/// A headline parted into its figures, and the words behind them, which mostly stay the same when the figures move.
fn parted(shown: &str) -> (&str, &str) {
    let words = [", partial (", ", u not stated", ", per ", ", p° ="];
    shown.split_at(words.iter().filter_map(|words| shown.find(words)).min().unwrap_or(shown.len()))
}

fn exact(figure: &Figure) -> String {
    if figure.unit == "1" { figure.value.clone() } else { format!("{} {}", figure.value, figure.unit) }
}

fn outcomes(value: &ValueAudit, against: Against) -> Vec<Value> {
    let all: Vec<(&str, &Outcome)> = match against {
        Against::Seal if value.under_sealed == value.under_today => vec![("both data", &value.under_sealed)],
        Against::Seal => vec![("the sealed data", &value.under_sealed), ("today's data", &value.under_today)],
        _ => vec![("today's data, against its recorded result", &value.under_today)],
    };
    let words = value.sealed.as_ref().map_or("", |figure| parted(&figure.shown).1);
    let said = |(under, outcome): (&str, &Outcome)| {
        let figures = outcome.figure.as_ref().map(|is| is.shown.strip_suffix(words).unwrap_or(&is.shown));
        json!({
            "under": under, "verdict": outcome.verdict.word(), "loud": !outcome.verdict.is_same(),
            "same_figure": outcome.figure.is_some() && outcome.figure == value.sealed,
            "is": figures, "exact": outcome.figure.as_ref().map(exact),
            "moved": outcome.moved.as_ref().map(|moved| &moved.shown),
            "causes": outcome.moved.as_ref().map(causes_words).unwrap_or_default(),
            "parts_at": outcome.moved.as_ref().and_then(|moved| moved.parts_at.as_ref()),
            "notes": outcome.notes,
        })
    };
    all.into_iter().map(said).collect()
}

pub fn steps(audit: &NotebookAudit, at: &At) -> Vec<Value> {
    let mut rows = Vec::new();
    for (nth, value) in audit.values.iter().enumerate() {
        for (which, steps) in value.steps.iter().enumerate() {
            if at.derivations + rows.len() < MOST_DERIVATIONS {
                rows.push(derivation((nth, which), value, steps, &audit.file));
            }
        }
    }
    rows
}

fn derivation((at, which): (usize, usize), value: &ValueAudit, steps: &SideBySide, file: &str) -> Value {
    let mut rows: Vec<Value> = Vec::new();
    let mut left = steps.pairs.as_slice();
    let mut before = 0;
    while let Some(first) = left.first() {
        // What is the same is told in one row, as far as it goes without a gap, so that the eye finds what differs.
        let follows =
            |(nth, pair): &(usize, &StepPair)| pair.is_same() && !pair.parts && pair.number == first.number + nth;
        let same = left.iter().enumerate().take_while(follows).count();
        let gap = first.number > before + 1;
        let (run, rest) = left.split_at(same.max(1));
        before = first.number + run.len() - 1;
        left = rest;
        rows.push(match same {
            0 => json!({
                "gap": gap, "same": false, "number": first.number, "parts": first.parts,
                "then": first.then, "now": first.now,
            }),
            _ => json!({
                "gap": gap, "same": true, "first": first.number, "last": before,
                "steps": run.iter().filter_map(|pair| pair.then.as_ref()).collect::<Vec<_>>(),
            }),
        });
    }
    json!({
        "at": at, "which": which, "label": value.label, "file": file, "under": steps.under,
        "pairs": rows, "left_out": left_out_words(steps),
    })
}

pub fn lapsed(audit: &NotebookAudit, _at: &At) -> Vec<Value> {
    audit.justifications.iter().filter(|one| one.lapsed).map(|one| justification(one, audit)).collect()
}

pub fn in_force(audit: &NotebookAudit, _at: &At) -> Vec<Value> {
    audit.justifications.iter().filter(|one| !one.lapsed).map(|one| justification(one, audit)).collect()
}

fn justification(one: &Justification, audit: &NotebookAudit) -> Value {
    let unit = audit.values.iter().find(|value| value.label == one.label).map_or("", |value| &value.unit);
    json!({
        "file": audit.file, "label": one.label, "id": one.id, "subject": one.subject, "reason": one.reason,
        "lapsed": one.lapsed,
        "author": audit.seal.as_ref().and_then(|seal| seal.author.clone()),
        "sealed": audit.seal.as_ref().map(|seal| seal.sealed.clone()),
        // What stands in an altered seal need not be what its author wrote.
        "altered": audit.seal.as_ref().is_some_and(|seal| !seal.whole),
        "at_signing": price(one.price.as_deref(), unit),
        "sealed_data": price(one.price_sealed_data.as_deref(), unit),
        "today": price(one.price_today.as_deref(), unit),
    })
}

pub fn not_rederived(audit: &NotebookAudit, _at: &At) -> Vec<Value> {
    let partly = audit.from_sources.iter().flatten().filter(|one| !one.is_same() || !one.not_rederived.is_empty());
    let unit = |label: &str| audit.values.iter().find(|value| value.label == label).map_or("", |value| &value.unit);
    partly
        .map(|one| {
            let words = match (&one.value, one.is_same()) {
                (_, true) => "the same, with these steps taken as sealed".to_owned(),
                (Some(_), false) => format!("{}, in {}", one.otherwise_words(), unit(&one.label)),
                (None, false) => one.otherwise_words(),
            };
            json!({
                "file": audit.file, "label": one.label, "words": words, "loud": !one.is_same(),
                "steps": one.not_rederived, "parts_at": one.parts_at,
            })
        })
        .collect()
}

pub fn edited(audit: &NotebookAudit, _at: &At) -> Vec<Value> {
    let edits = edits(audit);
    if edits.is_empty() {
        return Vec::new();
    }
    vec![json!({ "file": audit.file, "edits": edits, "status": audit.status.word() })]
}

pub fn notebooks(audit: &NotebookAudit, _at: &At) -> Vec<Value> {
    let seal = audit.seal.as_ref();
    let verdict = |value: &ValueAudit| match audit.against {
        Against::Seal => value.under_sealed.verdict,
        _ => value.under_today.verdict,
    };
    vec![json!({
        "file": audit.file, "sha256": audit.sha256, "status": audit.status.word(), "loud": audit.status.exit() > 0,
        "against": match audit.against {
            Against::Seal => "seal",
            Against::RecordedOutputs => "recorded results",
            Against::Nothing => "nothing",
        },
        "values": verdict_counts(audit.values.iter().map(verdict)),
        "no_seal": match audit.against {
            Against::Seal => "its seal cannot be read",
            Against::Nothing if audit.status == AuditStatus::CouldNotRun => "not known: the file could not be read",
            _ => "no seal",
        },
        "sealed": seal.map(|seal| seal.sealed.clone()),
        "author": seal.and_then(|seal| seal.author.clone()),
        "draft": seal.is_some_and(|seal| seal.draft),
        "altered": seal.is_some_and(|seal| !seal.whole),
        "signature": seal.map(|seal| format!("{}{}", signature_words(seal), seal.set_words())),
    })]
}
