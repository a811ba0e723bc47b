//! Words that several reports on an archive share.

use std::collections::BTreeMap;

use crate::notebook::verdict::{
    Against, AuditFault, AuditStatus, Cause, Difference, Move, NotebookAudit, SealFacts, SideBySide, Signed,
    ValueAudit, Verdict,
};
use crate::quantity::round::significant;
use crate::units;

/// `1 value`, `3 values`.
pub fn counted(number: usize, one: &str) -> String {
    if number == 1 { format!("1 {one}") } else { format!("{number} {one}s") }
}

/// A figure of a seal with few digits and its unit as people write it: `+0.027 kJ/mol`.
pub fn price(exact: Option<&str>, unit: &str) -> String {
    let Some(exact) = exact else { return "no price".to_owned() };
    let Ok(number) = exact.parse::<f64>() else { return exact.to_owned() };
    let sign = if number > 0.0 { "+" } else { "" };
    let unit = units::parse::unit(unit).map_or_else(|_| unit.to_owned(), |unit| units::reader_text(&unit));
    format!("{sign}{} {unit}", significant(number, 3)).trim_end().to_owned()
}

/// A seal, and what its digest and signature show.
pub fn seal_words(seal: &SealFacts) -> String {
    let author = match &seal.author {
        Some(author) => format!("author as given: {author}"),
        None => "no author given".to_owned(),
    };
    let draft = if seal.draft { ", as a draft" } else { "" };
    let whole = if seal.whole { "" } else { "; ALTERED after it was made: its content is not what its digest says" };
    format!("sealed {}{draft}, {author}{}; {}{whole}", seal.sealed, seal.set_words(), signature_words(seal))
}

/// What is known of a signature, and nothing more.
pub fn signature_words(seal: &SealFacts) -> String {
    match &seal.signed {
        Signed::Not => "not signed".to_owned(),
        Signed::Valid { key, trusted: Some(name) } => format!("signed with the trusted key {name} ({key})"),
        Signed::Valid { key, trusted: None } => format!("signed with the key {key}, which is not among the trusted"),
        Signed::Invalid { key, why } => format!("SIGNATURE with the key {key} DOES NOT HOLD: {why}"),
    }
}

/// `-0.500 kJ/mol, data: formation properties of CO2(g) in atct-1.112`
pub fn cause_words(cause: &Cause) -> String {
    let share = cause.shown.as_deref().unwrap_or("share not known");
    format!("{share}, {}: {}", cause.kind.word(), cause.what)
}

/// The causes of a move, and what they leave of it.
pub fn causes_words(moved: &Move) -> Vec<String> {
    let mut words: Vec<String> = moved.causes.iter().map(cause_words).collect();
    words.push(match (moved.causes.is_empty(), moved.remainder == "0") {
        (true, _) => "no cause can be told".to_owned(),
        (false, true) => "no remainder".to_owned(),
        (false, false) => format!("{}, remainder, not told apart", moved.remainder_shown),
    });
    match (moved.u_of_changed.as_deref(), &moved.u_of_changed_shown) {
        (Some("0"), _) => words.push("the inputs that were revised were stated as exact".to_owned()),
        (_, Some(u)) => words.push(format!("the revised inputs stated {u} as their standard uncertainty")),
        _ => {}
    }
    words
}

/// `2 differ`, as a count of notebooks is said.
pub fn status_words(status: AuditStatus, notebooks: usize) -> String {
    let word = match (status, notebooks) {
        (AuditStatus::Differs, 1) => "differs",
        (AuditStatus::Differs, _) => "differ",
        (AuditStatus::NothingToCompare, 1) => "has nothing to compare with",
        (AuditStatus::NothingToCompare, _) => "have nothing to compare with",
        (status, _) => status.word(),
    };
    format!("{notebooks} {word}")
}

/// A fault of a notebook in one line, and the way out.
pub fn fault_words(fault: &AuditFault, file: &str) -> (String, String) {
    let (under, fault) = (&fault.under, &fault.fault);
    let place = match fault.line {
        0 => fault.cell.clone(),
        line => format!("{}, line {line}", fault.cell),
    };
    // What is wrong with the file itself came up under no data, and its message names the file.
    let words = match (under.as_str(), place == file) {
        ("the file", _) => fault.message.clone(),
        (_, true) => format!("under {under}: {}", fault.message),
        (_, false) => format!("under {under}: {place}: {}", fault.message),
    };
    (words, fault.hint.clone())
}

