//! Everything that is to be said of a reported value: conditions, check line, assumptions with prices, alternatives, sources.
//!
//! [`review`] is where claims are tested: once per report, over the whole history of the value. What the analyst decided
//! about a row comes in as [`Dealing`]s.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::model::card::{Alternative, Cx, Sources, call_of};
use crate::model::claims;
use crate::model::{caution, check_line, conditions, remedy, tolerance};
use crate::quantity::{Quantity, round};
use crate::record::node::LeafKey;
use crate::record::register::{Finding, Judgement, Reported, Status, Tested, judge};
use crate::record::spread::Spread;
use crate::source::Citation;

/// What an analyst decided about an assumption of one result.
#[derive(Clone, Debug, PartialEq)]
pub struct Dealing {
    pub id: String,
    /// Label of the result it is about.
    pub label: String,
    /// Which of the rows of that id: what it is about.
    pub subject: String,
    /// The cell it was decided in.
    pub cell: String,
    pub decided: Decided,
}

impl Dealing {
    fn is_about(&self, label: &str, finding: &Finding) -> bool {
        self.label == label && self.id == *finding.id && self.subject == finding.subject
    }
}

#[derive(Clone, Debug, PartialEq)]
pub enum Decided {
    /// The value stays as it is, for this reason.
    Justified { reason: String },
    /// The price may be as large as this, in SI units of the result.
    Tolerated { limit_si: f64, written: String },
}

/// One row of the register, at one reported value.
#[derive(Clone, Debug)]
pub struct Row {
    pub id: String,
    pub claim: String,
    pub subject: String,
    /// Where the value that leaned on it was made.
    pub place: Option<String>,
    pub status: Status,
    /// In the result's unit; subtract it to get the better value.
    pub price: Option<f64>,
    /// By first derivative, where the steps between cannot be recomputed.
    pub first_order: bool,
    /// The price is that of u, not of the value.
    pub of_u: bool,
    /// How it was tested, or what is missing, or why it is false.
    pub note: String,
    /// What was decided about it.
    pub dealt: Option<String>,
    /// Whether it needs nothing more: it holds, was justified, or its price is in u. What is untested is open.
    pub answered: bool,
}

/// A shortcut not taken.
#[derive(Clone, Debug)]
pub struct Shortcut {
    pub id: String,
    pub words: String,
    /// Value by the shortcut minus the value, in the result's unit.
    pub price: f64,
}

/// What is to be said of a reported value.
pub struct Review {
    /// The reactions and substances it was computed from, as written.
    pub about: Vec<String>,
    pub conditions: String,
    pub check_line: String,
    pub tolerance: f64,
    /// Half a unit of the last digit the value is shown with, in its unit.
    pub precision: f64,
    pub rows: Vec<Row>,
    pub alternatives: Vec<Shortcut>,
    pub sources: Vec<Citation>,
    /// Fields that state no u, each with the records concerned: `heat capacity` to `CO(g), CO2(g)`.
    pub silent: Vec<(String, Vec<String>)>,
    pub cautions: Vec<String>,
}

/// Reviews a value under the label it is reported with.
pub fn review(cx: &Cx, label: &str, value: &Quantity, dealings: &[Dealing]) -> Review {
    let at = At::of(cx, value);
    let mut sources = Sources::default();
    let check_line = check_line::check_line(cx, value, &mut sources);
    for node in at.reported.history() {
        if let Some(citation) = node.input().and_then(|input| input.citation.as_ref()) {
            sources.number(citation);
        }
    }
    for step in at.reported.history().iter().filter_map(|node| node.step()) {
        sources.number(&Citation::new(step.source(), ""));
    }
    let silent = silent_inputs(value);
    let findings = findings(cx, &at, &silent);
    for citation in findings.iter().flatten().flat_map(|finding| &finding.sources) {
        sources.number(citation);
    }
    Review {
        about: conditions::about(value),
        conditions: conditions::line(cx, value),
        check_line,
        tolerance: at.in_unit(at.tolerance),
        precision: at.half_digit,
        rows: judged_rows(&at, label, dealings, &findings),
        alternatives: alternatives(cx, &at),
        sources: sources.list().to_vec(),
        silent,
        cautions: caution::texts(value),
    }
}

