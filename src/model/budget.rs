//! The uncertainty budget of a value: what each input brings to it (JCGM 100:2008, clauses 5.1, 5.2 and 7.2.7).
//!
//! u²(y) = Σ (cᵢ uᵢ)² + 2 Σ cᵢ uᵢ cⱼ uⱼ rᵢⱼ       share of input i = (cᵢ uᵢ)²/u²(y)
//!
//! | symbol | meaning                                                              |
//! |--------|----------------------------------------------------------------------|
//! | cᵢ     | sensitivity ∂y/∂xᵢ, from the graph                                    |
//! | uᵢ     | standard uncertainty of the input                                    |
//! | rᵢⱼ    | correlation of two inputs; its share is a line of its own, signed     |
//!
//! So that the shares of all lines add up to 1. Inputs that state no uncertainty are listed apart. The budget of an
//! equilibrium constant is that of ln K°. Source: as above.

use std::rc::Rc;
use std::sync::Arc;

use crate::model::answer::{self, Answer};
use crate::model::card::{Card, On, Value};
use crate::quantity::Quantity;
use crate::record::correlation::{self, Pair};
use crate::record::evaluation::Shape;
use crate::record::freedom::{self, Freedom};
use crate::record::node::{LeafKey, Node};
use crate::record::spread::Sensitivity;
use crate::source::Citation;
use crate::units::{Unit, unit_for};

pub static BUDGET: Card = Card {
    id: "uncertainty.budget",
    name: "budget",
    on: On::Quantity,
    args: &[],
    gives: "the uncertainty budget, largest contribution first",
    doc: "Ranks what each input brings to the standard uncertainty, with its sensitivity, its share of the variance and its \
          degrees of freedom; correlations have lines of their own, and inputs that state no uncertainty are listed. \
          Parts: `u`, `dof`, `inputs`.",
    source: "JCGM 100:2008, clauses 5.1, 5.2 and 7.2.7",
    example: "(q(\"9.7(5) nm\") + q(\"25(3) nm, dof=18\")).budget()",
    claims: &[],
    alternatives: &[],
    run: |_, call| {
        let value = call.quantity(0);
        let budget = Budget::of(value, answer::width(call, value, value.spread().u().unwrap_or(0.0))?);
        Ok(Value::Answer(Answer::Budget(Rc::new(budget))))
    },
    check_line: None,
    caution: None,
};

/// One input's line.
pub struct Line {
    pub name: String,
    pub leaf: Rc<Node>,
    /// The unit its value is shown in, and that of its differences.
    pub unit: Arc<Unit>,
    pub difference_unit: Arc<Unit>,
    /// ∂y/∂x, in the output's unit per the input's.
    pub sensitivity: f64,
    /// In `difference_unit`; `None` where none is stated.
    pub u: Option<f64>,
    /// cᵢ uᵢ in the output's unit, signed.
    pub contribution: f64,
    /// (cᵢ uᵢ)²/u²(y); 0 where u(y) is.
    pub share: f64,
    pub dof: Option<f64>,
    pub shape: Shape,
    /// Whether it is a condition that was chosen, so that no uncertainty is missing.
    pub chosen: bool,
    pub source: Origin,
}

/// Where an input's figure comes from.
#[derive(Clone, Debug, PartialEq)]
pub enum Origin {
    Published(Citation),
    /// A place in the notebook, or what brought the input in, in words.
    Here(String),
}

/// What a correlation adds to the variance, or takes from it.
pub struct Correlated {
    pub a: String,
    pub b: String,
    pub r: f64,
    /// 2 cᵢ uᵢ cⱼ uⱼ r/u²(y)
    pub share: f64,
}

/// The budget of one value.
pub struct Budget {
    pub value: Quantity,
    /// The budget is that of the logarithm.
    pub logarithmic: bool,
    /// Unit of the contributions.
    pub unit: Arc<Unit>,
    /// Combined standard uncertainty in `unit`; `None` where no input states one.
    pub u: Option<f64>,
    /// Largest contribution first.
    pub lines: Vec<Line>,
    pub correlated: Vec<Correlated>,
    /// Inputs that state no uncertainty, by name.
    pub silent: Vec<Line>,
    pub freedom: Freedom,
    width: Quantity,
}

