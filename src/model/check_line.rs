//! The check line: the figures a value was computed from, in the order a pocket calculator takes them.

use std::rc::Rc;

use crate::model::basis::PER;
use crate::model::card::{Cx, Sources, call_of};
use crate::model::gather::{Figure, FigureOrigin};
use crate::model::quantities::ASSUME;
use crate::quantity::{Quantity, round};
use crate::record::node::{Node, Operator, Origin};
use crate::source::Citation;
use crate::units::Unit;

/// The figures a value was computed from: by its formula's own line, or, for arithmetic and for formulas that hand a value
/// on, the line of each formula that went in, and then the step itself.
pub fn check_line(cx: &Cx, value: &Quantity, sources: &mut Sources) -> String {
    let node = calculated(value.node());
    if let Some(line) = own_line(cx, node, sources) {
        return line;
    }
    let mut lines = Vec::new();
    for (input, _) in node.inputs().iter().take(MOST_FIGURES) {
        before(cx, input, sources, &mut lines);
    }
    let step = step_of(node, value);
    if step.is_empty() {
        return step;
    }
    lines.push(step);
    lines.join("; ")
}

/// Lines of the formula behind an input, and of its change of basis, if that is all that came between.
fn before(cx: &Cx, input: &Rc<Node>, sources: &mut Sources, lines: &mut Vec<String>) {
    let node = calculated(input);
    if let Some(line) = own_line(cx, node, sources) {
        lines.push(line);
    } else if is_per(node) {
        node.inputs().iter().for_each(|(whole, _)| before(cx, whole, sources, lines));
        lines.push(step_of(node, &Quantity::of_node(Rc::clone(node))));
    }
}

/// The node that computed a value, past those that hand it on as it is: an assumption attached, a mole named.
fn calculated(mut node: &Rc<Node>) -> &Rc<Node> {
    while let [(input, 1.0)] = node.inputs()
        && input.si() == node.si()
        && (matches!(node.origin(), Origin::Operator(Operator::Scale(_)))
            || call_of(node).is_some_and(|call| call.card.id == ASSUME.id))
    {
        node = input;
    }
    node
}

fn is_per(node: &Node) -> bool {
    call_of(node).is_some_and(|call| call.card.id == PER.id)
}

/// The figures of one step alone, `2 × (-37.5 kJ/mol) = (-75 kJ/mol)`; empty for what is no step of arithmetic and hands no
/// value on.
pub(super) fn step_line(value: &Quantity) -> String {
    step_of(value.node(), value)
}

/// The step that a node is, with the value as it is shown.
fn step_of(node: &Rc<Node>, value: &Quantity) -> String {
    if node.inputs().is_empty() {
        return String::new();
    }
    let inputs = node.inputs().iter().take(MOST_FIGURES);
    let names: Vec<String> = inputs.map(|(input, _)| figure(&Quantity::of_node(Rc::clone(input)))).collect();
    let more = if node.inputs().len() > MOST_FIGURES { ", …" } else { "" };
    let step = match node.origin() {
        Origin::Operator(operator) => arithmetic(operator, &names),
        Origin::Step(_) if is_per(node) => per_line(node, value, &names.join(", ")),
        Origin::Step(step) => format!("{} of {}{more}", step.name(), names.join(", ")),
        _ => return String::new(),
    };
    format!("{step} = {}", figure(value))
}

/// What `per` did, `(-99.05) kJ/mol / 3`; where the result is shown in another unit, with the result in the old one.
fn per_line(node: &Node, value: &Quantity, whole: &str) -> String {
    let [(input, factor)] = node.inputs() else { return whole.to_owned() };
    let number = round::shortest(round::significant(1.0 / factor, 9).parse().unwrap_or(f64::NAN));
    let unit = Quantity::of_node(Rc::clone(input)).unit();
    let divided = format!("{whole} / {number}");
    if unit.factor == value.unit().factor { divided } else { format!("{divided} = {}", figure_in(value.si(), &unit)) }
}