/// A value under review, with what every row needs of it, found once.
struct At<'a> {
    value: &'a Quantity,
    reported: Reported,
    /// The default tolerance, in SI units.
    tolerance: f64,
    /// Half a unit of the last digit shown, in the value's unit.
    half_digit: f64,
    factor: f64,
}

impl<'a> At<'a> {
    fn of(cx: &Cx, value: &'a Quantity) -> Self {
        let reported = Reported::of(value.node());
        let factor = value.unit().factor;
        let tolerance = tolerance::default(value, &reported, cx.constants());
        At { value, reported, tolerance, half_digit: value.shown().half_digit_si / factor, factor }
    }

    fn in_unit(&self, si: f64) -> f64 {
        si / self.factor
    }

    /// A price in the value's unit, with its unit.
    fn shown(&self, price: f64) -> String {
        let unit = crate::units::reader_text(&self.value.unit());
        format!("{} {unit}", signed(self.half_digit, price)).trim_end().to_owned()
    }
}

/// The rows a value rests on, each with its findings, as they stand without a report and without decisions.
pub fn rows(cx: &Cx, value: &Quantity) -> Vec<(Vec<Finding>, Row)> {
    let at = At::of(cx, value);
    findings(cx, &at, &silent_inputs(value))
        .into_iter()
        .map(|group| {
            let judgement = judge(&group, &at.reported, at.tolerance);
            let row = row(&at, &group, judgement, &[]);
            (group, row)
        })
        .collect()
}

fn judged_rows(at: &At, label: &str, dealings: &[Dealing], groups: &[Vec<Finding>]) -> Vec<Row> {
    let mut rows = Vec::new();
    let mut held = 0.0;
    for group in groups {
        let own: Vec<&Dealing> = dealings.iter().filter(|d| group.iter().any(|one| d.is_about(label, one))).collect();
        let judgement = judge(group, &at.reported, limit_of(&own).unwrap_or(at.tolerance));
        let of_u = group.iter().any(|finding| matches!(finding.tested, Tested::Spread { .. }));
        // What was tolerated beyond the default limit is decided about already.
        if judgement.status == Status::Holds && !of_u {
            held += judgement.price.filter(|price| price.abs() <= at.tolerance).unwrap_or(0.0);
        }
        rows.push(row(at, group, judgement, &own));
    }
    let limit = tolerance::together(at.value, at.tolerance);
    if held.abs() > limit {
        let shown = at.shown(at.in_unit(limit));
        let how = format!("the prices of all assumptions that hold, added up, pass {}", shown.trim_start_matches('+'));
        let tested = Tested::Given { price: held, how };
        let group = [Finding::known("together", "all rows that hold", at.value.node(), None, tested)];
        let own: Vec<&Dealing> = dealings.iter().filter(|d| d.is_about(label, &group[0])).collect();
        rows.push(row(at, &group, judge(&group, &at.reported, limit_of(&own).unwrap_or(0.0)), &own));
    }
    rows.sort_by(|a, b| (a.status, &a.id, &a.subject).cmp(&(b.status, &b.id, &b.subject)));
    rows
}

/// The limit an analyst set last.
fn limit_of(dealings: &[&Dealing]) -> Option<f64> {
    dealings.iter().rev().find_map(|dealing| match &dealing.decided {
        Decided::Tolerated { limit_si, .. } => Some(*limit_si),
        Decided::Justified { .. } => None,
    })
}

