//! Whether a saturated vapour is ideal, and its liquid small beside it.

use std::rc::Rc;

use super::{asked, asked_anew};
use crate::chem::species::State as Aggregate;
use crate::fault::Fault;
use crate::model::card::{Call, Cx, Value};
use crate::model::given::Given;
use crate::model::pressure::{self, Matter};
use crate::model::property::Property;
use crate::model::terms::Term;
use crate::model::vapour;
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey, Node};
use crate::record::register::{Finding, Tested};
use crate::source::Citation;
use crate::units::Kind;

/// `saturated-vapour-ideal`: against the second virial coefficient of the vapour and the volume of the liquid; untested for
/// what is not on record of them.
pub fn saturated_vapour(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(made) = vapour::clapeyron(cx, call, false) else { return Vec::new() };
    let t_k = call.quantity(1).si();
    let row = |tested| Finding::known("saturated-vapour-ideal", made.substance.id(), value.node(), Some(t_k), tested);
    let missing = || row(Tested::Missing { what: made.lacks.join("; ") });
    if !vapour::asked_ideal(call) {
        return if made.lacks.is_empty() { Vec::new() } else { vec![missing()] };
    }
    if made.gas.is_none() {
        return vec![missing()];
    }
    let mut sources: Vec<_> = made.gas.iter().chain(&made.liquid).filter_map(|at| at.citation.clone()).collect();
    sources.dedup();
    let other = Rc::new(call.with_option("gas", "virial"));
    let tested = match vapour::vaporisation(cx, &other, false) {
        Ok(better) => {
            let liquid = if made.liquid.is_some() { " and the volume of the liquid" } else { "" };
            Tested::Better {
                value: Rc::clone(better.node()),
                how: format!("the second virial coefficient of the vapour{liquid}"),
            }
        }
        Err(fault) => Tested::Missing { what: fault.message().to_owned() },
    };
    vec![Finding { sources, ..row(tested) }]
}

/// `saturated-vapour-ideal` of standard values: H(g) − H(l) of the records is to the ideal gas, and the enthalpy of vaporisation
/// that is measured is to the saturated vapour. Against both phases at the vapour pressure, the vapour by its second virial
/// coefficient, the liquid by its volume. Above the critical temperature there is no such vapour, and no row.
pub fn saturated_leg(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if asked.property != Property::H || asked.method.given.is_some() {
        return Vec::new();
    }
    let terms = asked.terms.terms();
    let liquid_of = |gas: &Term| {
        terms.iter().find(|liquid| {
            liquid.substance.species.phase.state == Aggregate::Liquid
                && liquid.substance.species.entity == gas.substance.species.entity
                && liquid.nu * gas.nu < 0.0
        })
    };
    let below_critical = |gas: &Term| {
        let critical = gas.substance.pressure.critical.as_ref();
        critical.is_none_or(|critical| asked.t_k < critical.t_k)
    };
    let vapours = terms.iter().filter(|term| term.substance.species.is_gas() && below_critical(term));
    let pairs = vapours.filter_map(|gas| Some((gas, liquid_of(gas)?)));
    pairs.map(|(gas, liquid)| leg(cx, call, value, asked.t_k, (gas, liquid), terms.len() == 2)).collect()
}

fn leg(cx: &Cx, call: &Call, value: &Quantity, t_k: f64, (gas, liquid): (&Term, &Term), alone: bool) -> Finding {
    let row = |tested| Finding::known("saturated-vapour-ideal", gas.substance.id(), value.node(), Some(t_k), tested);
    let record = liquid.substance.pressure.vapour.as_ref().filter(|record| record.t_min <= t_k && t_k <= record.t_max);
    let Some(record) = record else {
        let what = format!("no vapour pressure of {} at {t_k} K is on record", liquid.substance.id());
        return row(Tested::Missing { what });
    };
    let (p_pa, r) = (math::exp(vapour::ln_p(&record.form, t_k)[0]), cx.constants().molar_gas.value);
    let given = Given { virial: true, volumes: true, ..Given::standard() };
    let (mut price, mut lacking, mut sources) = (0.0, Vec::new(), vec![record.citation.clone()]);
    for term in [gas, liquid] {
        let Ok(at) = pressure::resolve(&term.substance, t_k, &given, r) else { continue };
        match &at.lacks {
            Some(why) => lacking.push(format!("{}: {why}", term.substance.id())),
            None => price -= term.nu * pressure::departure(Property::H, &at.matter, t_k, p_pa, r).si,
        }
        sources.extend(at.citation);
    }
    if !lacking.is_empty() {
        return row(Tested::Missing { what: lacking.join("; ") });
    }
    let bar = round::significant(p_pa / 1e5, 4);
    let how = format!("both phases at the vapour pressure, {bar} bar, the vapour by its second virial coefficient");
    let tested = match alone.then(|| at_saturation(cx, call, liquid, t_k, p_pa, &record.citation)) {
        Some(Ok(value)) => Tested::Better { value, how },
        // Other species of the reaction stay where they are, so the pair is priced alone.
        _ => Tested::Given { price, how: format!("against {how}") },
    };
    Finding { sources, ..row(tested) }
}

/// The same property with both phases at the vapour pressure.
fn at_saturation(
    cx: &Cx,
    call: &Call,
    liquid: &Term,
    t_k: f64,
    p_pa: f64,
    citation: &Citation,
) -> Result<Rc<Node>, Fault> {
    let key = LeafKey::Own(format!("vapour pressure of {} at {t_k} K", liquid.substance.id()).into());
    let input = Input { citation: Some(citation.clone()), ..Input::of(key) };
    let p = Quantity::input(p_pa, pressure::pressure_dim(), Kind::PLAIN, input, None)?;
    asked_anew(cx, call.with_option("gas", "virial").with_given("pressure", Value::Quantity(p)))
}

/// `second-virial` at saturation: broken where |B|p/RT passes 0.15.
pub fn saturated_virial(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    if vapour::asked_ideal(call) {
        return Vec::new();
    }
    let Ok(made) = vapour::clapeyron(cx, call, false) else { return Vec::new() };
    let t_k = call.quantity(1).si();
    let Some(Matter::Virial(b)) = made.gas.as_ref().map(|at| at.matter) else { return Vec::new() };
    let share = (b[0] * made.p[0] / (cx.constants().molar_gas.value * t_k)).abs();
    let words = format!("|B|p/RT is {} at the vapour pressure", round::significant(share, 2));
    let tested = if share > super::pressure::DENSE {
        Tested::False { why: format!("{words}, too dense for the virial route"), value: None }
    } else {
        Tested::True { how: words }
    };
    vec![Finding::known("second-virial", made.substance.id(), value.node(), Some(t_k), tested)]
}