/// A check line is to be followed by hand.
const MOST_FIGURES: usize = 8;

/// A value with its unit, to the digits a calculator needs.
fn figure(value: &Quantity) -> String {
    figure_in(value.si(), &value.unit())
}

fn figure_in(si: f64, unit: &Unit) -> String {
    let number = round::shortest(round::significant(unit.from_si(si), 9).parse().unwrap_or(f64::NAN));
    let number = if number.starts_with('-') { format!("({number})") } else { number };
    let unit = crate::units::reader_text(unit);
    if unit.is_empty() { number } else { format!("{number} {unit}") }
}

/// An operation on named operands, as it is written.
pub fn arithmetic(operator: &Operator, names: &[String]) -> String {
    match (operator, names) {
        (Operator::Add, [a, b]) => format!("{a} + {b}"),
        (Operator::Subtract, [a, b]) => format!("{a} - {b}"),
        (Operator::Multiply, [a, b]) => format!("{a} × {b}"),
        (Operator::Divide, [a, b]) => format!("({a}) / ({b})"),
        (Operator::Negate, [a]) => format!("-{a}"),
        (Operator::Scale(factor), [a]) => format!("{factor} × {a}"),
        (Operator::Shift(by), [a]) => format!("{a} + {by}"),
        (Operator::DivideBy(divisor), [a]) => format!("({a}) / {divisor}"),
        (Operator::PowerOf, [a, b]) => format!("({a}) ^ ({b})"),
        (Operator::Reciprocal(numerator), [a]) => format!("{numerator} / ({a})"),
        (Operator::Power(exponent), [a]) => format!("({a}) ^ {exponent}"),
        (Operator::Exp, [a]) => format!("exp {a}"),
        (Operator::Ln, [a]) => format!("ln {a}"),
        (Operator::Sin, [a]) => format!("sin {a}"),
        (Operator::Cos, [a]) => format!("cos {a}"),
        (Operator::Tan, [a]) => format!("tan {a}"),
        (Operator::Condition, [a]) => a.clone(),
        (Operator::Absolute, [a]) => format!("|{a}|"),
        (_, all) => format!("({}) / {}", all.join(" + "), all.len()),
    }
}

/// The line of the formula that made a node, where it has one.
pub(super) fn own_line(cx: &Cx, node: &Rc<Node>, sources: &mut Sources) -> Option<String> {
    let call = call_of(node)?;
    let line = call.card.check_line?;
    Some(line(cx, call, &Quantity::of_node(Rc::clone(node)), sources))
}

/// Joules as a check line has them.
pub(super) fn kilo(si: f64) -> String {
    format!("{:.3}", si / 1000.0)
}

/// `(-110.53)[1]`, or of a figure that is a sum of inputs, as over changes of phase, `(25.408[2] + 0.900[3] + 4.086[4])`.
pub(super) fn figures_of(figure: &Figure, sources: &mut Sources, show: &impl Fn(f64) -> String) -> String {
    let mut cited = |shown: String, citation: Option<&Citation>| {
        let source = citation.map_or_else(String::new, |c| format!("[{}]", sources.number(c)));
        if shown.starts_with('-') { format!("({shown}){source}") } else { format!("{shown}{source}") }
    };
    if let FigureOrigin::Nodes(nodes) = &figure.origin {
        let inputs =
            nodes.iter().map(|(node, slope)| node.input().filter(|_| *slope == 1.0).map(|input| (node, input)));
        let inputs: Option<Vec<_>> = inputs.collect();
        if let Some(inputs) = inputs.filter(|inputs| !inputs.is_empty()) {
            let parts = inputs.iter().map(|(node, input)| cited(show(node.si()), input.citation.as_ref()));
            let sum = parts.collect::<Vec<_>>().join(" + ");
            return if inputs.len() == 1 { sum } else { format!("({sum})") };
        }
    }
    let written = figure.printed.as_ref().map_or_else(|| show(figure.si), ToString::to_string);
    cited(written, figure.citation())
}