fn row(at: &At, group: &[Finding], judgement: Judgement, dealings: &[&Dealing]) -> Row {
    let Judgement { status, price, first_order } = judgement;
    let price = price.map(|price| at.in_unit(price));
    let note = |finding: &Finding| match &finding.tested {
        Tested::True { how } | Tested::Given { how, .. } | Tested::Spread { how, .. } => how.clone(),
        Tested::Better { how, .. } => format!("against {how}"),
        Tested::False { why, .. } => why.clone(),
        Tested::Missing { what } => what.clone(),
    };
    let words = |dealing: &&Dealing| match &dealing.decided {
        Decided::Justified { reason } if status == Status::Holds => format!("justified: {reason}"),
        Decided::Justified { reason } => match price {
            Some(price) => format!("justified: {reason}; not corrected: {}", at.shown(price)),
            None => format!("justified: {reason}; not corrected"),
        },
        Decided::Tolerated { written, .. } => format!("tolerated up to {written}"),
    };
    let mut dealt: Vec<String> = dealings.iter().map(words).collect();
    let widened = widened_by(at, group);
    let justified = dealings.iter().any(|dealing| matches!(dealing.decided, Decided::Justified { .. }));
    let answered = status == Status::Holds || justified || widened.is_some();
    dealt.extend(widened);
    let places = listed_once(group.iter().filter_map(|finding| finding.at.place().map(ToString::to_string)));
    Row {
        id: group[0].id.to_string(),
        claim: group[0].claim.to_string(),
        subject: group[0].subject.clone(),
        place: (!places.is_empty()).then_some(places),
        status,
        price,
        first_order,
        of_u: group.iter().any(|finding| matches!(finding.tested, Tested::Spread { .. })),
        note: listed_once(group.iter().map(note)),
        dealt: (!dealt.is_empty()).then(|| dealt.join("; ")),
        answered,
    }
}

/// Texts joined, each once, in the order they come.
fn listed_once(texts: impl Iterator<Item = String>) -> String {
    let mut once: Vec<String> = Vec::new();
    for text in texts {
        if !once.contains(&text) {
            once.push(text);
        }
    }
    once.join("; ")
}

/// Whether the value was widened for an assumption after the step that leaned on it, in words.
fn widened_by(at: &At, group: &[Finding]) -> Option<String> {
    let first = group.iter().map(|finding| finding.at.id()).min()?;
    let later = at.reported.history().iter().filter(|node| node.id() > first);
    let widened =
        later.filter_map(|node| call_of(node)).any(|call| remedy::widens(call, &group[0].id, &group[0].subject));
    widened.then(|| "widened: its price is in u".to_owned())
}

/// A price for people, in the unit of its value: signed, with the digits of the value, and at least two of its own.
/// `half_digit` is half a unit of the last digit that the value is shown with.
pub fn signed(half_digit: f64, price: f64) -> String {
    let of_value = if half_digit > 0.0 { round::decimals_of_digit(2.0 * half_digit) } else { 3 };
    // Two digits of the price itself, or those of the value, but no more than six in all.
    let own = round::decimals_for(price.abs());
    let decimals = if price == 0.0 { 0 } else { of_value.max(own.min(of_value + 2)).min((own + 4).max(0)) };
    let text = round::fixed(price, decimals);
    if price > 0.0 && !text.starts_with('-') && text != "0" { format!("+{text}") } else { text }
}

