//! Tests of what a computed or estimated heat capacity of a crystal leans on: against a published function, or against the same
//! crystal with expansion as recorded.
//!
//! The surprise: there is no better model of the lattice to compute, so where a function of the same crystal is shipped, the
//! whole gap to it is the price of `debye-model`, expansion and all.

use std::rc::Rc;
use std::sync::Arc;

use crate::data::function::Function;
use crate::data::substance::Substance;
use crate::data::transition::{Transition, TransitionKind};
use crate::model::card::{Call, Cx, Value};
use crate::model::function;
use crate::model::molecule::answers::Asked;
use crate::model::molecule::parameter::Parameter;
use crate::model::solid::Expansion;
use crate::model::solid::answers::{self, crystal_of};
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey};
use crate::record::register::{Finding, Tested};
use crate::source::Citation;
use crate::units::{Dimension, Kind, parse as unit_parse};

/// `debye-model`: against the published function of the crystal.
pub fn debye_model(_: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let crystal = crystal_of(call);
    let Some(asked) = Asked::of(call.card) else { return Vec::new() };
    let t_k = call.quantity(1).si();
    let from_k = match call.args.get(2) {
        Some(Value::Quantity(from)) => from.si(),
        _ => function::T_REFERENCE,
    };
    let needed: &[f64] = if asked.needs_start() { &[t_k, from_k] } else { &[t_k] };
    let tested = match reaching(&crystal.substance, needed) {
        Some(_) if asked == Asked::Cv => {
            Tested::Missing { what: "published functions are of Cp; Cv cannot be held against one".to_owned() }
        }
        Some(function) => {
            let at = |t: f64| function::evaluate(function, t);
            let si = match asked {
                Asked::Cp | Asked::Cv => at(t_k).cp,
                Asked::S => at(t_k).s,
                Asked::Increment => at(t_k).h - at(from_k).h,
                Asked::G => at(t_k).h - at(from_k).h - t_k * at(t_k).s,
            };
            better(function, si, t_k, value)
        }
        None => Tested::Missing {
            what: format!("no function of {} that reaches {} K is shipped", crystal.text(), needed[0]),
        },
    };
    vec![Finding::known("debye-model", crystal.text(), value.node(), Some(t_k), tested)]
}

/// `expansion-neglected`: where Cp was taken to be Cv, against the expansion on record, or the estimate from a melting point
/// on record.
pub fn expansion_neglected(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let crystal = crystal_of(call);
    if crystal.expansion.is_some() || Asked::of(call.card) == Some(Asked::Cv) {
        return Vec::new();
    }
    let better = recorded_expansion(&crystal.substance).or_else(|| recorded_melting(cx, &crystal.substance));
    let missing = format!(
        "neither expansivity, compressibility and molar volume of {0} are known nor its melting point",
        crystal.text()
    );
    found(cx, call, "expansion-neglected", value, better, missing)
}

/// `expansion-estimate`: where Cp − Cv was estimated from the melting point, against the expansion on record.
pub fn expansion_estimate(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let crystal = crystal_of(call);
    if !matches!(crystal.expansion, Some(Expansion::Melting(_))) || Asked::of(call.card) == Some(Asked::Cv) {
        return Vec::new();
    }
    let missing = format!("expansivity, compressibility and molar volume of {} are not known", crystal.text());
    found(cx, call, "expansion-estimate", value, recorded_expansion(&crystal.substance), missing)
}

/// One finding, against the crystal expanding as is known.
fn found(
    cx: &Cx,
    call: &Call,
    id: &'static str,
    value: &Quantity,
    known: Option<Known>,
    missing: String,
) -> Vec<Finding> {
    let (tested, sources) = match known {
        Some((expansion, how, citation)) => (expanding(cx, call, expansion, how), vec![citation]),
        None => (Tested::Missing { what: missing }, Vec::new()),
    };
    let finding = Finding::known(id, crystal_of(call).text(), value.node(), Some(call.quantity(1).si()), tested);
    vec![Finding { sources, ..finding }]
}

/// The same call of the crystal expanding otherwise.
fn expanding(cx: &Cx, call: &Call, expansion: Expansion, how: String) -> Tested {
    let mut args = call.args.clone();
    args[0] = Value::Crystal(Rc::new(crystal_of(call).expanding(Some(expansion))));
    match answers::value(cx, &Rc::new(Call { card: call.card, args }), true) {
        Ok(value) => Tested::Better { value: Rc::clone(value.node()), how },
        Err(fault) => Tested::Missing { what: fault.message().to_owned() },
    }
}

