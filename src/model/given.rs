//! The pressure a call was given, with the gas law, the partial pressures and the constants that go with it.
//!
//! [`Given`] is read from the options of a call: `pressure`, `gas`, `volume`, `partial` and `constants`. The surprise: the
//! volume of liquids and solids is counted where a pressure is given, and is neglected in standard values, as tables do.

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use thiserror::Error;

use crate::chem::species::Species;
use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Cx, Default, Takes, Value, listed};
use crate::model::property;
use crate::model::terms::Terms;
use crate::quantity::{Mismatch, Quantity, text};
use crate::record::node::Node;
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Dimension, parse};

/// The conditions of a call besides its temperature.
#[derive(Clone, Debug)]
pub struct Given {
    /// `None`: the standard pressure.
    pub total: Option<Quantity>,
    /// Gases by their second virial coefficient, not as ideal.
    pub virial: bool,
    /// The volume of liquids and solids counts.
    pub volumes: bool,
    /// By the id of the gas.
    pub partial: BTreeMap<Arc<str>, Quantity>,
    /// Constants of one's own, by the id of the species and the name of the constant.
    pub(super) own: BTreeMap<Arc<str>, BTreeMap<String, Quantity>>,
}

/// B and dB/dT as given.
pub struct OwnVirial {
    pub b: Rc<Node>,
    pub b1: Option<Rc<Node>>,
}

/// V, α and κ as given.
pub struct OwnVolume {
    pub v: Rc<Node>,
    pub alpha: Option<Rc<Node>>,
    pub kappa: Option<Rc<Node>>,
}

