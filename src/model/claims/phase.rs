//! Whether each species is in the phase that is stable at T and its pressure.
//!
//! The surprise: it is judged by Gibbs energies of the shipped phases of the same composition, not by the range of the
//! record, since a record may run on far beyond where its phase is the stable one.

use std::rc::Rc;
use std::sync::Arc;

use super::{Asked, asked, asked_anew};
use crate::chem::species::State as Aggregate;
use crate::data::critical::CriticalTemperature;
use crate::data::dataset::DatasetId;
use crate::data::function::Function;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Call, Cx, Value};
use crate::model::function;
use crate::model::gather;
use crate::model::given::Given;
use crate::model::path;
use crate::model::pressure::{self, Condensed, Matter};
use crate::model::property::{self, Property};
use crate::model::substance::PureSubstance;
use crate::model::terms::Terms;
use crate::quantity::{Quantity, round};
use crate::record::register::{Finding, Tested};
use crate::units::constants::STANDARD_PRESSURE;

/// Condensed phases count as equally stable within this, J/mol. Bound: the source joins phases at a transition with equal
/// Gibbs energies to within 1 J/mol, so nearer than that the order of two phases is rounding.
pub(in crate::model) const RESOLUTION_CONDENSED: f64 = 1.0;

/// The same for a gas beside a condensed phase, J/mol. Bound: the two functions of one substance miss its vapour pressure by up
/// to 13 % at 298.15 K (ethanol, against the Antoine equation of Poling, Prausnitz, O'Connell, 5th ed.), RT ln 1.13.
pub(in crate::model) const RESOLUTION_GAS: f64 = 300.0;

/// `stable-phase`: each species against the other shipped phases of its composition, by Gibbs energy at T and p; a gas
/// above its critical temperature has no liquid to be compared with. Where changes of phase were inserted on the way to T,
/// they are named, and the phase that stands at T is the one compared.
pub fn stable_phase(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let (mut settled, mut stable, mut alone): (Vec<&str>, Vec<&str>, Vec<&str>) = Default::default();
    let (mut how, mut what, mut supercritical): (Vec<String>, Vec<String>, Vec<String>) = Default::default();
    let (mut sources, mut findings) = (Vec::new(), Vec::new());
    let crossings = path::crossings(asked.terms, asked.t_k, cx.data());
    let at_t = |subject: String, tested| Finding::known("stable-phase", subject, value.node(), Some(asked.t_k), tested);
    for (at, term) in asked.terms.terms().iter().enumerate() {
        let id = &*term.substance.species.id;
        let route = crossings.iter().find(|(of, _)| *of == at).map(|(_, route)| route);
        let passed = route.map(|route| format!("{id}: {}, inserted", route.change_words()));
        // A solute has no phase of its own to compare.
        if term.substance.species.phase.state == Aggregate::Aqueous {
            continue;
        }
        // A change of phase is about the change, so what was inserted is all there is to say.
        if is_change_of_phase(asked.terms) {
            settled.extend(passed.is_some().then_some(id));
            how.extend(passed);
            continue;
        }
        let there = route.map_or(&term.substance, |route| &route.last().substance);
        match compared(cx, there, asked.t_k, pressure_of(&asked, there)) {
            Compared::NothingToCompare => {
                alone.push(id);
                what.extend(passed);
                continue;
            }
            Compared::Unstable(other) => {
                let tested = unstable(cx, call, &asked, (&term.substance, there), &other, passed);
                findings.push(at_t(id.to_owned(), tested));
                continue;
            }
            Compared::Supercritical(critical) => {
                supercritical.push(format!("{id} ({} K)", critical.t_k));
                sources.push(critical.citation.clone());
            }
            Compared::Stable => stable.push(there.id()),
        }
        settled.push(id);
        how.extend(passed);
    }
    if !settled.is_empty() {
        if !stable.is_empty() {
            let names = stable.join(", ");
            let at = pressure_in_words(&asked);
            how.push(format!("{names}: lowest Gibbs energy of the shipped phases at {} K and {at}", asked.t_k));
        }
        if !supercritical.is_empty() {
            how.push(format!("{}: above the critical temperature, so no liquid", supercritical.join(", ")));
        }
        let finding = at_t(settled.join(", "), Tested::True { how: how.join("; ") });
        findings.push(Finding { sources, ..finding });
    }
    if !alone.is_empty() {
        let names = alone.join(", ");
        what.push(format!("no other phase of {names} with a function that reaches {} K is shipped", asked.t_k));
        findings.push(at_t(names, Tested::Missing { what: what.join("; ") }));
    }
    findings
}

/// Whether all terms are phases of one substance.
fn is_change_of_phase(terms: &Terms) -> bool {
    let mut entities = terms.terms().iter().map(|term| term.substance.species.entity);
    let first = entities.next();
    terms.terms().len() > 1 && entities.all(|entity| Some(entity) == first)
}

enum Compared {
    NothingToCompare,
    /// A gas above this critical temperature.
    Supercritical(Arc<CriticalTemperature>),
    Stable,
    Unstable(Arc<Substance>),
}

