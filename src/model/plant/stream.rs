//! A stream: what is in it, how much of each, and its temperature.
//!
//! Amounts are given in moles or in mass, in all or per time; masses become moles by the molar mass, whose uncertainty they
//! keep. The surprise: a stream has a name, since tables, messages and check lines speak of it.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::mass;
use crate::model::origin::Origin;
use crate::model::plant::amount::Amount;
use crate::model::plant::error::PlantError;
use crate::model::terms::Term;
use crate::quantity::{Quantity, round, text};
use crate::record::node::{Node, Step};
use crate::units::{Base, Of};

/// How much of one species.
#[derive(Clone)]
pub struct Portion {
    /// The species; its ν is 1.
    pub term: Term,
    /// In mol or mol/s.
    pub amount: Amount,
}

impl Portion {
    pub fn id(&self) -> &str {
        self.term.substance.id()
    }
}

/// Portions at one temperature.
#[derive(Clone)]
pub struct Stream {
    pub name: Rc<str>,
    pub t: Quantity,
    pub portions: Vec<Portion>,
    /// Whether the amounts are flows.
    pub per_time: bool,
    pub origin: Option<Origin>,
}

impl Stream {
    /// The values it was made from, its temperature first.
    pub fn nodes(&self) -> Vec<Rc<Node>> {
        let amounts = self.portions.iter().flat_map(|portion| portion.amount.of.nodes());
        std::iter::once(self.t.node()).chain(amounts).map(Rc::clone).collect()
    }

    /// In mol or mol/s.
    pub fn total(&self) -> f64 {
        self.portions.iter().map(|portion| portion.amount.si).sum()
    }
}

/// An amount for readers: `120 kmol/h`, or `120 mol`.
pub fn shown(si: f64, per_time: bool) -> String {
    let (number, unit) = in_unit(si, per_time);
    format!("{} {unit}", round::shortest(round::significant(number, 6).parse().unwrap_or(number)))
}

/// An amount in the unit of tables, with that unit.
pub fn in_unit(si: f64, per_time: bool) -> (f64, &'static str) {
    if per_time { (si * 3.6, "kmol/h") } else { (si, "mol") }
}

pub static STREAM: Card = Card {
    id: "plant.stream",
    name: "stream",
    on: On::Nothing,
    args: &[
        Arg { name: "name", takes: Takes::Text, default: Default::Required, doc: "what the stream is called" },
        Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "its temperature" },
        Arg {
            name: "amounts",
            takes: Takes::Any,
            default: Default::Required,
            doc: "a map from species with phase to amounts or flows, in mol or kg; with fractions, the amount or flow in all, in mol",
        },
        Arg {
            name: "fractions",
            takes: Takes::Any,
            default: Default::Absent,
            doc: "a map from species with phase to mole fractions, which add up to 1",
        },
    ],
    gives: "a stream, for `heat_balance` and `adiabatic_temperature`",
    doc: "What is fed or leaves: amounts (mol, kg) or flows (mol/s, kmol/h, kg/h) of each species, and the temperature of \
          them all.",
    source: "definition of the mole; IUPAC CIAAW standard atomic weights 2021 where masses are given",
    example: "stream(\"syngas\", \"220 degC\", #{ \"CO(g)\": \"120 kmol/h\", \"H2(g)\": \"260 kmol/h\" })",
    claims: &[],
    alternatives: &[],
    run,
    check_line: None,
    caution: None,
};

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let (name, t) = (call.text(0), call.quantity(1).clone());
    let (portions, per_time) = match (&call.args[2], &call.args[3]) {
        (Value::Options(amounts), Value::Nothing) => by_amounts(cx, call, name, amounts)?,
        (total, Value::Options(fractions)) => by_fractions(cx, name, total, fractions)?,
        (given, _) => {
            let (stream, given) = (name.to_string(), given.sort().to_owned());
            return Err(PlantError::NotAQuantity { stream, species: "CO(g)".to_owned(), given }.into());
        }
    };
    if portions.is_empty() {
        return Err(PlantError::Empty { stream: name.to_string() }.into());
    }
    Ok(Value::Stream(Rc::new(Stream { name: Rc::clone(name), t, portions, per_time, origin: None })))
}

type Portions = (Vec<Portion>, bool);

fn by_amounts(cx: &Cx, call: &Rc<Call>, name: &str, amounts: &BTreeMap<String, Value>) -> Result<Portions, Fault> {
    let mut portions: Vec<Portion> = Vec::new();
    let mut first: Option<(String, bool)> = None;
    for (species, value) in amounts {
        let term = Term::of_tables(cx.data().find(species)?, 1.0);
        let value = quantity(cx, name, species, value)?;
        let (amount, per_time) = amount(cx, call, name, species, &term, &value)?;
        match &first {
            Some((other, of_other)) if *of_other != per_time => {
                let (flow, total) = if per_time { (species, other) } else { (other, species) };
                return Err(PlantError::FlowAndAmount { first: flow.clone(), second: total.clone() }.into());
            }
            Some(_) => {}
            None => first = Some((species.clone(), per_time)),
        }
        enter(&mut portions, term, &amount);
    }
    Ok((portions, first.is_some_and(|(_, per_time)| per_time)))
}