/// Findings over the whole history, those of one assumption about one subject together: the rows of the register.
fn findings(cx: &Cx, at_value: &At, silent: &[(String, Vec<String>)]) -> Vec<Vec<Finding>> {
    let value = at_value.value;
    let mut at: BTreeMap<(Rc<str>, String), usize> = BTreeMap::new();
    let mut groups: Vec<Vec<Finding>> = Vec::new();
    let mut enter = |finding: Finding| {
        let key = (Rc::clone(&finding.id), finding.subject.clone());
        match at.get(&key) {
            Some(&group) => groups[group].push(finding),
            None => {
                at.insert(key, groups.len());
                groups.push(vec![finding]);
            }
        }
    };
    for node in at_value.reported.history() {
        if let Some(call) = call_of(node) {
            let made = Quantity::of_node(Rc::clone(node));
            let found = call.card.claims.iter().flat_map(|claim| (claim.test)(cx, call, &made));
            // A test of the uncertainty of a value says nothing of that of another one.
            let said = |finding: &Finding| {
                !matches!(finding.tested, Tested::Spread { .. }) || finding.at.id() == value.node().id()
            };
            found.filter(said).for_each(&mut enter);
        }
        if let Some(entity) = node.bound() {
            let what = format!("what the moles are of was not said; taken as {}", entity.name());
            enter(Finding::known("basis-unnamed", entity.name(), node, None, Tested::Missing { what }));
        }
    }
    if let Some((about, tested)) = claims::worst_correlation(value) {
        enter(Finding::known("independent-inputs", about, value.node(), None, tested));
    }
    if !silent.is_empty() {
        let tested = Tested::Missing { what: format!("no u is stated for {}", silent_in_full(silent)) };
        enter(Finding::known("uncertainty-incomplete", silent_words(silent), value.node(), None, tested));
    }
    groups
}

/// What each usual shortcut would have moved the value by, taken in every step that could have taken it.
fn alternatives(cx: &Cx, at: &At) -> Vec<Shortcut> {
    let mut taken: Vec<(&Alternative, BTreeMap<u64, f64>)> = Vec::new();
    for node in at.reported.history() {
        let Some(call) = call_of(node) else { continue };
        let made = Quantity::of_node(Rc::clone(node));
        for alternative in call.card.alternatives {
            let Some(si) = (alternative.value)(cx, call, &made) else { continue };
            match taken.iter_mut().find(|(known, _)| known.id == alternative.id) {
                Some((_, instead)) => {
                    instead.insert(node.id(), si);
                }
                None => taken.push((alternative, BTreeMap::from([(node.id(), si)]))),
            }
        }
    }
    let shortcut = |(alternative, instead): (&Alternative, BTreeMap<u64, f64>)| Shortcut {
        id: alternative.id.to_owned(),
        words: alternative.words.to_owned(),
        // Value by the shortcut minus the value: the price of the value over the shortcut, with its sign turned.
        price: -at.in_unit(at.reported.price(&instead).0),
    };
    taken.into_iter().map(shortcut).collect()
}

/// Inputs that state no u and matter to the value, by field.
pub fn silent_inputs(value: &Quantity) -> Vec<(String, Vec<String>)> {
    let spread = value.spread();
    if matches!(spread, Spread::Full(_)) {
        return Vec::new();
    }
    let mut by_field: BTreeMap<String, Vec<String>> = BTreeMap::new();
    for sensitivity in value.sensitivities() {
        let Some(input) = sensitivity.input().filter(|_| sensitivity.is_silent()) else { continue };
        let (field, record) = match &input.key {
            LeafKey::Datum { record, field, .. } => ((*field).to_owned(), record.to_string()),
            _ => ("typed value".to_owned(), input.name()),
        };
        let records = by_field.entry(field).or_default();
        if !records.contains(&record) {
            records.push(record);
        }
    }
    by_field.into_iter().collect()
}

pub(super) fn plural(field: &str) -> String {
    // "transition enthalpies", "heat capacities", "typed values".
    match field.strip_suffix('y') {
        Some(stem) => format!("{stem}ies"),
        None => format!("{field}s"),
    }
}

/// `heat capacities, entropies`
pub fn silent_words(silent: &[(String, Vec<String>)]) -> String {
    silent.iter().map(|(field, _)| plural(field)).collect::<Vec<_>>().join(", ")
}

fn silent_in_full(silent: &[(String, Vec<String>)]) -> String {
    let one = |(field, records): &(String, Vec<String>)| format!("{} ({})", plural(field), records.join(", "));
    silent.iter().map(one).collect::<Vec<_>>().join(" and ")
}
