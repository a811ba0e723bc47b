//! What in a seal does not fit the rest of it, or the decisions of its own cells: a printed figure beside its number, a
//! reason beside the one that the cell gives.
//!
//! The surprise: a run on the sealed data tells it. Where it prints the same text for another number, one of the two was
//! changed after sealing.

use crate::notebook::causes::Grounds;
use crate::notebook::comparison::factor_of;
use crate::notebook::seal::{Decision, Seal, SealedValue};
use crate::notebook::sealing::decisions;
use crate::notebook::trial::{Trial, Tried};
use crate::notebook::verdict::{Figure, Outcome, Verdict};
use crate::quantity::round;
use crate::render::report::Record;

/// What of an altered seal contradicts itself.
pub fn contradictions(seal: &Seal, trial: &Trial) -> Vec<String> {
    let both = seal.values.iter().filter_map(|value| Some((&value.record, trial.of_label(&value.record.label)?)));
    both.filter_map(|(record, now)| printed_otherwise(record, now)).collect()
}

fn printed_otherwise(record: &Record, now: &Tried) -> Option<String> {
    let (label, is) = (&record.label, &now.report.record);
    if misprinted(record, now) {
        let u = record.u.as_deref().unwrap_or("not stated");
        let exact = format!("{} {} with u {u}", record.value, record.unit);
        return Some(format!("{label}: the seal has {exact} and prints {}, which is another figure", record.shown));
    }
    let same = record.value == is.value && record.u == is.u && record.unit == is.unit;
    (same && record.shown != is.shown)
        .then(|| format!("{label}: the seal prints {}, and its own figures print as {}", record.shown, is.shown))
}

/// Whether the sealed text is that of the figure now, and the sealed number is another one.
fn misprinted(record: &Record, now: &Tried) -> bool {
    let is = &now.report.record;
    if record.shown != is.shown || record.unit != is.unit {
        return false;
    }
    let number = |text: &str| text.parse::<f64>().ok();
    let last_digit = 2.0 * now.value.shown().half_digit_si / factor_of(&record.unit);
    let apart = number(&record.value).zip(number(&is.value)).is_none_or(|(then, now)| (then - now).abs() > last_digit);
    let printed = |u: &Option<String>| u.as_deref().and_then(number).map(|u| round::fixed(u, round::decimals_for(u)));
    apart || printed(&record.u) != printed(&is.u)
}

/// The sealed figure as it is compared: where its printed text is not that of the number, the number itself.
pub fn figure_compared(figure: Figure, record: &Record, now: Option<&Tried>) -> Figure {
    if !now.is_some_and(|now| misprinted(record, now)) {
        return figure;
    }
    let u = figure.u.as_ref().map_or_else(String::new, |u| format!(", u {u}"));
    let shown = format!("{} {}{u}, printed in the seal as {}", figure.value, figure.unit, figure.shown);
    Figure { shown, ..figure }
}

/// An outcome with what the sealed decisions say otherwise than the cells. Where the row of the register tells of it
/// already, nothing is added.
pub fn with_decisions(mut outcome: Outcome, sealed: &SealedValue, trial: &Trial, grounds: &Grounds) -> Outcome {
    let label = &sealed.record.label;
    let Some(now) = trial.of_label(label) else { return outcome };
    let is = decisions(&trial.dealings, label);
    let meant = |one: &Decision, other: &Decision| one.id == other.id && one.subject == other.subject;
    let word = |one: Option<&Decision>| match one {
        Some(Decision { reason: Some(reason), .. }) => format!("\"{reason}\""),
        Some(Decision { limit: Some(limit), .. }) => format!("tolerated up to {limit}"),
        _ => "no decision".to_owned(),
    };
    for one in &sealed.decisions {
        let here = is.iter().find(|other| meant(one, other));
        let row = |record: &Record| {
            let of = record.assumptions.iter().find(|row| row.id == one.id && row.subject == one.subject);
            of.and_then(|row| row.dealt.clone())
        };
        if here.is_some_and(|here| (&here.reason, &here.limit) == (&one.reason, &one.limit))
            || row(&sealed.record) != row(&now.report.record)
        {
            continue;
        }
        let altered = if grounds.whole { "" } else { ", in a seal that was altered" };
        outcome.notes.push(format!(
            "decision on {} ({}): the seal has {}, the cell {}{altered}",
            one.id,
            one.subject,
            word(Some(one)),
            word(here)
        ));
        outcome.verdict = outcome.verdict.max(Verdict::AssumptionChanged);
    }
    outcome
}