/// The pressure of a species, Pa.
fn pressure_of(asked: &Asked, substance: &Substance) -> f64 {
    asked.method.given.as_ref().map_or(STANDARD_PRESSURE.value, |given| given.pressure_of(&substance.species).0)
}

fn pressure_in_words(asked: &Asked) -> String {
    match asked.method.given.as_ref().map_or(Some(STANDARD_PRESSURE.value), Given::common) {
        Some(p_pa) => format!("{} bar", round::shortest(p_pa / 1e5)),
        None => "its partial pressure".to_owned(),
    }
}

/// The Gibbs energy of a phase by its function, at its pressure: a gas as ideal, a condensed phase by its volume where that is
/// on record.
fn gibbs(cx: &Cx, substance: &Substance, function: &Function, t_k: f64, p_pa: f64) -> f64 {
    let matter = match (&substance.pressure.volume, substance.species.is_gas()) {
        (_, true) => Matter::IdealGas,
        (Some(volume), _) => Matter::Condensed(Condensed::of(volume)),
        (None, _) => Matter::Untouched,
    };
    let departure = pressure::departure(Property::G, &matter, t_k, p_pa, cx.constants().molar_gas.value);
    function::evaluate(function, t_k).g(t_k) + departure.si
}

fn compared(cx: &Cx, substance: &Substance, t_k: f64, p_pa: f64) -> Compared {
    let comparable = |substance: &Substance| {
        substance.function.clone().filter(|function| function.covers(t_k) && function.has_gibbs_energy())
    };
    let Some(own) = comparable(substance) else { return Compared::NothingToCompare };
    let g_own = gibbs(cx, substance, &own, t_k, p_pa);
    let mut compared = Compared::NothingToCompare;
    let mut lowest = g_own;
    for other in cx.data().phases_of(substance) {
        let Some(function) = comparable(&other) else { continue };
        let g = gibbs(cx, &other, &function, t_k, p_pa);
        let gas = other.species.is_gas() || substance.species.is_gas();
        let resolution = if gas { RESOLUTION_GAS } else { RESOLUTION_CONDENSED };
        if g < lowest.min(g_own - resolution) {
            lowest = g;
            compared = Compared::Unstable(other);
        } else if matches!(compared, Compared::NothingToCompare) {
            compared = Compared::Stable;
        }
    }
    match (&compared, &substance.pressure.critical) {
        (Compared::NothingToCompare, Some(critical)) if t_k > critical.t_k => {
            Compared::Supercritical(Arc::clone(critical))
        }
        _ => compared,
    }
}

/// The same property with the stable phase in place of the one written, which at T may have become another one.
fn unstable(
    cx: &Cx,
    call: &Call,
    asked: &Asked,
    (written, there): (&Substance, &Substance),
    stable: &Arc<Substance>,
    passed: Option<String>,
) -> Tested {
    let t_k = asked.t_k;
    let p_pa = pressure_of(asked, there);
    let g = |substance: &Substance| {
        substance.function.as_ref().map_or(f64::NAN, |function| gibbs(cx, substance, function, t_k, p_pa))
    };
    let lower = (g(there) - g(stable)) / 1000.0;
    let conventional = if written.species.is_gas() && asked.method.given.is_none() {
        ", or justify it where a gas at 1 bar is meant by convention"
    } else {
        ""
    };
    let passed = passed.map_or_else(String::new, |passed| format!("{passed}; "));
    let why = format!(
        "{passed}at {t_k} K and {} bar {} has the lower Gibbs energy, by {lower:.1} kJ/mol; write that phase if it is meant{conventional}",
        round::shortest(p_pa / 1e5),
        stable.species.id
    );
    let value = in_phase(cx, call, written, stable).and_then(|call| asked_anew(cx, call)).ok();
    Tested::False { why, value }
}

/// The call with one phase in place of another, and the formation dataset of the value kept, so that the price is that of the
/// phase alone.
fn in_phase(cx: &Cx, call: &Call, written: &Substance, stable: &Arc<Substance>) -> Result<Call, Fault> {
    let mut args = call.args.clone();
    args[0] = match &call.args[0] {
        Value::Reaction(reaction) => Value::Reaction(Rc::new(reaction.with(written.id(), stable, cx.data())?)),
        Value::Substance(_) => Value::Substance(Rc::new(PureSubstance::new(Arc::clone(stable)))),
        other => unreachable!("a property is asked of a reaction or a substance, not of {}", other.sort()),
    };
    let other = Call { card: call.card, args };
    let uses_formation = Property::of(call.card).is_some_and(Property::uses_formation);
    let formation = property::method_of(call, cx)?.formation;
    let used = call.terms().map(|terms| gather::datasets_for(terms, &formation, cx.data()));
    match used {
        Some(Ok(used)) if uses_formation && used.windows(2).all(|pair| pair[0] == pair[1]) => {
            Ok(other.with_option("formation", used.first().map_or("", DatasetId::as_str)))
        }
        _ => Ok(other),
    }
}
