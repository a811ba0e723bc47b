//! The temperature that contents reach without exchange of heat, at constant pressure or constant volume.
//!
//! Σ n H(T) after = Σ n H of the feeds [− heat lost]        at constant volume with U = H − R T of gases in place of H
//!
//! | symbol | unit         | meaning                                                              |
//! |--------|--------------|----------------------------------------------------------------------|
//! | T      | K            | where the balance closes, found by a bracketed root                  |
//! | n      | mol or mol/s | of what was fed, and of what is there after the reactions            |
//! | H(T)   | J/mol        | counted from the elements at 298.15 K, one dataset                   |
//!
//! Derivatives by the implicit function: ∂T/∂x = −(∂F/∂x)/(Σ n Cp), F the difference of both sides. Without reactions it is
//! the temperature of mixing. Source: first law (from memory); definition of Cp.

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::caution::Caution;
use crate::model::gather::Method;
use crate::model::path::Route;
use crate::model::plant::balance::energy;
use crate::model::plant::claims;
use crate::model::plant::contents::{self, Contents, FEEDS, FORMATION, PRESSURE, REACTIONS};
use crate::model::plant::error::PlantError;
use crate::model::plant::stream::Portion;
use crate::model::plant::tally::{self, Energy, Sum, Tally};
use crate::num::root;
use crate::quantity::Quantity;
use crate::units::{Base, Dimension, Kind, What};

/// What is held constant, in words.
pub const CONSTANT: &[&str] = &["pressure", "volume"];

pub(super) const CONSTANT_ARG: Arg = Arg {
    name: "constant",
    takes: Takes::Word(CONSTANT),
    default: Default::Absent,
    doc: "what is held constant: the pressure unless given; the volume of a closed vessel, gases ideal",
};

pub(super) const HEAT_LOSS: Arg = Arg {
    name: "heat_loss",
    takes: Takes::AnyQuantity,
    default: Default::Absent,
    doc: "an estimate of the heat lost, to price `no-heat-loss`; the value stays adiabatic",
};

pub static ADIABATIC_TEMPERATURE: Card = Card {
    id: "plant.adiabatic-temperature",
    name: "adiabatic_temperature",
    on: On::Nothing,
    args: &[Arg {
        name: "contents",
        takes: Takes::Options(&[FEEDS, REACTIONS, CONSTANT_ARG, PRESSURE, HEAT_LOSS, FORMATION]),
        default: Default::Required,
        doc: "feeds, and reactions if any",
    }],
    gives: "the temperature at which the balance closes",
    doc: "The temperature that contents reach after the reactions without exchange of heat; without reactions that of \
          mixing. Whether dissociation matters there is tested and priced.",
    source: "first law (from memory); definition of Cp",
    example: "adiabatic_temperature(#{ feeds: [stream(\"gas\", \"25 degC\", #{ \"CO(g)\": \"1 mol\", \"O2(g)\": \"2 mol\" })], \
              reactions: [#{ reaction: reaction(\"2 CO(g) + O2(g) -> 2 CO2(g)\") }] })",
    claims: &[
        Claim { id: "no-heat-loss", test: claims::no_heat_loss },
        Claim { id: "no-dissociation", test: claims::no_dissociation },
        Claim { id: "complete-conversion", test: claims::complete_conversion },
        Claim { id: "stable-phase", test: claims::stable_phase },
        Claim { id: "formation-dataset", test: claims::formation_dataset },
        Claim { id: "ideal-gas", test: claims::ideal_gas },
        Claim { id: "condensed-volume-neglected", test: claims::condensed_volume },
        Claim { id: "unmixed", test: claims::unmixed },
    ],
    alternatives: claims::SHORTCUTS,
    run,
    check_line: Some(check_line),
    caution: Some(Caution::AdiabaticTemperature),
};

/// The temperature may be off by this, K, before the balance counts as not closed: a phase change lies there.
const CLOSED_K: f64 = 1e-6;

/// What is held constant in a call.
///
/// # Errors
/// A flow at constant volume.
pub fn energy_of(call: &Call, contents: &Contents) -> Result<Energy, PlantError> {
    if call.option("constant").is_none_or(|word| &**word != "volume") {
        return Ok(Energy::H);
    }
    match contents.feeds.first() {
        Some(feed) if contents.per_time => Err(PlantError::FlowAtConstantVolume { stream: feed.name.to_string() }),
        _ => Ok(Energy::U),
    }
}

/// The heat loss a call estimates, as a number; 0 where it gives none.
///
/// # Errors
/// It is no energy, or no power where amounts are flows.
pub fn heat_loss<'a>(call: &'a Call, contents: &Contents) -> Result<Option<&'a Quantity>, PlantError> {
    let Some(loss) = contents::quantity(call, "heat_loss") else { return Ok(None) };
    if *loss.dim() == energy(contents.per_time) {
        return Ok(Some(loss));
    }
    let given = loss.unit().text.to_string();
    Err(PlantError::HeatLoss { given, feeds: contents::sort(contents.per_time) })
}

