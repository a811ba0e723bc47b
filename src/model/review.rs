//! Everything that is to be said of a reported value: conditions, check line, assumptions with prices, alternatives, sources.
//!
//! [`review`] is where claims are tested: once per report, over the whole history of the value. What the analyst decided
//! about a row comes in as [`Dealing`]s.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::model::card::{Cx, Sources, call_of};
use crate::model::{conditions, tolerance};
use crate::quantity::{Quantity, round};
use crate::record::node::{self, LeafKey, Node, Operator, Origin};
use crate::record::register::{Finding, Judgement, Status, Tested, judge, price_of};
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
    /// How it was tested, or what is missing, or why it is false.
    pub note: String,
    /// What was decided about it.
    pub dealt: Option<String>,
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
    pub conditions: String,
    pub check_line: String,
    pub tolerance: f64,
    pub rows: Vec<Row>,
    pub alternatives: Vec<Shortcut>,
    pub sources: Vec<Citation>,
    /// Fields that state no u, each with the records concerned: `heat capacity` to `CO(g), CO2(g)`.
    pub silent: Vec<(String, Vec<String>)>,
    pub cautions: Vec<String>,
}

/// Reviews a value under the label it is reported with.
pub fn review(cx: &Cx, label: &str, value: &Quantity, dealings: &[Dealing]) -> Review {
    let history = node::history(value.node());
    let mut sources = Sources::default();
    let check_line = check_line(cx, value, &mut sources);
    for node in &history {
        if let Some(citation) = node.input().and_then(|input| input.citation.as_ref()) {
            sources.number(citation);
        }
    }
    for step in history.iter().filter_map(|node| node.step()) {
        sources.number(&Citation::new(step.source(), ""));
    }
    let silent = silent_inputs(value);
    let findings = findings(cx, value, &history, &silent);
    for citation in findings.iter().flatten().flat_map(|finding| &finding.sources) {
        sources.number(citation);
    }
    let judged = judged_rows(cx, label, value, dealings, &findings);
    Review {
        conditions: conditions::line(value),
        check_line,
        tolerance: in_unit(value, tolerance::default(value, cx.constants())),
        rows: judged,
        alternatives: alternatives(cx, value, &history),
        sources: sources.list().to_vec(),
        silent,
        cautions: Vec::new(),
    }
}

fn in_unit(value: &Quantity, si: f64) -> f64 {
    si / value.unit().factor
}

fn judged_rows(cx: &Cx, label: &str, value: &Quantity, dealings: &[Dealing], groups: &[Vec<Finding>]) -> Vec<Row> {
    let default = tolerance::default(value, cx.constants());
    let mut rows = Vec::new();
    let mut held = 0.0;
    for group in groups {
        let own: Vec<&Dealing> = dealings.iter().filter(|d| group.iter().any(|one| d.is_about(label, one))).collect();
        let limit = own.iter().rev().find_map(|dealing| match &dealing.decided {
            Decided::Tolerated { limit_si, .. } => Some(*limit_si),
            Decided::Justified { .. } => None,
        });
        let judgement = judge(group, value.node(), limit.unwrap_or(default));
        if judgement.status == Status::Holds {
            held += judgement.price.unwrap_or(0.0);
        }
        rows.push(row(value, group, judgement, &own));
    }
    let limit = tolerance::together(value, default);
    if held.abs() > limit {
        let limit = signed(value, in_unit(value, limit));
        let how = format!("the prices of all assumptions that hold, added up, pass {}", limit.trim_start_matches('+'));
        let tested = Tested::Given { price: held, how };
        let group = [Finding::known("together", "all rows that hold", value.node(), None, tested)];
        let own: Vec<&Dealing> = dealings.iter().filter(|d| d.is_about(label, &group[0])).collect();
        rows.push(row(value, &group, judge(&group, value.node(), 0.0), &own));
    }
    rows.sort_by(|a, b| (a.status, &a.id, &a.subject).cmp(&(b.status, &b.id, &b.subject)));
    rows
}

