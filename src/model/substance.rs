//! A pure substance in one phase, asked for its properties per mole of it.
//!
//! H(T) − H(T₁) = ∫Cp dT, from the function's closed form       (zero: the substance itself at T₁)
//!
//! Its enthalpy is counted from the elements at 298.15 K; an increment is counted from the substance itself. The two have
//! different zeros and are kept apart.
//! Source: definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::ops::Deref;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::smallvec;

use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::function::{self, T_REFERENCE};
use crate::model::gather::{self, Figure, GatherError};
use crate::model::property::{self, Property};
use crate::model::terms::{Term, Terms};
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey};
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Kind, State, What, Zero};

/// One phase of a substance, per mole of it.
pub struct PureSubstance {
    terms: Terms,
}

impl PureSubstance {
    pub fn new(substance: Arc<Substance>) -> Self {
        let (per, text) = (substance.species.entity, substance.id().to_owned());
        PureSubstance { terms: Terms::new(vec![Term { substance, nu: 1.0 }], per, text) }
    }

    pub fn record(&self) -> &Arc<Substance> {
        &self.terms.terms()[0].substance
    }
}

impl Deref for PureSubstance {
    type Target = Terms;

    fn deref(&self) -> &Terms {
        &self.terms
    }
}

pub static SUBSTANCE: Card = Card {
    id: "substance.read",
    name: "substance",
    on: On::Nothing,
    args: &[Arg {
        name: "name",
        takes: Takes::Text,
        default: Default::Required,
        doc: "a name with phase, such as \"CO2(g)\" or \"C(cr,graphite)\"",
    }],
    gives: "a substance in one phase",
    doc: "Looks up a substance by its name with phase: formula or name, then (g), (l), (cr), (aq) or a crystal form.",
    source: "IUPAC Green Book, 3rd ed., section 2.10.1 (notation; from memory)",
    example: "substance(\"H2O(l)\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| Ok(Value::Substance(Rc::new(PureSubstance::new(cx.data().find(call.text(0))?)))),
    check_line: None,
};

pub static ENTHALPY_INCREMENT: Card = Card {
    id: "substance.enthalpy-increment",
    name: "enthalpy_increment",
    on: On::Substance,
    args: &[
        Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "end temperature" },
        Arg {
            name: "from",
            takes: Takes::Temperature,
            default: Default::Absent,
            doc: "start temperature; 298.15 K unless given",
        },
    ],
    gives: "H(T) - H(from) per mole of the substance, zero: the substance itself at the start",
    doc: "Enthalpy taken up on heating within one phase, from the function's closed-form integral of Cp.",
    source: "definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory)",
    example: "substance(\"CO2(g)\").enthalpy_increment(\"450 degC\", \"25 degC\")",
    claims: &[],
    alternatives: &[],
    run: increment,
    check_line: None,
};

fn increment(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Value::Substance(substance) = &call.args[0] else {
        unreachable!("{} is asked of a substance", call.card.id);
    };
    let t = call.quantity(1);
    let from = match &call.args[2] {
        Value::Quantity(from) => Some(from),
        _ => None,
    };
    let (t_k, from_k) = (t.si(), from.map_or(T_REFERENCE, Quantity::si));
    let record = substance.record();
    let species = || record.id().to_owned();
    let function = record.function.as_ref().ok_or_else(|| GatherError::NoFunction { species: species(), t_k })?;
    if let Some(outside) = [t_k, from_k].into_iter().find(|t| !function.covers(*t)) {
        let (t_min, t_max) = (function.t_min, function.t_max);
        return Err(GatherError::Range { species: species(), t_k: outside, t_min, t_max }.into());
    }
    let (end, start) = (function::evaluate(function, t_k), function::evaluate(function, from_k));
    let drawn = |h: f64, t_k: f64| Figure {
        si: h,
        input: Input {
            key: LeafKey::Datum {
                dataset: function.dataset.shared(),
                record: record.species.id.clone(),
                field: gather::HEAT_CAPACITY,
                t_bits: t_k.to_bits(),
                way: "integrated from the start",
            },
            u: None,
            digit: Some(1.0),
            label: None,
            citation: Some(function.citation.clone()),
        },
        printed: None,
    };
    let si = end.h - start.h;
    let mut inputs = smallvec![(property::leaf(&drawn(end.h, t_k), Property::H)?, 1.0)];
    if from_k != T_REFERENCE {
        inputs.push((property::leaf(&drawn(start.h, from_k), Property::H)?, -1.0));
    }
    for (temperature, slope) in [(Some(t), end.cp), (from, -start.cp)] {
        // A temperature that states no uncertainty is a condition the analyst chose, not a measurement.
        if let Some(temperature) = temperature.filter(|t| t.spread().u().is_some_and(|u| u > 0.0)) {
            inputs.push((Rc::clone(temperature.node()), slope));
        }
    }
    let p_pa = Some(STANDARD_PRESSURE.value);
    let kind = Kind::in_state(What::H, State { zero: Some(Zero::From(from_k)), t_k: Some(t_k), p_pa, standard: true });
    let dim = property::dimension(Property::H, substance.per());
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(si, dim, kind, inputs, step, cx.place.clone())?))
}