fn by_fractions(cx: &Cx, name: &str, total: &Value, fractions: &BTreeMap<String, Value>) -> Result<Portions, Fault> {
    let total = quantity(cx, name, "the total", total)?;
    let Some((false, per_time)) = sort_of(&total) else {
        return Err(not_an_amount(name, "the total", &total).into());
    };
    let (mut portions, mut sum) = (Vec::new(), 0.0);
    for (species, value) in fractions {
        let term = Term::of_tables(cx.data().find(species)?, 1.0);
        let amount = match value {
            Value::Number(fraction) => {
                sum += fraction;
                Amount::scaled_value(&total, *fraction)
            }
            value => {
                let fraction = quantity(cx, name, species, value)?;
                if !fraction.dim().is_basis_only() {
                    return Err(not_an_amount(name, species, &fraction).into());
                }
                sum += fraction.si();
                Amount::product(&total, &fraction, false)
            }
        };
        refuse_negative(name, species, amount.si, per_time)?;
        enter(&mut portions, term, &amount);
    }
    // Fractions are typed with a few digits, and half a unit in the last of four of a dozen species is 1e-3.
    if (sum - 1.0).abs() > 1e-3 {
        let sum = round::shortest(round::significant(sum, 6).parse().unwrap_or(sum));
        return Err(PlantError::Fractions { stream: name.to_owned(), sum }.into());
    }
    Ok((portions, per_time))
}

fn enter(portions: &mut Vec<Portion>, term: Term, amount: &Amount) {
    match portions.iter_mut().find(|portion| portion.id() == term.substance.id()) {
        // Two names of one substance.
        Some(portion) => portion.amount.add(amount, 1.0),
        None => portions.push(Portion { term, amount: amount.clone() }),
    }
}

fn quantity(cx: &Cx, stream: &str, species: &str, value: &Value) -> Result<Quantity, Fault> {
    match value {
        Value::Quantity(value) => Ok(value.clone()),
        Value::Text(written) => Ok(text::parse(written, cx.place.clone(), cx.next_ordinal())?),
        other => {
            let (stream, species, given) = (stream.to_owned(), species.to_owned(), other.sort().to_owned());
            Err(PlantError::NotAQuantity { stream, species, given }.into())
        }
    }
}

fn not_an_amount(stream: &str, species: &str, value: &Quantity) -> PlantError {
    let unit = value.unit().text.to_string();
    let given = if unit.is_empty() { "a pure number".to_owned() } else { unit };
    PlantError::NotAnAmount { stream: stream.to_owned(), species: species.to_owned(), given }
}

fn refuse_negative(stream: &str, species: &str, si: f64, per_time: bool) -> Result<(), PlantError> {
    if si >= 0.0 {
        return Ok(());
    }
    Err(PlantError::Negative { stream: stream.to_owned(), species: species.to_owned(), amount: shown(si, per_time) })
}

/// Whether a value is a mass, and whether it is per time; `None` if it is neither an amount nor a mass.
pub(super) fn sort_of(value: &Quantity) -> Option<(bool, bool)> {
    let dim = value.dim();
    let per_time = match dim.halves(Base::Second) {
        0 => false,
        -2 => true,
        _ => return None,
    };
    let kilograms = dim.halves(Base::Kilogram);
    let rest = [Base::Metre, Base::Ampere, Base::Kelvin, Base::Candela];
    if rest.into_iter().any(|base| dim.halves(base) != 0) {
        return None;
    }
    match (kilograms, dim.entities()) {
        (0, [(Of::Amount, _, 2)]) => Some((false, per_time)),
        (0, [(Of::Mass, _, 2)]) | (2, []) => Some((true, per_time)),
        _ => None,
    }
}

fn amount(
    cx: &Cx,
    call: &Rc<Call>,
    stream: &str,
    species: &str,
    term: &Term,
    value: &Quantity,
) -> Result<(Amount, bool), Fault> {
    let (is_mass, per_time) = sort_of(value).ok_or_else(|| not_an_amount(stream, species, value))?;
    let own = term.substance.species.entity;
    if let [(_, entity, _)] = value.dim().entities()
        && !entity.is_open()
        && *entity != own
    {
        let (stream, species, given) = (stream.to_owned(), species.to_owned(), value.unit().text.to_string());
        return Err(PlantError::OtherEntity { stream, species, given }.into());
    }
    refuse_negative(stream, species, value.si(), per_time)?;
    if !is_mass {
        return Ok((Amount::scaled_value(value, 1.0), per_time));
    }
    let step: Rc<dyn Step> = Rc::<Call>::clone(call);
    let molar = mass::molar_mass(cx, own, step)?;
    Ok((Amount::product(value, &molar, true), per_time))
}