fn row(value: &Quantity, group: &[Finding], judgement: Judgement, dealings: &[&Dealing]) -> Row {
    let Judgement { status, price, first_order } = judgement;
    let price = price.map(|price| in_unit(value, price));
    let note = |finding: &Finding| match &finding.tested {
        Tested::True { how } | Tested::Given { how, .. } => how.clone(),
        Tested::Better { how, .. } => format!("against {how}"),
        Tested::False { why, .. } => why.clone(),
        Tested::Missing { what } => what.clone(),
    };
    let words = |dealing: &&Dealing| match &dealing.decided {
        Decided::Justified { reason } if status == Status::Holds => format!("justified: {reason}"),
        Decided::Justified { reason } => match price {
            Some(price) => {
                let unit = crate::units::reader_text(&value.unit());
                format!("justified: {reason}; not corrected: {} {unit}", signed(value, price))
            }
            None => format!("justified: {reason}; not corrected"),
        },
        Decided::Tolerated { written, .. } => format!("tolerated up to {written}"),
    };
    let dealt: Vec<String> = dealings.iter().map(words).collect();
    let places = listed_once(group.iter().filter_map(|finding| finding.at.place().map(ToString::to_string)));
    Row {
        id: group[0].id.to_string(),
        claim: group[0].claim.to_string(),
        subject: group[0].subject.clone(),
        place: (!places.is_empty()).then_some(places),
        status,
        price,
        first_order,
        note: listed_once(group.iter().map(note)),
        dealt: (!dealt.is_empty()).then(|| dealt.join("; ")),
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

/// A price for people: signed, with the digits of the value it belongs to, and at least two of its own.
pub fn signed(value: &Quantity, price: f64) -> String {
    let half_digit = in_unit(value, value.shown().half_digit_si);
    let of_value = if half_digit > 0.0 { round::decimals_of_digit(2.0 * half_digit) } else { 3 };
    // Two digits of the price itself, or those of the value, but no more than six in all.
    let own = round::decimals_for(price.abs());
    let decimals = if price == 0.0 { 0 } else { of_value.max(own.min(of_value + 2)).min((own + 4).max(0)) };
    let text = round::fixed(price, decimals);
    if price > 0.0 && !text.starts_with('-') && text != "0" { format!("+{text}") } else { text }
}

/// Findings over the whole history, those of one assumption about one subject together: the rows of the register.
fn findings(cx: &Cx, value: &Quantity, history: &[Rc<Node>], silent: &[(String, Vec<String>)]) -> Vec<Vec<Finding>> {
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
    for node in history {
        if let Some(call) = call_of(node) {
            let made = Quantity::of_node(Rc::clone(node));
            call.card.claims.iter().flat_map(|claim| (claim.test)(cx, call, &made)).for_each(&mut enter);
        }
        if let Some(entity) = node.bound() {
            let what = format!("what the moles are of was not said; taken as {}", entity.name());
            enter(Finding::known("basis-unnamed", entity.name(), node, None, Tested::Missing { what }));
        }
    }
    if !silent.is_empty() {
        let tested = Tested::Missing { what: format!("no u is stated for {}", silent_in_full(silent)) };
        enter(Finding::known("uncertainty-incomplete", silent_words(silent), value.node(), None, tested));
    }
    groups
}

fn alternatives(cx: &Cx, value: &Quantity, history: &[Rc<Node>]) -> Vec<Shortcut> {
    let mut shortcuts: Vec<Shortcut> = Vec::new();
    for node in history {
        let Some(call) = call_of(node) else { continue };
        let made = Quantity::of_node(Rc::clone(node));
        for alternative in call.card.alternatives {
            let Some(si) = (alternative.value)(cx, call, &made) else { continue };
            // Price of the shortcut: value by the shortcut minus the value, so the sign of `price_of` is turned.
            let Some(price) = price_of(value.node(), node, si).0 else { continue };
            let price = -in_unit(value, price);
            match shortcuts.iter_mut().find(|known| known.id == alternative.id) {
                Some(known) => known.price += price,
                None => shortcuts.push(Shortcut {
                    id: alternative.id.to_owned(),
                    words: alternative.words.to_owned(),
                    price,
                }),
            }
        }
    }
    shortcuts
}

/// Inputs that state no u and matter to the value, by field.
pub fn silent_inputs(value: &Quantity) -> Vec<(String, Vec<String>)> {
    let spread = value.spread();
    if matches!(spread, Spread::Full(_)) {
        return Vec::new();
    }
    let mut by_field: BTreeMap<String, Vec<String>> = BTreeMap::new();
    for sensitivity in value.sensitivities() {
        let Some(input) = sensitivity.input().filter(|input| input.u.is_none()) else { continue };
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

fn plural(field: &str) -> String {
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

/// The figures a value was computed from: by its formula's own line, or, for arithmetic, the line of each formula in it.
fn check_line(cx: &Cx, value: &Quantity, sources: &mut Sources) -> String {
    if let Some(line) = own_line(cx, value.node(), sources) {
        return line;
    }
    let Origin::Operator(operator) = value.node().origin() else { return String::new() };
    let mut names = Vec::new();
    let mut lines = Vec::new();
    for (input, _) in value.node().inputs() {
        let number = round::shortest(Quantity::of_node(Rc::clone(input)).unit().from_si(input.si()));
        names.push(if number.starts_with('-') { format!("({number})") } else { number });
        if let Some(line) = own_line(cx, input, sources) {
            lines.push(line);
        }
    }
    let result = round::shortest(Quantity::of_node(Rc::clone(value.node())).unit().from_si(value.si()));
    let symbol = |operator: &Operator| match (operator, &names[..]) {
        (Operator::Add, [a, b]) => format!("{a} + {b}"),
        (Operator::Subtract, [a, b]) => format!("{a} - {b}"),
        (Operator::Multiply, [a, b]) => format!("{a} × {b}"),
        (Operator::Divide, [a, b]) => format!("{a} / {b}"),
        (Operator::Negate, [a]) => format!("-{a}"),
        (Operator::Scale(factor), [a]) => format!("{factor} × {a}"),
        (Operator::Shift(by), [a]) => format!("{a} + {by}"),
        (Operator::Reciprocal(numerator), [a]) => format!("{numerator} / {a}"),
        (Operator::Power(exponent), [a]) => format!("{a} ^ {exponent}"),
        (Operator::Raise, [a, b]) => format!("{a} ^ {b}"),
        (Operator::Exp, [a]) => format!("exp {a}"),
        (Operator::Ln, [a]) => format!("ln {a}"),
        (Operator::Absolute, [a]) => format!("|{a}|"),
        (_, all) => format!("({}) / {}", all.join(" + "), all.len()),
    };
    let own = format!("{} = {result}", symbol(operator));
    if lines.is_empty() { own } else { format!("{}; {own}", lines.join("; ")) }
}

fn own_line(cx: &Cx, node: &Rc<Node>, sources: &mut Sources) -> Option<String> {
    let call = call_of(node)?;
    let line = call.card.check_line?;
    Some(line(cx, call, &Quantity::of_node(Rc::clone(node)), sources))
}
