//! Reads a crystal from the map that an analyst writes, `crystal(#{ formula: "Cu", debye: "343 K" })`.
//!
//! One characteristic temperature stands for all modes, or several share them with a count each. What cannot be is refused
//! here: counts that do not add up to three for each atom, and an expansion without its compressibility.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::chem::formula::Formula;
use crate::chem::species::State;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Cx, Value, listed};
use crate::model::molecule::definition::made_up;
use crate::model::molecule::parameter::Parameter;
use crate::model::molecule::read as molecule_read;
use crate::model::solid::error::SolidError;
use crate::model::solid::{Crystal, Expansion, Modes, RANGE_K, Spectrum};
use crate::quantity::{Quantity, round, text};
use crate::units::{parse as unit_parse, reader_text};

const KEYS: [&str; 12] = [
    "formula",
    "name",
    "debye",
    "einstein",
    "electronic",
    "expansivity",
    "compressibility",
    "molar_volume",
    "expansion_temperature",
    "melting_point",
    "formation_enthalpy",
    "formation_temperature",
];

type Map = BTreeMap<String, Value>;

/// A crystal from its map.
///
/// # Errors
/// Something is missing, of the wrong sort, or cannot be.
pub fn crystal(cx: &Cx, map: &Map) -> Result<Crystal, Fault> {
    if let Some(key) = map.keys().find(|key| !KEYS.contains(&key.as_str())) {
        return Err(SolidError::Key { key: key.clone(), known: listed(KEYS) }.into());
    }
    let reader = Reader { cx, map };
    let substance = reader.substance()?;
    let modes = reader.modes(&substance)?;
    let gamma = reader.positive("electronic", "J/(mol K^2)", "`\"0.695 mJ/(mol K^2)\"`")?;
    let formation = molecule_read::given_formation(cx, map)?;
    Ok(Crystal::new(substance, modes, gamma, reader.expansion()?, formation))
}

struct Reader<'a> {
    cx: &'a Cx<'a>,
    map: &'a Map,
}

