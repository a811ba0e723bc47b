//! Heat capacities of crystals near 298.15 K by adding up atoms: labelled estimates, no more.
//!
//! Cp ≈ Σ n(E) c(E)     (Kopp)          Cp ≈ 3R Σ n(E)     (Dulong and Petit)
//!
//! | symbol | unit      | meaning                                                                        |
//! |--------|-----------|--------------------------------------------------------------------------------|
//! | n(E)   | 1         | atoms of an element in the formula                                             |
//! | c(E)   | J/(mol K) | what an atom brings: C 7.5, H 9.6, B 11.3, Si 15.9, O 16.7, F 20.9, P and S 22.6, all others 25.9 |
//!
//! Good to some ten per cent (common practice, no source). Source: H. Kopp, Phil. Trans. R. Soc. 155, 71 (1865), its calories
//! times 4.184; A. T. Petit, P. L. Dulong, Ann. Chim. Phys. 10, 395 (1819); both from memory.

use std::rc::Rc;

use smallvec::SmallVec;

use crate::chem::composition::Composition;
use crate::chem::formula::Formula;
use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Takes, Value};
use crate::model::molecule::parameter;
use crate::model::property;
use crate::model::solid::claims;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;
use crate::units::{Entity, Kind, What};

/// What an atom brings, J/(mol K), of the elements that bring less than the others.
const LIGHT: [(&str, f64); 8] =
    [("C", 7.5), ("H", 9.6), ("B", 11.3), ("Si", 15.9), ("O", 16.7), ("F", 20.9), ("P", 22.6), ("S", 22.6)];
const OTHERS: f64 = 25.9;

const FORMULA: &[Arg] = &[Arg {
    name: "formula",
    takes: Takes::Text,
    default: Default::Required,
    doc: "a formula, without phase: \"CaCO3\"",
}];
const CLAIMS: &[Claim] = &[Claim { id: "additive-estimate", test: claims::additive_estimate }];

pub static KOPP: Card = Card {
    id: "crystal.kopp",
    name: "kopp",
    on: On::Nothing,
    args: FORMULA,
    gives: "an estimate of Cp near 298.15 K, per mole of the formula",
    doc: "Heat capacity of a crystal by Kopp's rule, each atom bringing its own: an estimate, good to some ten per cent.",
    source: "H. Kopp, Phil. Trans. R. Soc. 155, 71 (1865) (from memory)",
    example: "kopp(\"CaCO3\")",
    claims: CLAIMS,
    alternatives: &[],
    run: kopp,
    check_line: None,
    caution: None,
};

pub static DULONG_PETIT: Card = Card {
    id: "crystal.dulong-petit",
    name: "dulong_petit",
    on: On::Nothing,
    args: FORMULA,
    gives: "an estimate of Cp near 298.15 K, per mole of the formula",
    doc: "Heat capacity of a crystal by the rule of Dulong and Petit, 3R for each atom: an estimate for heavy elements.",
    source: "A. T. Petit, P. L. Dulong, Ann. Chim. Phys. 10, 395 (1819) (from memory)",
    example: "dulong_petit(\"Cu\")",
    claims: CLAIMS,
    alternatives: &[],
    run: |cx, call| {
        let (entity, composition) = read(call)?;
        let atoms: f64 = composition.iter().map(|(_, count)| count.to_f64()).sum();
        let r = property::gas_constant(cx.constants());
        finished(cx, call, entity, 3.0 * atoms * r.si(), SmallVec::from_iter([(Rc::clone(r.node()), 3.0 * atoms)]))
    },
    check_line: None,
    caution: None,
};

fn read(call: &Call) -> Result<(Entity, Composition), Fault> {
    let formula = Formula::parse(call.text(0))?;
    Ok((Entity::named(&formula.reference_name()), formula.composition().clone()))
}

fn finished(
    cx: &Cx,
    call: &Rc<Call>,
    entity: Entity,
    si: f64,
    inputs: SmallVec<[(Rc<Node>, f64); 2]>,
) -> Result<Value, Fault> {
    let (dim, kind) = (parameter::molar_capacity(entity), Kind::of(What::Cp));
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(si, dim, kind, inputs, step, cx.place.clone())?))
}

fn kopp(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (entity, composition) = read(call)?;
    let (mut si, mut inputs) = (0.0, SmallVec::new());
    for (element, count) in composition.iter() {
        let symbol = element.symbol();
        let own = LIGHT.iter().find(|(light, _)| *light == symbol).map_or(OTHERS, |(_, c)| *c);
        let citation = Citation::new(call.card.source, "");
        let key = LeafKey::Own(format!("what an atom of {symbol} brings after Kopp").into());
        let input = Input { digit: Some(0.1), citation: Some(citation), ..Input::of(key) };
        let leaf = Quantity::input(own, parameter::molar_capacity(Entity::OPEN), Kind::PLAIN, input, None)?;
        si += count.to_f64() * own;
        inputs.push((Rc::clone(leaf.node()), count.to_f64()));
    }
    finished(cx, call, entity, si, inputs)
}
