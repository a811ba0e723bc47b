//! The check line: the figures a value was computed from, in the order a pocket calculator takes them.

use std::rc::Rc;

use crate::model::card::{Cx, Sources, call_of};
use crate::quantity::{Quantity, round};
use crate::record::node::{Node, Operator, Origin};

/// The figures a value was computed from: by its formula's own line, or, for arithmetic and for formulas that hand a value
/// on, the line of each formula that went in, and then the step itself.
pub fn check_line(cx: &Cx, value: &Quantity, sources: &mut Sources) -> String {
    if let Some(line) = own_line(cx, value.node(), sources) {
        return line;
    }
    let node = value.node();
    if node.inputs().is_empty() {
        return String::new();
    }
    let mut names = Vec::new();
    let mut lines = Vec::new();
    for (input, _) in node.inputs().iter().take(MOST_FIGURES) {
        names.push(figure(&Quantity::of_node(Rc::clone(input))));
        if let Some(line) = own_line(cx, input, sources) {
            lines.push(line);
        }
    }
    let more = if node.inputs().len() > MOST_FIGURES { ", …" } else { "" };
    let step = match node.origin() {
        Origin::Operator(operator) => arithmetic(operator, &names),
        Origin::Step(step) => format!("{} of {}{more}", step.name(), names.join(", ")),
        _ => return String::new(),
    };
    lines.push(format!("{step} = {}", figure(value)));
    lines.join("; ")
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

fn arithmetic(operator: &Operator, names: &[String]) -> String {
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

fn own_line(cx: &Cx, node: &Rc<Node>, sources: &mut Sources) -> Option<String> {
    let call = call_of(node)?;
    let line = call.card.check_line?;
    Some(line(cx, call, &Quantity::of_node(Rc::clone(node)), sources))
}
