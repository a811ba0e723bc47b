//! Adiabatic temperature rise of a batch, with the heat capacity it has at the start.
//!
//! ΔT = −Σ ξ ΔrH(T₀) / Σ n Cp(T₀)       or, of one's own figures,       ΔT = −ΔH/C
//!
//! | symbol   | unit | meaning                                                      |
//! |----------|------|--------------------------------------------------------------|
//! | ξ ΔrH    | J    | heat of the reactions at the temperature of the start        |
//! | Σ n Cp   | J/K  | of what is there at the start                                |
//!
//! The form in which calorimetry states the potential of a batch. Heat capacities change with temperature and with what is
//! formed; the price of holding them is that against the integral. Source: definition of Cp; usual form of the adiabatic
//! temperature rise in process safety (from memory).

use std::rc::Rc;

use smallvec::smallvec;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::caution::Caution;
use crate::model::gather::Method;
use crate::model::plant::adiabatic::{self, CONSTANT_ARG, HEAT_LOSS};
use crate::model::plant::claims;
use crate::model::plant::contents::{Contents, FEEDS, FORMATION, PRESSURE, REACTIONS};
use crate::model::plant::error::PlantError;
use crate::model::plant::tally::{self, Tally};
use crate::quantity::{Quantity, text};
use crate::units::{Base, Dimension, Kind, What};

pub static TEMPERATURE_RISE: Card = Card {
    id: "plant.temperature-rise",
    name: "temperature_rise",
    on: On::Nothing,
    args: &[Arg {
        name: "contents",
        takes: Takes::Options(&[FEEDS, REACTIONS, CONSTANT_ARG, PRESSURE, HEAT_LOSS, FORMATION]),
        default: Default::Required,
        doc: "feeds, all at the temperature of the start, and reactions",
    }],
    gives: "the temperature rise, heat capacity as at the start",
    doc: "Adiabatic temperature rise of a batch: heat of the reactions at the start over the heat capacity of what is there at \
          the start. What the change of the heat capacity costs is priced.",
    source: "definition of Cp; usual form of the adiabatic temperature rise in process safety (from memory)",
    example: "temperature_rise(#{ feeds: [stream(\"charge\", \"25 degC\", #{ \"CO(g)\": \"1 mol\", \"O2(g)\": \"1 mol\", \"N2(g)\": \
              \"20 mol\" })], reactions: [#{ reaction: reaction(\"2 CO(g) + O2(g) -> 2 CO2(g)\") }] })",
    claims: &[
        Claim { id: "constant-heat-capacity", test: claims::constant_heat_capacity },
        Claim { id: "no-heat-loss", test: claims::no_heat_loss },
        Claim { id: "complete-conversion", test: claims::complete_conversion },
        Claim { id: "stable-phase", test: claims::stable_phase },
        Claim { id: "formation-dataset", test: claims::formation_dataset },
        Claim { id: "ideal-gas", test: claims::ideal_gas },
        Claim { id: "condensed-volume-neglected", test: claims::condensed_volume },
        Claim { id: "unmixed", test: claims::unmixed },
    ],
    alternatives: &[],
    run,
    check_line: Some(check_line),
    caution: Some(Caution::TemperatureRise),
};

pub static RISE_OF_FIGURES: Card = Card {
    id: "plant.temperature-rise-of-figures",
    name: "temperature_rise",
    on: On::Nothing,
    args: &[
        Arg {
            name: "enthalpy",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "the change of enthalpy of the contents on reaction, negative where heat is released",
        },
        Arg {
            name: "heat_capacity",
            takes: Takes::AnyQuantity,
            default: Default::Required,
            doc: "the heat capacity of the same contents",
        },
    ],
    gives: "the temperature rise",
    doc: "Adiabatic temperature rise from one's own figures, such as those of a calorimeter: -ΔH/C, both of the same contents.",
    source: "definition of Cp; usual form of the adiabatic temperature rise in process safety (from memory)",
    example: "temperature_rise(\"-215(4) kJ/kg\", \"2.1(1) kJ/(kg K)\")",
    claims: &[
        Claim { id: "constant-heat-capacity", test: claims::constant_figure },
        Claim { id: "no-heat-loss", test: claims::no_heat_loss_of_figures },
    ],
    alternatives: &[],
    run: of_figures,
    check_line: None,
    caution: Some(Caution::TemperatureRise),
};

