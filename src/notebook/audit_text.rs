//! An audit as text: what differs first and at length, what is the same counted.

use std::collections::BTreeMap;
use std::fmt::Write as _;

use crate::notebook::verdict::{
    Against, AuditFault, Move, NotebookAudit, Outcome, Rederived, SealFacts, Signed, ValueAudit, Verdict,
};
use crate::render::harmless::in_one_line;

/// One notebook.
pub fn notebook(audit: &NotebookAudit) -> String {
    let mut text = format!("{}: {}\n", in_one_line(&audit.file), audit.status.word());
    match (&audit.seal, audit.against) {
        (Some(seal), _) => line(&mut text, &seal_words(seal)),
        (None, Against::RecordedOutputs) => line(&mut text, "not sealed: compared with the results recorded in it"),
        (None, _) => {}
    }
    for unmet in &audit.unmet {
        line(&mut text, unmet);
    }
    for row in &audit.untested {
        line(&mut text, row);
    }
    for difference in &audit.environment {
        let (then, now) = (short(&difference.sealed), short(&difference.now));
        line(&mut text, &format!("{}: {then} then, {now} now", difference.what));
    }
    for output in &audit.outputs {
        line(&mut text, &output.words());
    }
    for what in audit.seal.iter().flat_map(|seal| &seal.contradictions) {
        line(&mut text, what);
    }
    for fault in &audit.faults {
        line(&mut text, &fault_words(fault, &audit.file));
        line(&mut text, &format!("  try: {}", fault.fault.hint));
    }
    if !audit.values.is_empty() {
        if audit.against == Against::Seal {
            line(&mut text, &counts("under the sealed data", audit.values.iter().map(|one| one.under_sealed.verdict)));
            line(&mut text, &counts("under today's data", audit.values.iter().map(|one| one.under_today.verdict)));
        } else {
            line(&mut text, &counts("compared", audit.values.iter().map(|one| one.under_today.verdict)));
        }
    }
    for cause in summed_causes(audit) {
        line(&mut text, &cause);
    }
    for value in &audit.values {
        text.push_str(&changed(value, audit.against));
    }
    for derived in audit.from_sources.iter() {
        text.push_str(&from_sources(derived));
    }
    for one in audit.justifications.iter().filter(|one| one.lapsed) {
        line(&mut text, &format!("lapsed: {} of {} was justified by \"{}\"", one.id, one.label, one.reason));
    }
    for what in &audit.not_compared {
        line(&mut text, &format!("not compared: {what}"));
    }
    text
}

/// The beginning of a digest, which tells it from others; other texts whole.
pub fn short(digest: &str) -> &str {
    let is_digest = digest.len() == 64 && digest.bytes().all(|byte| byte.is_ascii_hexdigit());
    if is_digest { &digest[..12] } else { digest }
}

/// What came of deriving values again: those that are the same counted, the others one by one.
fn from_sources(all: &[Rederived]) -> String {
    let mut text = String::new();
    let same = |one: &&Rederived| one.is_same();
    let whole = all.iter().filter(same).filter(|one| one.not_rederived.is_empty()).count();
    line(
        &mut text,
        &format!("from sources alone: {whole} of {} values derived again, each step, and the same", all.len()),
    );
    for one in all.iter().filter(|one| !(same(one) && one.not_rederived.is_empty())) {
        let steps = if one.steps == 1 { "1 step".to_owned() } else { format!("{} steps", one.steps) };
        let words = match one.is_same() {
            true => format!("the same, with {} of {steps} taken as sealed", one.not_rederived.len()),
            false => one.otherwise_words(),
        };
        line(&mut text, &format!("  {}: {words}", one.label));
        for step in &one.not_rederived {
            line(&mut text, &format!("    not re-derived: {step}"));
        }
        if let Some(parts_at) = &one.parts_at {
            line(&mut text, &format!("    first differs at {parts_at}"));
        }
    }
    text
}

/// What a revision of data would do to one notebook.
pub fn data_change(audit: &NotebookAudit) -> String {
    let changes = |value: &&ValueAudit| value.under_today.verdict != Verdict::Identical;
    if audit.faults.is_empty() && audit.values.iter().filter(changes).count() == 0 {
        return format!("{}: no value would change\n", in_one_line(&audit.file));
    }
    let mut text = format!("{}\n", in_one_line(&audit.file));
    for fault in &audit.faults {
        line(&mut text, &fault_words(fault, &audit.file));
    }
    summed_causes(audit).iter().for_each(|cause| line(&mut text, cause));
    audit.values.iter().for_each(|value| text.push_str(&changed(value, Against::RecordedOutputs)));
    text
}

/// What is wrong with the file itself came up under no data, and its message names the file.
fn fault_words(AuditFault { under, fault }: &AuditFault, file: &str) -> String {
    match under.as_str() {
        "the file" => fault.message.clone(),
        _ if fault.cell == file => format!("under {under}: {}", fault.message),
        _ => format!("under {under}: {}: {}", fault.cell, fault.message),
    }
}

fn line(text: &mut String, words: &str) {
    let _ = writeln!(text, "  {}", in_one_line(words)); // Writing to a text cannot fail.
}