/// What of a derivation is not listed; empty where all of it is.
pub fn left_out_words(steps: &SideBySide) -> String {
    let same = (steps.same_left_out > 0).then(|| format!("{} that are the same on both sides", steps.same_left_out));
    let others = (steps.others_left_out > 0).then(|| format!("{} that differ", steps.others_left_out));
    let words: Vec<String> = same.into_iter().chain(others).collect();
    if words.is_empty() { String::new() } else { format!("Steps not listed: {}.", words.join(", and ")) }
}

/// What was edited of a notebook: `cell-2, edited`, `cell-4, added`.
pub fn edits(audit: &NotebookAudit) -> Vec<String> {
    let said = |what: &str| what.ends_with(", added") || what.ends_with(", taken away");
    let words = |difference: &Difference| match difference.now.as_str() {
        _ if said(&difference.what) => difference.what.clone(),
        "not there" => format!("{}, not there", difference.what),
        _ => format!("{}, edited", difference.what),
    };
    audit.environment.iter().filter(|difference| difference.is_edit()).map(words).collect()
}

/// `2 moved, 1 missing`: how many values have each of these verdicts, the worst first.
pub fn verdict_counts(verdicts: impl Iterator<Item = Verdict>) -> String {
    let mut counts: BTreeMap<Verdict, usize> = BTreeMap::new();
    verdicts.for_each(|verdict| *counts.entry(verdict).or_default() += 1);
    let words: Vec<String> = counts.into_iter().rev().map(|(verdict, n)| format!("{n} {}", verdict.word())).collect();
    words.join(", ")
}

/// A comparison, and the verdict of a value in it.
type Side = (&'static str, fn(&ValueAudit) -> Verdict);

/// Why a notebook is not the same, the gravest first.
pub fn reasons(audit: &NotebookAudit, strict_data: bool) -> Vec<String> {
    let mut reasons = Vec::new();
    if let Some(fault) = audit.faults.first() {
        reasons.push(fault_words(fault, &audit.file).0);
    }
    reasons.extend(audit.unmet.iter().cloned());
    if let Some(seal) = &audit.seal {
        if !seal.whole {
            reasons.push("its seal was altered after it was made".to_owned());
        }
        if let Signed::Invalid { .. } = seal.signed {
            reasons.push("its signature does not hold".to_owned());
        }
    }
    if !audit.outputs.is_empty() {
        reasons.push(format!("{} not as sealed", counted(audit.outputs.len(), "recorded output")));
    }
    let sides: &[Side] = match (audit.against, strict_data) {
        (Against::Seal, true) => &[
            ("under the sealed data", |value| value.under_sealed.verdict),
            ("under today's data", |value| value.under_today.verdict),
        ],
        (Against::Seal, false) => &[("under the sealed data", |value| value.under_sealed.verdict)],
        _ => &[("against its recorded results", |value| value.under_today.verdict)],
    };
    for (under, verdict) in sides {
        let worse = verdict_counts(audit.values.iter().map(verdict).filter(|verdict| !verdict.is_same()));
        if !worse.is_empty() {
            reasons.push(format!("{under}: {worse}"));
        }
    }
    let derived = || audit.from_sources.iter().flatten().filter(|one| !one.is_same());
    let otherwise = derived().filter(|one| one.value.is_some()).count();
    if otherwise > 0 {
        reasons.push(format!("{} derived again otherwise than sealed", counted(otherwise, "value")));
    }
    let not_at_all = derived().filter(|one| one.value.is_none()).count();
    if not_at_all > 0 {
        reasons.push(format!("{} that could not be derived again", counted(not_at_all, "value")));
    }
    reasons.extend(edits(audit));
    reasons
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn prices_have_few_digits_and_no_basis() {
        assert_eq!(price(Some("0.027123"), "kJ/mol[rxn]"), "+0.0271 kJ/mol");
        assert_eq!(price(Some("-2.0103"), "kJ/mol[rxn]"), "-2.01 kJ/mol");
        assert_eq!(price(None, "kJ/mol"), "no price");
    }
}
