//! The check line: the figures a value was computed from, in the order a pocket calculator takes them.

use std::rc::Rc;

use crate::model::card::{Cx, Sources, call_of};
use crate::model::gather::{Figure, FigureOrigin};
use crate::quantity::{Quantity, round};
use crate::record::node::{Node, Operator, Origin};
use crate::source::Citation;

/// The figures a value was computed from: by its formula's own line, or, for arithmetic and for formulas that hand a value
/// on, the line of each formula that went in, and then the step itself.
pub fn check_line(cx: &Cx, value: &Quantity, sources: &mut Sources) -> String {
    if let Some(line) = own_line(cx, value.node(), sources) {
        return line;
    }
    let node = value.node();
    let inputs = node.inputs().iter().take(MOST_FIGURES);
    let mut lines: Vec<String> = inputs.filter_map(|(input, _)| own_line(cx, input, sources)).collect();
    let step = step_line(value);
    if step.is_empty() {
        return step;
    }
    lines.push(step);
    lines.join("; ")
}

/// The figures of one step alone, `2 × (-37.5 kJ/mol) = (-75 kJ/mol)`; empty for what is no step of arithmetic and hands no
/// value on.
pub(super) fn step_line(value: &Quantity) -> String {
    let node = value.node();
    if node.inputs().is_empty() {
        return String::new();
    }
    let inputs = node.inputs().iter().take(MOST_FIGURES);
    let names: Vec<String> = inputs.map(|(input, _)| figure(&Quantity::of_node(Rc::clone(input)))).collect();
    let more = if node.inputs().len() > MOST_FIGURES { ", …" } else { "" };
    let step = match node.origin() {
        Origin::Operator(operator) => arithmetic(operator, &names),
        Origin::Step(step) => format!("{} of {}{more}", step.name(), names.join(", ")),
        _ => return String::new(),
    };
    format!("{step} = {}", figure(value))
}

/// A check line is to be followed by hand.
const MOST_FIGURES: usize = 8;

/// A value with its unit, to the digits a calculator needs.
fn figure(value: &Quantity) -> String {
    let unit = value.unit();
    let number = round::shortest(round::significant(unit.from_si(value.si()), 9).parse().unwrap_or(f64::NAN));
    let number = if number.starts_with('-') { format!("({number})") } else { number };
    let unit = crate::units::reader_text(&unit);
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