fn seal_words(seal: &SealFacts) -> String {
    let author = seal.author.as_ref().map_or_else(String::new, |author| format!(" by {author}"));
    let draft = if seal.draft { ", as a draft" } else { "" };
    let whole = if seal.whole { "" } else { "; THE SEAL WAS ALTERED: its content is not what its digest says" };
    let signed = match &seal.signed {
        Signed::Not => "; not signed".to_owned(),
        Signed::Valid { key, trusted: Some(name) } => format!("; signed with the trusted key {name} ({key})"),
        Signed::Valid { key, trusted: None } => format!("; signed with the key {key}, which is not among the trusted"),
        Signed::Invalid { key, why } => format!("; THE SIGNATURE with the key {key} DOES NOT HOLD: {why}"),
    };
    format!("sealed {}{author}{draft}{}{signed}{whole}", seal.sealed, seal.set_words())
}

/// A cause over the values of one notebook.
#[derive(Default)]
struct Summed<'a> {
    values: usize,
    last: &'a str,
    moved: usize,
    /// Whether the last of them is counted among those moved.
    moves: bool,
}

/// Every cause once, with the number of values it moved: what an auditor wants to know first where many values moved.
fn summed_causes(audit: &NotebookAudit) -> Vec<String> {
    // In the order in which they come up, each with its values counted, the last of these, and how many of them it moves:
    // another unit is a change without a move.
    let mut order: Vec<String> = Vec::new();
    let mut causes: BTreeMap<String, Summed> = BTreeMap::new();
    for value in &audit.values {
        let moves = [&value.under_sealed.moved, &value.under_today.moved].into_iter().flatten();
        for cause in moves.flat_map(|moved| &moved.causes) {
            let words = format!("{}: {}", cause.kind.word(), cause.what);
            let summed = causes.entry(words.clone()).or_insert_with(|| {
                order.push(words);
                Summed::default()
            });
            if summed.values == 0 || summed.last != value.label {
                *summed = Summed { values: summed.values + 1, last: &value.label, moved: summed.moved, moves: false };
            }
            if cause.share.as_deref() != Some("0") && !summed.moves {
                (summed.moved, summed.moves) = (summed.moved + 1, true);
            }
        }
    }
    let values = |n: usize| if n == 1 { "1 value".to_owned() } else { format!("{n} values") };
    let words = |cause: String| match &causes[&cause] {
        Summed { moved: 0, values: all, .. } => format!("cause: {cause}; it changes {}, and moves none", values(*all)),
        Summed { moved, .. } => format!("cause: {cause}; it moves {}", values(*moved)),
    };
    order.into_iter().map(words).collect()
}

/// `under the sealed data: 9 identical, 1 moved`
fn counts(under: &str, verdicts: impl Iterator<Item = Verdict>) -> String {
    let verdicts: Vec<Verdict> = verdicts.collect();
    let count = |verdict: Verdict| verdicts.iter().filter(|one| **one == verdict).count();
    let parts: Vec<String> = (Verdict::ALL.into_iter())
        .filter(|verdict| count(*verdict) > 0)
        .map(|verdict| format!("{} {}", count(verdict), verdict.word()))
        .collect();
    format!("{under}: {}", parts.join(", "))
}

/// A value that is not identical under both data; empty for one that is.
fn changed(value: &ValueAudit, against: Against) -> String {
    let mut text = String::new();
    let same = value.under_sealed == value.under_today;
    let outcomes: &[(&str, &Outcome)] = match (against, same) {
        (Against::Seal, true) => &[("under both data", &value.under_sealed)],
        (Against::Seal, false) => {
            &[("under the sealed data", &value.under_sealed), ("under today's data", &value.under_today)]
        }
        _ => &[("now", &value.under_today)],
    };
    for (under, outcome) in outcomes.iter().filter(|(_, outcome)| outcome.verdict != Verdict::Identical) {
        if text.is_empty() {
            line(&mut text, &value.label);
            if let Some(sealed) = &value.sealed {
                line(&mut text, &format!("    was   {}", sealed.shown));
            }
        }
        line(&mut text, &format!("  {under}: {}", outcome.verdict.word()));
        if let Some(figure) = outcome.figure.as_ref().filter(|_| outcome.verdict != Verdict::Missing) {
            line(&mut text, &format!("    is    {}", figure.shown));
        }
        if let Some(moved) = &outcome.moved {
            text.push_str(&move_lines(moved));
        }
        for note in &outcome.notes {
            line(&mut text, &format!("    note  {note}"));
        }
    }
    text
}

fn move_lines(moved: &Move) -> String {
    let mut text = String::new();
    line(&mut text, &format!("    move  {}", moved.shown));
    for cause in &moved.causes {
        let share = cause.shown.clone().unwrap_or_else(|| "?".to_owned());
        line(&mut text, &format!("          {share}  {}: {}", cause.kind.word(), cause.what));
    }
    if !moved.causes.is_empty() && moved.remainder != "0" {
        line(&mut text, &format!("          {}  remainder, not told apart", moved.remainder_shown));
    }
    if let Some(u) = &moved.u_of_changed_shown {
        line(&mut text, &format!("          the revised inputs stated {u} as their standard uncertainty"));
    }
    if let Some(parts_at) = &moved.parts_at {
        line(&mut text, &format!("    at    {parts_at}"));
    }
    text
}
