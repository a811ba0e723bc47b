//! Heat duty of what is fed, reacts and leaves, each stream at its own temperature.
//!
//! Q = Σ n H(T) of all that leaves − Σ n H(T) of all that is fed       H(T) = ΔfH°(298.15 K) + H(T) − H(298.15 K)
//!
//! | symbol | unit         | meaning                                                                        |
//! |--------|--------------|--------------------------------------------------------------------------------|
//! | Q      | J or W       | heat taken up by the contents at constant pressure; negative: to be removed    |
//! | n      | mol or mol/s | amount, or flow, of a species in a stream                                      |
//! | H(T)   | J/mol        | counted from the elements at 298.15 K, one dataset of formation enthalpies     |
//!
//! Kinetic and potential energy and shaft work are left out. Since elements balance, their zeros cancel.
//! Source: first law for open systems at constant pressure; Smith, Van Ness and Abbott, Introduction to Chemical
//! Engineering Thermodynamics, chapter 4 (from memory).

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::caution::Caution;
use crate::model::gather::Method;
use crate::model::origin::Origin;
use crate::model::plant::claims;
use crate::model::plant::contents::{self, Contents, FEEDS, FORMATION, PRESSURE, REACTIONS};
use crate::model::plant::error::PlantError;
use crate::model::plant::stream::{self, Portion, Stream};
use crate::model::plant::tally::{self, Energy, Tally};
use crate::quantity::Quantity;
use crate::units::{Base, Dimension, Kind, What};

/// Feeds, products and the heat between them, to be read and to be taken parts of.
pub struct HeatBalance {
    pub duty: Quantity,
    pub feeds: Vec<StreamRow>,
    pub products: Vec<StreamRow>,
    /// What leaves, where it follows from what is fed and reacts.
    pub outlet: Option<Rc<Stream>>,
    /// Feeds brought to 298.15 K, reaction there, products brought to their temperatures; J or W.
    pub legs: [f64; 3],
    pub per_time: bool,
}

/// One stream of a table.
pub struct StreamRow {
    pub name: String,
    pub t_k: f64,
    pub species: Vec<SpeciesRow>,
    /// Σ n H, J or W.
    pub sum: f64,
}

pub struct SpeciesRow {
    pub id: String,
    /// mol or mol/s
    pub n: f64,
    /// J/mol
    pub h: f64,
}

impl HeatBalance {
    pub(in crate::model) fn parts(&self) -> Vec<(&'static str, Value)> {
        let mut parts = vec![("duty", Value::Quantity(self.duty.clone()))];
        parts.extend(self.outlet.iter().map(|outlet| (OUTLET, Value::Stream(Rc::clone(outlet)))));
        parts
    }
}

pub static HEAT_BALANCE: Card = Card {
    id: "plant.heat-balance",
    name: "heat_balance",
    on: On::Nothing,
    args: &[Arg {
        name: "balance",
        takes: Takes::Options(&[
            FEEDS,
            Arg {
                name: "products",
                takes: Takes::Streams,
                default: Default::Absent,
                doc: "what leaves: a list of streams, each at its own temperature",
            },
            REACTIONS,
            Arg {
                name: "outlet",
                takes: Takes::Temperature,
                default: Default::Absent,
                doc: "the temperature at which all leaves after the reactions",
            },
            PRESSURE,
            Arg {
                name: "closure",
                takes: Takes::Number,
                default: Default::Absent,
                doc: "relative imbalance of an element that is let pass, for measured flows; 1e-6 unless given",
            },
            FORMATION,
        ]),
        default: Default::Required,
        doc: "feeds and either products, or reactions with the temperature of the outlet",
    }],
    gives: "a heat balance: `duty`, the heat taken up by the contents (negative: to be removed), and `outlet`, what leaves",
    doc: "Heat duty at constant pressure: enthalpy of all that leaves less that of all that is fed, each stream at its own \
          temperature. Elements must balance.",
    source: "first law for open systems at constant pressure (from memory); definition of Cp",
    example: "heat_balance(#{ feeds: [stream(\"syngas\", \"220 degC\", #{ \"CO(g)\": \"120 kmol/h\", \"H2(g)\": \"260 kmol/h\" })], \
              reactions: [#{ reaction: reaction(\"CO(g) + 2 H2(g) -> methanol(g)\"), conversion: 0.3, of: \"CO(g)\" }], \
              outlet: \"255 degC\" })",
    claims: &[
        Claim { id: "complete-conversion", test: claims::complete_conversion },
        Claim { id: "stable-phase", test: claims::stable_phase },
        Claim { id: "formation-dataset", test: claims::formation_dataset },
        Claim { id: "ideal-gas", test: claims::ideal_gas },
        Claim { id: "unmixed", test: claims::unmixed },
        Claim { id: "elements-closed", test: claims::elements_closed },
    ],
    alternatives: claims::SHORTCUTS,
    run,
    check_line: Some(check_line),
    caution: Some(Caution::HeatDuty),
};

/// The part of a balance that is a stream again.
const OUTLET: &str = "outlet";

/// Typed flows have some six digits, and their sums are no better.
const CLOSURE: f64 = 1e-6;

/// A case with what leaves.
pub struct Case {
    pub contents: Contents,
    pub products: Vec<Rc<Stream>>,
}