/// What is on record, in words, and where it was published.
type Known = (Expansion, String, Citation);

fn recorded_expansion(substance: &Substance) -> Option<Known> {
    let volume = substance.pressure.volume.as_deref()?;
    let parameter = |name: &str, field: &'static str, si: f64, dim: Dimension| -> Option<Parameter> {
        let key = LeafKey::Datum {
            dataset: "pressure-constants".into(),
            record: volume.id.clone(),
            field,
            t_bits: 0,
            way: "",
        };
        let input = Input { citation: Some(volume.citation.clone()), ..Input::of(key) };
        Some(Parameter::of(name, &Quantity::input(si, dim, Kind::PLAIN, input, None).ok()?))
    };
    let (per_k, per_pa) = (unit_parse::unit("K^-1").ok()?.dim, unit_parse::unit("Pa^-1").ok()?.dim);
    let alpha = parameter("expansivity", "expansivity", volume.alpha, per_k)?;
    let kappa = parameter("compressibility", "compressibility", volume.kappa, per_pa)?;
    let v0 = parameter("molar volume", "molar volume", volume.v0, unit_parse::unit("m^3/mol").ok()?.dim)?;
    let how = format!("expansivity, compressibility and molar volume on record of {}", substance.id());
    let measured = Expansion::Measured { alpha, kappa, volume: v0, at_k: volume.t0_k };
    Some((measured, how, volume.citation.clone()))
}

fn recorded_melting(cx: &Cx, substance: &Substance) -> Option<Known> {
    let melts = |transition: &&Arc<Transition>| {
        transition.kind == TransitionKind::Fusion && *transition.from == *substance.id()
    };
    let transition = cx.data().transitions_of(substance).iter().find(melts)?;
    let key = LeafKey::Datum {
        dataset: "transitions".into(),
        record: substance.species.id.clone(),
        field: "melting point",
        t_bits: transition.t_k.to_bits(),
        way: "",
    };
    let input = Input { citation: Some(transition.citation.clone()), ..Input::of(key) };
    let point = Quantity::input(transition.t_k, unit_parse::unit("K").ok()?.dim, Kind::PLAIN, input, None).ok()?;
    let melts = round::shortest(transition.t_k);
    let how = format!("Cp - Cv as Nernst and Lindemann estimate it from the melting point on record, {melts} K");
    Some((Expansion::Melting(Parameter::of("melting point", &point)), how, transition.citation.clone()))
}

/// `additive-estimate`: against the published heat capacity of the crystal at 298.15 K.
pub fn additive_estimate(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let formula = call.text(0);
    let recorded = cx.data().find(&format!("{formula}(cr)")).ok();
    let t_k = function::T_REFERENCE;
    let tested = match recorded.as_ref().and_then(|substance| reaching(substance, &[t_k])) {
        Some(function) => better(function, function::evaluate(function, t_k).cp, t_k, value),
        None => Tested::Missing {
            what: format!("no heat capacity of {formula}(cr) is shipped, or there are several forms"),
        },
    };
    vec![Finding::known("additive-estimate", formula.to_string(), value.node(), Some(t_k), tested)]
}

/// The function of a record that has entropies and reaches all these temperatures.
fn reaching<'a>(substance: &'a Substance, needed: &[f64]) -> Option<&'a Function> {
    let function = substance.function.as_deref()?;
    (function.zero.entropy && needed.iter().all(|t| function.covers(*t))).then_some(function)
}

fn better(function: &Function, si: f64, t_k: f64, value: &Quantity) -> Tested {
    let key = LeafKey::Datum {
        dataset: function.dataset.shared(),
        record: function.id.clone(),
        field: "published function",
        t_bits: t_k.to_bits(),
        way: "",
    };
    let input = Input { citation: Some(function.citation.clone()), ..Input::of(key) };
    match Quantity::input(si, value.dim().clone(), Kind::PLAIN, input, None) {
        Ok(made) => Tested::Better {
            value: Rc::clone(made.node()),
            how: format!(
                "the published function of {} ({}), so the whole gap, whichever approximation it is of",
                function.id, function.citation.source
            ),
        },
        Err(error) => Tested::Missing { what: error.to_string() },
    }
}