/// What is wrong with the pressure a call was given.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum GivenError {
    #[error("{what} of {given} is not above zero")]
    NotPositive { what: String, given: String },
    #[error("`{option}` names {name}, which is not in {text}")]
    NotThere { option: &'static str, name: String, text: String, known: String },
    #[error("`partial` gives no partial pressure of {missing}, which {text} has as a gas")]
    PartialMissing { missing: String, text: String },
    #[error("the partial pressures add up to {sum}, more than the pressure of {total}")]
    MoreThanTotal { sum: String, total: String },
    #[error("`constants` of {species} gives no {wanted}, without which {given} is of no use")]
    ConstantMissing { species: String, wanted: &'static str, given: String },
    #[error("`constants` of {species} knows no `{name}`")]
    ConstantUnknown { species: String, name: String, known: &'static str },
    #[error("K° is asked for at a pressure, and it depends on temperature only")]
    ConstantAtPressure,
}

impl Explain for GivenError {
    fn code(&self) -> &'static str {
        match self {
            GivenError::NotPositive { .. } => "given-pressure-not-positive",
            GivenError::NotThere { .. } => "option-names-no-species",
            GivenError::PartialMissing { .. } => "partial-pressure-missing",
            GivenError::MoreThanTotal { .. } => "partial-pressures-exceed-total",
            GivenError::ConstantMissing { .. } => "constant-of-species-missing",
            GivenError::ConstantUnknown { .. } => "constant-of-species-unknown",
            GivenError::ConstantAtPressure => "equilibrium-constant-at-pressure",
        }
    }

    fn hint(&self) -> String {
        match self {
            GivenError::NotPositive { .. } => {
                "give it as an absolute pressure; a gauge pressure needs the atmosphere added".to_owned()
            }
            GivenError::NotThere { known, .. } => format!("it can be {known}"),
            GivenError::PartialMissing { missing, .. } => {
                format!("add it, as in `partial: #{{ \"{missing}\": \"1 bar\" }}`; inert gases need not be named")
            }
            GivenError::MoreThanTotal { .. } => {
                "check the pressures, or leave `pressure` out, which then is that of liquids and solids alone"
                    .to_owned()
            }
            GivenError::ConstantMissing { wanted, .. } => format!("give {wanted} too"),
            GivenError::ConstantUnknown { known, .. } => format!("give {known}"),
            GivenError::ConstantAtPressure => {
                "for a state off equilibrium ask `r.reaction_quotient(#{ partial: ... })` or \
                 `r.direction(T, #{ partial: ... })`; for K° leave the pressure out"
                    .to_owned()
            }
        }
    }
}

/// The options that say how pressure is taken, of a pure substance.
pub const PRESSURE: Arg = Arg {
    name: "pressure",
    takes: Takes::Quantity { unit: "Pa" },
    default: Default::Absent,
    doc: "absolute pressure of each pure species; without it the standard pressure",
};
pub const GAS: Arg = Arg {
    name: "gas",
    takes: Takes::Word(&["ideal", "virial"]),
    default: Default::Absent,
    doc: "gases as ideal, or by their second virial coefficients",
};
pub const VOLUME: Arg = Arg {
    name: "volume",
    takes: Takes::Word(&["counted", "neglected"]),
    default: Default::Absent,
    doc: "whether the volume of liquids and solids counts; it does where a pressure is given",
};
pub const PARTIAL: Arg = Arg {
    name: "partial",
    takes: Takes::Named { unit: "Pa" },
    default: Default::Absent,
    doc: "partial pressure of each gas of the reaction, by name",
};
pub const CONSTANTS: Arg = Arg {
    name: "constants",
    takes: Takes::NamedMaps,
    default: Default::Absent,
    doc: "constants of one's own by species: B and dB_dT of a gas at T, or V at T with alpha and kappa of a liquid or solid",
};

impl Given {
    /// Each species at the standard pressure, gases ideal, without the volume of liquids and solids.
    pub fn standard() -> Given {
        Given { total: None, virial: false, volumes: false, partial: BTreeMap::new(), own: BTreeMap::new() }
    }

    /// What a call was given; `None` where it asks for standard values.
    ///
    /// # Errors
    /// A pressure is not positive, a name is not of the reaction, or a gas has no partial pressure.
    pub fn of(call: &Call, cx: &Cx) -> Result<Option<Given>, Fault> {
        let Some(terms) = call.terms() else { return Ok(None) };
        let total = match call.given("pressure") {
            Some(Value::Quantity(p)) => Some(positive("the pressure", p)?),
            _ => None,
        };
        let word = |name| call.option(name).map(|word| &**word);
        let virial = word("gas") == Some("virial");
        let volumes = match word("volume") {
            Some(word) => word == "counted",
            None => total.is_some(),
        };
        let mut partial = BTreeMap::new();
        for (name, p) in quantities(call.given("partial")) {
            let id = species_named("partial", name, terms, cx, Species::is_gas)?;
            partial.insert(id, positive(&format!("the partial pressure of {name}"), p)?);
        }
        if !partial.is_empty() {
            complete(&partial, total.as_ref(), terms)?;
        }
        let mut own = BTreeMap::new();
        if let Some(Value::Options(constants)) = call.given("constants") {
            for (name, inner) in constants.iter() {
                let id = constants_of(name, terms, cx)?;
                let inner = quantities(Some(inner)).map(|(name, value)| (name.to_owned(), value.clone())).collect();
                own.insert(id, inner);
            }
        }
        if total.is_none() && partial.is_empty() && own.is_empty() && !virial && !volumes {
            return Ok(None);
        }
        Ok(Some(Given { total, virial, volumes, partial, own }))
    }

    /// The pressure of a species, with its node where it was given.
    pub fn pressure_of(&self, species: &Species) -> (f64, Option<Rc<Node>>) {
        match self.partial.get(&species.id).or(self.total.as_ref()) {
            Some(p) => (p.si(), Some(property::as_argument(p))),
            None => (STANDARD_PRESSURE.value, None),
        }
    }

    /// The one pressure of all, where there is one.
    pub fn common(&self) -> Option<f64> {
        match &self.total {
            Some(p) => Some(p.si()),
            None if self.partial.is_empty() => Some(STANDARD_PRESSURE.value),
            None => None,
        }
    }

    /// The virial coefficient that was given for a gas.
    ///
    /// # Errors
    /// A constant has another dimension or name, or B is missing.
    pub fn own_virial(&self, id: &Arc<str>) -> Result<Option<OwnVirial>, Fault> {
        let Some(own) = self.own.get(id) else { return Ok(None) };
        let [b, b1] = self.constants(id, own, [("B", "cm3/mol"), ("dB_dT", "cm3/(mol K)")], "B and dB_dT")?;
        Ok(Some(OwnVirial { b: needed(id, own, b, "B")?, b1 }))
    }

    /// The molar volume that was given for a liquid or solid.
    ///
    /// # Errors
    /// A constant has another dimension or name, or V is missing.
    pub fn own_volume(&self, id: &Arc<str>) -> Result<Option<OwnVolume>, Fault> {
        let Some(own) = self.own.get(id) else { return Ok(None) };
        let names = [("V", "cm3/mol"), ("alpha", "1/K"), ("kappa", "1/Pa")];
        let [v, alpha, kappa] = self.constants(id, own, names, "V, alpha and kappa")?;
        Ok(Some(OwnVolume { v: needed(id, own, v, "V")?, alpha, kappa }))
    }

    fn constants<const N: usize>(
        &self,
        id: &Arc<str>,
        own: &BTreeMap<String, Quantity>,
        names: [(&'static str, &'static str); N],
        known: &'static str,
    ) -> Result<[Option<Rc<Node>>; N], Fault> {
        if let Some(name) = own.keys().find(|name| !names.iter().any(|(known, _)| known == name)) {
            let species = id.to_string();
            return Err(GivenError::ConstantUnknown { species, name: name.clone(), known }.into());
        }
        let mut found = [const { None }; N];
        for (slot, (name, unit)) in found.iter_mut().zip(names) {
            let Some(value) = own.get(name) else { continue };
            let wanted = parse::unit(unit)?;
            let fits = |dim: &Dimension| *dim == wanted.dim || !wanted.dim.bindings_to(dim).is_empty();
            if !fits(value.dim()) {
                return Err(Mismatch::unit(value.dim(), &wanted).into());
            }
            *slot = Some(Rc::clone(value.node()));
        }
        Ok(found)
    }
}

fn needed(
    id: &Arc<str>,
    own: &BTreeMap<String, Quantity>,
    found: Option<Rc<Node>>,
    wanted: &'static str,
) -> Result<Rc<Node>, GivenError> {
    found.ok_or_else(|| GivenError::ConstantMissing {
        species: id.to_string(),
        wanted,
        given: listed(own.keys().map(String::as_str)),
    })
}

/// Names with quantities, of a map that the card has checked.
fn quantities(map: Option<&Value>) -> impl Iterator<Item = (&str, &Quantity)> {
    let map = match map {
        Some(Value::Options(map)) => Some(map),
        _ => None,
    };
    map.into_iter().flat_map(|map| map.iter()).filter_map(|(name, value)| match value {
        Value::Quantity(value) => Some((name.as_str(), value)),
        _ => None,
    })
}

fn positive(what: &str, p: &Quantity) -> Result<Quantity, GivenError> {
    if p.si() > 0.0 {
        return Ok(p.clone());
    }
    Err(GivenError::NotPositive { what: what.to_owned(), given: text::shown_plain(p) })
}

/// The id of the species of the reaction that a name means.
fn species_named(
    option: &'static str,
    name: &str,
    terms: &Terms,
    cx: &Cx,
    suits: impl Fn(&Species) -> bool,
) -> Result<Arc<str>, Fault> {
    let all = || terms.terms().iter().map(|term| &term.substance.species).filter(|species| suits(species));
    let id = match all().find(|species| *species.id == *name) {
        Some(species) => species.id.clone(),
        None => cx.data().find(name)?.species.id.clone(),
    };
    if all().any(|species| species.id == id) {
        return Ok(id);
    }
    let known = listed(all().map(|species| &*species.id));
    Err(GivenError::NotThere { option, name: name.to_owned(), text: terms.text().to_owned(), known }.into())
}

/// The species that constants of one's own are for: one of the terms, or another phase of one, as the vapour of a liquid.
fn constants_of(name: &str, terms: &Terms, cx: &Cx) -> Result<Arc<str>, Fault> {
    let entities = || terms.terms().iter().map(|term| term.substance.species.entity);
    match cx.data().find(name) {
        Ok(found) if entities().any(|entity| entity == found.species.entity) => Ok(found.species.id.clone()),
        _ => species_named("constants", name, terms, cx, |_| true),
    }
}

/// Every gas has a partial pressure, and they do not pass the pressure of the whole.
fn complete(partial: &BTreeMap<Arc<str>, Quantity>, total: Option<&Quantity>, terms: &Terms) -> Result<(), GivenError> {
    let gases = terms.terms().iter().map(|term| &term.substance.species).filter(|species| species.is_gas());
    if let Some(missing) = gases.into_iter().find(|species| !partial.contains_key(&species.id)) {
        let (missing, text) = (missing.id.to_string(), terms.text().to_owned());
        return Err(GivenError::PartialMissing { missing, text });
    }
    let sum: f64 = partial.values().map(Quantity::si).sum();
    match total {
        // Rounding of figures that were split by hand.
        Some(total) if sum > total.si() * (1.0 + 1e-9) => Err(GivenError::MoreThanTotal {
            sum: format!("{} bar", crate::quantity::round::shortest(sum / 1e5)),
            total: text::shown_plain(total),
        }),
        _ => Ok(()),
    }
}