impl Budget {
    /// The budget of a value; `width` is its standard uncertainty as a value of its own.
    pub fn of(value: &Quantity, width: Quantity) -> Budget {
        let logarithmic = answer::is_logarithmic(value);
        let unit = answer::difference_unit(value);
        // Contributions to ln K are those to K over K.
        let scale = if logarithmic { value.si() } else { unit.factor };
        let inputs = value.sensitivities();
        let variance = correlation::variance(&inputs);
        let share = |product: f64| if variance > 0.0 { product / variance } else { 0.0 };
        let mut lines: Vec<Line> = inputs.iter().filter_map(|one| line(one, scale, share)).collect();
        let part = |at: usize| inputs[at].part().unwrap_or(0.0);
        let name = |at: usize| inputs[at].input().map_or_else(String::new, |input| input.name());
        let correlated = |Pair { a, b, r }: Pair| Correlated {
            a: name(a),
            b: name(b),
            r,
            share: share(2.0 * r * part(a) * part(b)),
        };
        let correlated = correlation::pairs(&inputs).into_iter().map(correlated).collect();
        lines.sort_by(|a, b| {
            let size = |line: &Line| line.contribution.abs();
            size(b).total_cmp(&size(a)).then_with(|| a.name.cmp(&b.name))
        });
        let (lines, mut silent): (Vec<Line>, Vec<Line>) = lines.into_iter().partition(|line| line.u.is_some());
        silent.sort_by(|a, b| a.name.cmp(&b.name));
        Budget {
            value: value.clone(),
            logarithmic,
            unit,
            u: value.spread().u().map(|u| u / scale),
            // What is exact brings nothing and needs no line.
            lines: lines.into_iter().filter(|line| line.contribution != 0.0).collect(),
            correlated,
            silent,
            freedom: freedom::of(value.node()),
            width,
        }
    }

    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        let dof = match self.freedom {
            Freedom::Effective(dof) => Value::Number(dof),
            Freedom::Unlimited | Freedom::Correlated { .. } => Value::Nothing,
        };
        let entry = |line: &Line| {
            let entries = [
                ("name", Value::Text(line.name.as_str().into())),
                ("contribution", Value::Number(line.contribution)),
                ("share", Value::Number(line.share)),
                ("sensitivity", Value::Number(line.sensitivity)),
                ("u", line.u.map_or(Value::Nothing, Value::Number)),
                ("dof", line.dof.map_or(Value::Nothing, Value::Number)),
            ];
            Value::Options(Rc::new(entries.into_iter().map(|(name, value)| (name.to_owned(), value)).collect()))
        };
        let u = if self.u.is_some() { Value::Quantity(self.width.clone()) } else { Value::Nothing };
        vec![("u", u), ("dof", dof), ("inputs", Value::List(self.lines.iter().map(entry).collect()))]
    }
}

fn line(one: &Sensitivity, scale: f64, share: impl Fn(f64) -> f64) -> Option<Line> {
    let input = one.input()?;
    let unit = input.unit.clone().unwrap_or_else(|| Arc::new(unit_for(one.leaf.dim())));
    let difference_unit = answer::of_differences(&unit);
    let part = one.part().unwrap_or(0.0);
    Some(Line {
        name: input.name(),
        leaf: Rc::clone(&one.leaf),
        sensitivity: one.derivative * difference_unit.factor / scale,
        u: input.u.map(|u| u / difference_unit.factor),
        contribution: part / scale,
        share: share(part * part),
        dof: input.evaluation().dof,
        shape: input.evaluation().shape,
        chosen: one.chosen,
        source: source_of(&one.leaf),
        unit,
        difference_unit,
    })
}

fn source_of(leaf: &Node) -> Origin {
    let Some(input) = leaf.input() else { return Origin::Here(String::new()) };
    Origin::Here(match (&input.citation, &input.key) {
        (Some(citation), _) => return Origin::Published(citation.clone()),
        (None, LeafKey::Typed { place: Some(place), .. }) => place.to_string(),
        (None, LeafKey::Own(_)) => "an assumption, by its price".to_owned(),
        (None, LeafKey::Datum { dataset, .. }) => dataset.to_string(),
        (None, LeafKey::Constant { year, .. }) => format!("CODATA {year}"),
        (None, _) => "typed".to_owned(),
    })
}

#[cfg(test)]
mod tests {
    use smallvec::SmallVec;

    use super::*;
    use crate::quantity::text::parse;
    use crate::record::node::{Input, Origin as NodeOrigin};
    use crate::units::Kind;

    fn own(name: &str, u: f64) -> Quantity {
        let input = Input { u: Some(u), ..Input::of(LeafKey::Own(name.into())) };
        let dim = parse("1 kJ", None, 0).unwrap().dim().clone();
        Quantity::of_node(Rc::new(Node::new(
            0.0,
            dim,
            Kind::PLAIN,
            SmallVec::new(),
            NodeOrigin::Input(Box::new(input)),
            None,
        )))
    }

    #[test]
    fn an_input_named_after_an_assumption_has_its_line_like_any_other() {
        let typed = parse("12.5(3) kJ", None, 1).unwrap();
        let value = typed.plus(&own("no-heat-loss", 400.0), None).unwrap();
        let budget = Budget::of(&value, value.clone());
        let lines: Vec<(&str, f64)> = budget.lines.iter().map(|line| (&*line.name, line.contribution)).collect();
        assert_eq!(lines, [("no-heat-loss", 0.4), ("12.5(3) kJ", 0.3)]);
        assert_eq!(budget.lines[0].source, Origin::Here("an assumption, by its price".to_owned()));
        // (0.4/0.5)² and (0.3/0.5)².
        assert!((budget.lines[0].share - 0.64).abs() < 1e-12 && (budget.lines[1].share - 0.36).abs() < 1e-12);
    }
}