impl Case {
    /// # Errors
    /// Streams and reactions do not fit together, or elements do not balance.
    pub fn read(cx: &Cx, call: &Call) -> Result<Case, Fault> {
        let products = contents::streams(call, "products");
        let outlet = contents::quantity(call, "outlet");
        let contents = Contents::read(cx, call, &products)?;
        if products.is_empty() {
            let outlet = outlet.ok_or(PlantError::NoOutlet)?;
            let products = vec![Rc::new(contents.outlet(outlet))];
            return Ok(Case { contents, products });
        }
        if !contents.progress.is_empty() {
            return Err(PlantError::ProductsAndReactions.into());
        }
        if outlet.is_some() {
            return Err(PlantError::OutletAndProducts.into());
        }
        let limit = match call.args.last() {
            Some(Value::Options(options)) => match options.get("closure") {
                Some(Value::Number(limit)) if (0.0..1.0).contains(limit) => *limit,
                Some(Value::Number(limit)) => return Err(PlantError::Closure { given: *limit }.into()),
                _ => CLOSURE,
            },
            _ => CLOSURE,
        };
        let worst = contents::imbalances(&contents.fed, &contents::merged(&products)).into_iter().next();
        if let Some(worst) = worst.filter(|worst| worst.relative() > limit) {
            let shown = |si| stream::shown(si, contents.per_time);
            let (fed, leaving) = (shown(worst.fed), shown(worst.leaving));
            return Err(PlantError::Elements { what: worst.what, fed, leaving }.into());
        }
        Ok(Case { contents, products })
    }
}

impl Contents {
    /// All that is there after the reactions, at one temperature.
    pub fn outlet(&self, t: &Quantity) -> Stream {
        let there = |portion: &&Portion| portion.amount.si > 0.0;
        let portions = self.after.iter().filter(there).cloned().collect();
        let name = if self.progress.is_empty() { "mixed" } else { "outlet" };
        Stream { name: name.into(), t: t.clone(), portions, per_time: self.per_time, origin: None }
    }
}

/// Energy, or power where amounts are flows.
pub fn energy(per_time: bool) -> Dimension {
    let energy = Dimension::whole([2, 1, -2, 0, 0, 0]);
    if per_time { energy.over(&Dimension::base(Base::Second)) } else { energy }
}

/// The heat duty of a case, made by `call`.
///
/// # Errors
/// A figure is missing, or a temperature is outside the data.
pub fn duty(cx: &Cx, call: &Rc<Call>, case: &Case, method: &Method) -> Result<Quantity, Fault> {
    let mut tally = Tally::new(Energy::H, method, cx);
    for product in &case.products {
        // What was used up whole still has its share in the derivatives, and none in the outlet's list.
        let reacted = !case.contents.progress.is_empty();
        let leaving = if reacted { &case.contents.after } else { &product.portions };
        tally.add(1.0, leaving, product.t.si(), Some(&product.t))?;
    }
    for feed in &case.contents.feeds {
        tally.add(-1.0, &feed.portions, feed.t.si(), Some(&feed.t))?;
    }
    let (dim, inputs) = (energy(case.contents.per_time), tally.inputs(1.0)?);
    let step = Rc::clone(call);
    Ok(Quantity::from_step(tally.si, dim, Kind::of(What::Heat), inputs, step, cx.place.clone())?)
}

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let case = Case::read(cx, call)?;
    let method = &case.contents.method;
    let duty = duty(cx, call, &case, method)?;
    let mut legs = [0.0; 3];
    let mut table = |streams: &[Rc<Stream>], sign: f64| -> Result<Vec<StreamRow>, Fault> {
        let mut rows = Vec::new();
        for stream in streams {
            let terms = stream.portions.iter().map(|portion| portion.term.clone()).collect();
            let all = tally::contributions(terms, stream.t.si(), method, cx)?;
            let mut species = Vec::new();
            for (portion, one) in stream.portions.iter().zip(&all) {
                let (n, formation) = (portion.amount.si, one.formation.si);
                let increment = one.increment.as_ref().map_or(0.0, |increment| increment.si);
                legs[1] += sign * n * formation;
                legs[if sign > 0.0 { 2 } else { 0 }] += sign * n * increment;
                species.push(SpeciesRow { id: portion.id().to_owned(), n, h: formation + increment });
            }
            let sum = species.iter().map(|row| row.n * row.h).sum();
            rows.push(StreamRow { name: stream.name.to_string(), t_k: stream.t.si(), species, sum });
        }
        Ok(rows)
    };
    let (feeds, products) = (table(&case.contents.feeds, -1.0)?, table(&case.products, 1.0)?);
    let outlet = contents::streams(call, "products").is_empty().then(|| {
        let left = &case.products[0];
        Rc::new(Stream { origin: Origin::of_part(call, OUTLET), ..Stream::clone(left) })
    });
    let per_time = case.contents.per_time;
    Ok(Value::Answer(Answer::HeatBalance(Rc::new(HeatBalance { duty, feeds, products, outlet, legs, per_time }))))
}

/// `products: outlet (-40123.4) - feeds: syngas (-38000.1) = -2123.3 kW`
fn check_line(cx: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let Ok(case) = Case::read(cx, call) else { return String::new() };
    let unit = if case.contents.per_time { "kW" } else { "kJ" };
    let side = |streams: &[Rc<Stream>]| {
        let one = |stream: &Rc<Stream>| {
            let sum = tally::sum(&stream.portions, stream.t.si(), Energy::H, &case.contents.method, cx).ok()?;
            Some(format!("({:.3})", sum.si / 1000.0))
        };
        streams.iter().map(one).collect::<Option<Vec<String>>>().map(|all| all.join(" + "))
    };
    match (side(&case.products), side(&case.contents.feeds)) {
        (Some(leaving), Some(fed)) => {
            let several = |text: &str| if text.contains(" + ") { format!("[{text}]") } else { text.to_owned() };
            format!(
                "{} - {} = {:.3} {unit}, Σ n H of each stream",
                several(&leaving),
                several(&fed),
                value.si() / 1000.0
            )
        }
        _ => String::new(),
    }
}