/// The temperatures that the data of all portions cover, with the species that ends them on either side.
///
/// # Errors
/// A species has no heat capacity.
pub fn common_range(cx: &Cx, portions: &[Portion]) -> Result<[(f64, String); 2], PlantError> {
    let (mut low, mut high) = ((0.0_f64, String::new()), (f64::INFINITY, String::new()));
    for portion in portions {
        let species = portion.id().to_owned();
        let (t_min, t_max) = match (&portion.term.own, &portion.term.substance.function) {
            (Some(own), _) => own.range_k(),
            (None, Some(function)) => (function.t_min, reach(cx, portion, function.t_max)),
            (None, None) => return Err(PlantError::NoCapacity { species }),
        };
        if t_min > low.0 {
            low = (t_min, species.clone());
        }
        if t_max < high.0 {
            high = (t_max, species);
        }
    }
    Ok([low, high])
}

/// The highest temperature that a substance's data reach, through recorded changes of phase.
fn reach(cx: &Cx, portion: &Portion, t_max: f64) -> f64 {
    let mut high = t_max;
    while let Ok(route) = Route::to(&portion.term.substance, high + 1e-3, cx.data()) {
        let further = route.last().function.t_max;
        if further <= high {
            break;
        }
        high = further;
    }
    high
}

/// Σ n h of the feeds, J or W.
///
/// # Errors
/// A figure is missing, or a temperature is outside the data.
pub fn fed(cx: &Cx, contents: &Contents, energy: Energy, method: &Method) -> Result<f64, Fault> {
    let mut fed = 0.0;
    for feed in &contents.feeds {
        fed += tally::sum(&feed.portions, feed.t.si(), energy, method, cx)?.si;
    }
    Ok(fed)
}

/// Where Σ n h of what is there, by `after`, meets `target`.
///
/// # Errors
/// It does not within the common range of the portions, or within a phase change.
pub fn closing(
    cx: &Cx,
    portions: &[Portion],
    target: f64,
    mut after: impl FnMut(f64) -> Result<Sum, Fault>,
) -> Result<f64, Fault> {
    let [(low, low_of), (high, high_of)] = common_range(cx, portions)?;
    let found = root::bracketed(|t_k| Ok::<f64, Fault>(after(t_k)?.si - target), low, high, 0.0)?;
    match found {
        Ok(root) => {
            let capacity = after(root.x)?.capacity;
            if root.residual.abs() > capacity * CLOSED_K {
                return Err(PlantError::WithinTransition { t_k: root.x }.into());
            }
            Ok(root.x)
        }
        Err(ends) => {
            let below = ends.at_low > 0.0;
            let (side, t_k, species) = if below { ("below", low, low_of) } else { ("above", high, high_of) };
            Err(PlantError::BeyondData { side, t_k, species }.into())
        }
    }
}

/// The adiabatic temperature of contents, made by `call`, with this heat lost.
///
/// # Errors
/// A figure is missing, or the balance does not close within the data.
pub fn temperature(
    cx: &Cx,
    call: &Rc<Call>,
    contents: &Contents,
    method: &Method,
    loss: Option<&Quantity>,
) -> Result<Quantity, Fault> {
    let energy = energy_of(call, contents)?;
    let target = fed(cx, contents, energy, method)? - loss.map_or(0.0, Quantity::si);
    let after = |t_k| tally::sum(&contents.after, t_k, energy, method, cx);
    let t_k = closing(cx, &contents.after, target, after)?;
    let mut tally = Tally::new(energy, method, cx);
    let at_end = tally.add(1.0, &contents.after, t_k, None)?;
    for feed in &contents.feeds {
        tally.add(-1.0, &feed.portions, feed.t.si(), Some(&feed.t))?;
    }
    if let Some(loss) = loss {
        tally.add_value(loss, 1.0);
    }
    point(cx, call, t_k, &tally, at_end.capacity)
}

/// A temperature at which a tally closes.
///
/// # Errors
/// A figure is not finite.
pub fn point(cx: &Cx, call: &Rc<Call>, t_k: f64, tally: &Tally, capacity: f64) -> Result<Quantity, Fault> {
    let inputs = tally.inputs(-1.0 / capacity)?;
    let (dim, kind) = (Dimension::base(Base::Kelvin), Kind::of(What::TemperaturePoint));
    let step = Rc::clone(call);
    Ok(Quantity::from_step(t_k, dim, kind, inputs, step, cx.place.clone())?)
}

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let contents = Contents::read(cx, call, &[])?;
    heat_loss(call, &contents)?;
    Ok(Value::Quantity(temperature(cx, call, &contents, &contents.method, None)?))
}

/// `Σ n H fed = -110.527 kJ; Σ n H after = -110.527 kJ at 2573.8 K, where Σ n Cp = 0.083 kJ/K`
fn check_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let figures = || {
        let contents = Contents::read(cx, call, &[]).ok()?;
        let energy = energy_of(call, &contents).ok()?;
        let fed = fed(cx, &contents, energy, &contents.method).ok()?;
        let after = tally::sum(&contents.after, value.si(), energy, &contents.method, cx).ok()?;
        let (unit, per) = if contents.per_time { ("kW", "kW/K") } else { ("kJ", "kJ/K") };
        let (h, cp) = if energy == Energy::H { ("H", "Cp") } else { ("U", "Cv") };
        Some(format!(
            "Σ n {h} fed = {:.3} {unit}; Σ n {h} after = {:.3} {unit} at {:.2} K, where Σ n {cp} = {:.4} {per}",
            fed / 1000.0,
            after.si / 1000.0,
            value.si(),
            after.capacity / 1000.0
        ))
    };
    figures().unwrap_or_default()
}