impl Reader<'_> {
    fn sort(key: &str, wanted: &'static str, given: &Value) -> Fault {
        SolidError::Sort { key: key.to_owned(), wanted, given: given.sort().to_owned() }.into()
    }

    fn text(&self, key: &str) -> Result<Option<String>, Fault> {
        match self.map.get(key) {
            None => Ok(None),
            Some(Value::Text(text)) => Ok(Some(text.trim().to_owned())),
            Some(other) => Err(Reader::sort(key, "a text", other)),
        }
    }

    /// The recorded crystal of that name, or one made up of name and formula.
    fn substance(&self) -> Result<Arc<Substance>, Fault> {
        let (name, formula) = (self.text("name")?, self.text("formula")?);
        let Some(called) = name.as_ref().or(formula.as_ref()) else {
            return Err(SolidError::Missing { key: "formula", example: "formula: \"Cu\"" }.into());
        };
        let with_phase =
            if called.ends_with(')') && called.contains("(cr") { called.clone() } else { format!("{called}(cr)") };
        if let Ok(found) = self.cx.data().find(&with_phase) {
            return Ok(found);
        }
        let Some(formula) = &formula else {
            return Err(SolidError::Missing { key: "formula", example: "formula: \"Cu\"" }.into());
        };
        let bare = formula.split_once("(cr").map_or(formula.as_str(), |(bare, _)| bare);
        let Ok(parsed) = Formula::parse(bare) else {
            return Err(match formula.parse::<crate::chem::species::SpeciesName>() {
                Ok(name) if name.phase.is_some() => SolidError::NoCrystal { given: formula.clone() }.into(),
                _ => Formula::parse(bare).map(|_| ()).unwrap_err().into(),
            });
        };
        let base = match &name {
            Some(name) => name.split_once("(cr").map_or(name.as_str(), |(bare, _)| bare).to_owned(),
            None => parsed.reference_name(),
        };
        Ok(Arc::new(made_up(&base, parsed.composition(), parsed.charge(), State::Crystal)))
    }

    fn modes(&self, substance: &Substance) -> Result<Vec<Modes>, Fault> {
        let atoms: f64 = substance.species.composition.iter().map(|(_, count)| count.to_f64()).sum();
        let mut found: Vec<(Spectrum, Parameter, Option<f64>)> = Vec::new();
        for (key, spectrum) in [("debye", Spectrum::Debye), ("einstein", Spectrum::Einstein)] {
            let Some(value) = self.map.get(key) else { continue };
            match value {
                Value::List(list) if list.iter().any(|item| matches!(item, Value::List(_))) => {
                    for item in list {
                        found.push(self.group(key, spectrum, item)?);
                    }
                }
                one => found.push(self.group(key, spectrum, one)?),
            }
        }
        if found.is_empty() {
            return Err(SolidError::Missing { key: "debye", example: "debye: \"343 K\"" }.into());
        }
        let wanted = 3.0 * atoms;
        let counted: f64 = found.iter().filter_map(|(_, _, count)| *count).sum();
        let open = found.iter().filter(|(_, _, count)| count.is_none()).count();
        let rest = wanted - counted;
        let adds_up = match open {
            0 => rest == 0.0,
            1 => rest > 0.0,
            _ => false,
        };
        if !adds_up {
            let formula = substance.id().to_owned();
            let given = counted + open as f64;
            return Err(SolidError::ModeCount { formula, atoms, wanted, given }.into());
        }
        let modes = |(spectrum, theta, count): (Spectrum, Parameter, Option<f64>)| Modes {
            spectrum,
            theta,
            count: count.unwrap_or(rest),
        };
        Ok(found.into_iter().map(modes).collect())
    }

    /// `"343 K"`, or `["343 K", 3]` with the number of modes.
    fn group(&self, key: &str, spectrum: Spectrum, value: &Value) -> Result<(Spectrum, Parameter, Option<f64>), Fault> {
        let (figure, count) = match value {
            Value::List(pair) => match pair.as_slice() {
                [figure, Value::Number(count)] if *count > 0.0 => (figure, Some(*count)),
                _ => return Err(Reader::sort(key, "a temperature, or pairs of one and its number of modes", value)),
            },
            figure => (figure, None),
        };
        let quantity = self.quantity(key, figure)?;
        let name = format!("{} temperature", spectrum.word());
        let kelvin = quantity.dim() == &unit_parse::unit("K")?.dim;
        let theta = if kelvin {
            Some(Parameter::of(&name, &quantity))
        } else {
            Parameter::theta(&name, &quantity, self.cx.constants())
        };
        let Some(theta) = theta else {
            let given = reader_text(&quantity.unit());
            let (wanted, example) = ("a temperature or a wavenumber", "`\"343 K\"` or `\"238 cm^-1\"`");
            return Err(SolidError::Dimension { key: key.to_owned(), given, wanted, example }.into());
        };
        if theta.value <= 0.0 {
            let value = text::shown_plain(&quantity);
            return Err(SolidError::NotPositive { key: key.to_owned(), value }.into());
        }
        Ok((spectrum, theta, count))
    }

    fn quantity(&self, key: &str, value: &Value) -> Result<Quantity, Fault> {
        match value {
            Value::Quantity(value) => Ok(value.clone()),
            Value::Text(written) => Ok(text::parse(written, self.cx.place.clone(), self.cx.next_ordinal())?),
            other => Err(Reader::sort(key, "a quantity with its unit", other)),
        }
    }

    /// A figure above 0 of a unit's dimension, whatever its moles are of.
    fn positive(&self, key: &'static str, unit: &str, example: &'static str) -> Result<Option<Parameter>, Fault> {
        let Some(value) = self.map.get(key) else { return Ok(None) };
        let quantity = self.quantity(key, value)?;
        if quantity.dim().without_basis() != unit_parse::unit(unit)?.dim.without_basis() {
            let (given, wanted) = (reader_text(&quantity.unit()), "another dimension");
            return Err(SolidError::Dimension { key: key.to_owned(), given, wanted, example }.into());
        }
        if quantity.si() <= 0.0 {
            let value = text::shown_plain(&quantity);
            return Err(SolidError::NotPositive { key: key.to_owned(), value }.into());
        }
        Ok(Some(Parameter::of(&key.replace('_', " "), &quantity)))
    }

    fn expansion(&self) -> Result<Option<Expansion>, Fault> {
        let alpha =
            self.positive("expansivity", "K^-1", "`\"4.95e-5 K^-1\"`, the cubic one, three times the linear")?;
        let kappa = self.positive("compressibility", "Pa^-1", "`\"7.3e-12 Pa^-1\"`")?;
        let volume = self.positive("molar_volume", "m^3/mol", "`\"7.11 cm^3/mol\"`")?;
        let at_k = match self.map.get("expansion_temperature") {
            None => crate::model::function::T_REFERENCE,
            Some(value) => self.quantity("expansion_temperature", value)?.si(),
        };
        if !(RANGE_K.0..=RANGE_K.1).contains(&at_k) {
            let value = format!("{} K", round::shortest(at_k));
            return Err(SolidError::NotPositive { key: "expansion_temperature".to_owned(), value }.into());
        }
        let melting = self.positive("melting_point", "K", "`\"1357.77 K\"`")?;
        match (alpha, kappa, volume) {
            (Some(_), Some(_), Some(_)) if melting.is_some() => Err(SolidError::ExpansionTwice.into()),
            (Some(alpha), Some(kappa), Some(volume)) => Ok(Some(Expansion::Measured { alpha, kappa, volume, at_k })),
            (None, None, None) => Ok(melting.map(Expansion::Melting)),
            (alpha, kappa, _) => {
                let given = match (alpha, kappa) {
                    (Some(_), _) => "expansivity",
                    (None, Some(_)) => "compressibility",
                    _ => "molar_volume",
                };
                Err(SolidError::Expansion { given }.into())
            }
        }
    }
}