/// The rise of some contents, made by `call`, with this heat lost.
///
/// # Errors
/// A figure is missing, or the feeds are not at one temperature.
pub fn rise(
    cx: &Cx,
    call: &Rc<Call>,
    contents: &Contents,
    method: &Method,
    loss: Option<&Quantity>,
) -> Result<Quantity, Fault> {
    let energy = adiabatic::energy_of(call, contents)?;
    let start = start(contents)?;
    let mut tally = Tally::new(energy, method, cx);
    tally.add(1.0, &contents.after, start.si(), Some(start))?;
    let at_start = tally.add(-1.0, &contents.fed, start.si(), Some(start))?;
    if let Some(loss) = loss {
        tally.add_value(loss, 1.0);
    }
    let (heat, capacity) = (tally.si, at_start.capacity);
    let si = -heat / capacity;
    // inputs() multiplies all by −1/C; the heat capacity's own derivative is ΔH/C², so it enters with −ΔH/C.
    tally.add_capacity(-heat / capacity, &contents.fed, start)?;
    let inputs = tally.inputs(-1.0 / capacity)?;
    let (dim, kind) = (Dimension::base(Base::Kelvin), Kind::of(What::TemperatureDifference));
    let step = Rc::clone(call);
    Ok(Quantity::from_step(si, dim, kind, inputs, step, cx.place.clone())?)
}

/// The temperature of the start.
///
/// # Errors
/// The feeds have several.
pub fn start(contents: &Contents) -> Result<&Quantity, PlantError> {
    let first = &contents.feeds[0];
    match contents.feeds.iter().find(|feed| feed.t.si() != first.t.si()) {
        None => Ok(&first.t),
        Some(other) => Err(PlantError::SeveralTemperatures {
            first: first.name.to_string(),
            first_k: first.t.si(),
            second: other.name.to_string(),
            second_k: other.t.si(),
        }),
    }
}

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let contents = Contents::read(cx, call, &[])?;
    adiabatic::heat_loss(call, &contents)?;
    Ok(Value::Quantity(rise(cx, call, &contents, &contents.method, None)?))
}

fn of_figures(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (enthalpy, capacity) = (call.quantity(0), call.quantity(1));
    let dim = Dimension::base(Base::Kelvin);
    if enthalpy.dim().over(capacity.dim()) != dim {
        let (enthalpy, capacity) = (enthalpy.unit().text.to_string(), capacity.unit().text.to_string());
        return Err(PlantError::NotARise { enthalpy, capacity }.into());
    }
    let (heat, c) = (enthalpy.si(), capacity.si());
    if c <= 0.0 {
        return Err(PlantError::CapacityNotPositive { given: text::shown_plain(capacity) }.into());
    }
    let inputs = smallvec![(Rc::clone(enthalpy.node()), -1.0 / c), (Rc::clone(capacity.node()), heat / (c * c))];
    let kind = Kind::of(What::TemperatureDifference);
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(-heat / c, dim, kind, inputs, step, cx.place.clone())?))
}

/// `-(-110.527 kJ) / (0.0291 kJ/K) = 3798 K`
fn check_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let figures = || {
        let contents = Contents::read(cx, call, &[]).ok()?;
        let (energy, t_k) = (adiabatic::energy_of(call, &contents).ok()?, start(&contents).ok()?.si());
        let at = |portions| tally::sum(portions, t_k, energy, &contents.method, cx).ok();
        let (after, fed) = (at(&contents.after)?, at(&contents.fed)?);
        let (unit, per) = if contents.per_time { ("kW", "kW/K") } else { ("kJ", "kJ/K") };
        let (heat, capacity) = ((after.si - fed.si) / 1000.0, fed.capacity / 1000.0);
        Some(format!("-({heat:.3} {unit}) / ({capacity:.6} {per}) = {:.3} K", value.si()))
    };
    figures().unwrap_or_default()
}
