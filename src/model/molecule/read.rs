//! Reads a molecule from the map that an analyst writes, `molecule(#{ formula: "CO2", ... })`.
//!
//! Every figure may be a quantity, a text with its unit, or a bare number where `unit` names one for all. What cannot be a
//! molecule is refused here: imaginary modes, a wrong number of modes, a symmetry number below 1, a formation enthalpy
//! without its zero.

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use crate::chem::formula::Formula;
use crate::chem::species::State;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Cx, Value, listed};
use crate::model::mass;
use crate::model::molecule::Molecule;
use crate::model::molecule::definition::{self, Definition, GivenFormation, GivenTorsion, Motion};
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::parameter::Parameter;
use crate::model::molecule::treatment::{self, Treatment};
use crate::model::molecule::{point_group, shipped, stretching};
use crate::model::statmech::diatomic::Spins;
use crate::quantity::{Quantity, round, text};
use crate::units::{Unit, Zero, parse as unit_parse, reader_text};

/// Everything a molecule may be given, beside the options of its treatment.
const KEYS: [&str; 21] = [
    "formula",
    "name",
    "molar_mass",
    "rotational_constants",
    "distortion",
    "symmetry_number",
    "point_group",
    "vibrations",
    "torsions",
    "we",
    "wexe",
    "Be",
    "alpha_e",
    "De",
    "spin_weights",
    "electronic_levels",
    "multiplicity",
    "unit",
    "scale",
    "scale_zero_point",
    "energy",
];
const FORMATION_KEYS: [&str; 2] = ["formation_enthalpy", "formation_temperature"];
const TORSION_KEYS: [&str; 7] =
    ["rotational_constant", "reduced_moment", "barrier", "fold", "cosines", "sines", "symmetry_number"];

type Map = BTreeMap<String, Value>;

/// A molecule from its map.
///
/// # Errors
/// Something is missing, of the wrong sort, or cannot be.
pub fn molecule(cx: &Cx, map: &Map) -> Result<Molecule, Fault> {
    let options = || treatment::OPTIONS.iter().map(|option| option.name);
    let known = |key: &str| KEYS.contains(&key) || FORMATION_KEYS.contains(&key) || options().any(|name| name == key);
    if let Some(key) = map.keys().find(|key| !known(key)) {
        let all = listed(KEYS.into_iter().chain(FORMATION_KEYS).chain(options()));
        return Err(MoleculeError::Key { key: key.clone(), known: all }.into());
    }
    let reader = Reader::new(cx, map)?;
    let treatment = reader.treatment(map, Treatment::default())?;
    Ok(Molecule::new(reader.definition()?, treatment))
}

/// A treatment changed by a map of options.
///
/// # Errors
/// A word is none of the option's, or the cut-off is no wavenumber.
pub fn treatment_of(cx: &Cx, map: &Map, base: Treatment) -> Result<Treatment, Fault> {
    Reader::new(cx, map)?.treatment(map, base)
}

/// The formation enthalpy that a map gives, with its zero checked.
///
/// # Errors
/// It is no energy per mole, or its temperature is not said.
pub fn given_formation(cx: &Cx, map: &Map) -> Result<Option<GivenFormation>, Fault> {
    Reader::new(cx, map)?.formation()
}

/// The map with what is needed to read it.
struct Reader<'a> {
    cx: &'a Cx<'a>,
    map: &'a Map,
    unit: Option<Unit>,
    /// What the molecule is called in the names of its inputs.
    called: String,
}

impl<'a> Reader<'a> {
    fn new(cx: &'a Cx<'a>, map: &'a Map) -> Result<Self, Fault> {
        let mut reader = Reader { cx, map, unit: None, called: "the molecule".to_owned() };
        if let Some(name) = reader.text("unit")? {
            reader.unit = Some(unit_parse::unit(&name)?);
        }
        if let Some(called) = reader.text("name")?.or(reader.text("formula")?) {
            reader.called = called.to_string();
        }
        Ok(reader)
    }

    fn sort(key: &str, wanted: &'static str, given: &Value) -> Fault {
        MoleculeError::Sort { key: key.to_owned(), wanted, given: given.sort().to_owned() }.into()
    }

    fn text(&self, key: &str) -> Result<Option<Arc<str>>, Fault> {
        match self.map.get(key) {
            None => Ok(None),
            Some(Value::Text(text)) => Ok(Some(Arc::from(&**text))),
            Some(other) => Err(Reader::sort(key, "a text", other)),
        }
    }

    fn number(&self, key: &str, value: &Value) -> Result<f64, Fault> {
        match value {
            Value::Number(number) => Ok(*number),
            Value::Quantity(value) if value.dim().is_none() => Ok(value.si()),
            other => Err(Reader::sort(key, "a number", other)),
        }
    }

    fn list<'v>(&self, key: &str, value: &'v Value) -> Result<&'v [Value], Fault> {
        match value {
            Value::List(list) => Ok(list),
            other => Err(Reader::sort(key, "a list", other)),
        }
    }

    /// A figure with its unit.
    fn quantity(&self, key: &str, value: &Value) -> Result<Quantity, Fault> {
        let read = match value {
            Value::Quantity(value) => value.clone(),
            Value::Text(written) => {
                imaginary(written)?;
                text::parse(written, self.cx.place.clone(), self.cx.next_ordinal())?
            }
            Value::Number(number) => {
                let Some(unit) = &self.unit else {
                    return Err(MoleculeError::Unit { key: key.to_owned(), value: round::shortest(*number) }.into());
                };
                text::from_number(*number, unit.clone(), self.cx.place.clone(), self.cx.next_ordinal())?
            }
            other => return Err(Reader::sort(key, "a quantity, as in \"667 cm^-1\"", other)),
        };
        let typed = !matches!(value, Value::Quantity(_));
        if read.dim().is_none() {
            let value = text::shown_plain(&read);
            return Err(MoleculeError::Unit { key: key.to_owned(), value }.into());
        }
        Ok(if typed { self.named(key, read) } else { read })
    }

    /// A typed figure under a name that says what it is of. Of figures without a stated u a reader wants to know which list they
    /// are of, and not each of thirty.
    fn named(&self, key: &str, read: Quantity) -> Quantity {
        let what = format!("{} of {}", key.replace('_', " "), self.called);
        read.with_input(|input| {
            let written = input.label.take().filter(|_| input.u.is_some());
            input.label = Some(written.map_or_else(|| what.clone(), |text| format!("{what}, {text}")).into());
        })
    }

    /// A figure as a temperature; `sign` says what is refused.
    fn theta(&self, key: &str, value: &Value, sign: Sign) -> Result<Parameter, Fault> {
        let quantity = self.quantity(key, value)?;
        let parameter = Parameter::theta(key, &quantity, self.cx.constants());
        let Some(parameter) = parameter else {
            let given = reader_text(&quantity.unit());
            let wanted = "a wavenumber, a frequency, an energy or a moment of inertia";
            let example = "`\"667 cm^-1\"`, `\"57.9 GHz\"`, `\"12.1 kJ/mol\"` or `\"5.3e-47 kg m^2\"`";
            return Err(MoleculeError::Dimension { key: key.to_owned(), given, wanted, example }.into());
        };
        let shown = || text::shown_plain(&quantity);
        match sign {
            Sign::Mode if parameter.value < 0.0 => Err(MoleculeError::Imaginary { value: shown() }.into()),
            Sign::Mode | Sign::Positive if parameter.value <= 0.0 || !parameter.value.is_finite() => {
                Err(MoleculeError::NotPositive { key: key.to_owned(), value: shown() }.into())
            }
            Sign::NotNegative if parameter.value < 0.0 => {
                Err(MoleculeError::NotPositive { key: key.to_owned(), value: shown() }.into())
            }
            _ => Ok(parameter),
        }
    }

    fn thetas(&self, key: &str, sign: Sign) -> Result<Vec<Parameter>, Fault> {
        let Some(value) = self.map.get(key) else { return Ok(Vec::new()) };
        self.list(key, value)?.iter().map(|item| self.theta(key, item, sign)).collect()
    }

    /// Figures with degeneracies: `["1333 cm^-1", ["667 cm^-1", 2]]`.
    fn degenerate(&self, key: &str, sign: Sign) -> Result<Vec<(Parameter, f64)>, Fault> {
        let Some(value) = self.map.get(key) else { return Ok(Vec::new()) };
        let one = |item: &Value| match item {
            Value::List(pair) => {
                let [figure, degeneracy] = pair.as_slice() else {
                    return Err(Reader::sort(key, "pairs of a figure and its degeneracy", item));
                };
                let g = self.number(key, degeneracy)?;
                if !(g >= 1.0 && g.fract() == 0.0) {
                    let value = round::shortest(g);
                    return Err(MoleculeError::Degeneracy { key: key.to_owned(), value }.into());
                }
                Ok((self.theta(key, figure, sign)?, g))
            }
            figure => Ok((self.theta(key, figure, sign)?, 1.0)),
        };
        self.list(key, value)?.iter().map(one).collect()
    }

    fn treatment(&self, map: &Map, mut treatment: Treatment) -> Result<Treatment, Fault> {
        for option in treatment::OPTIONS {
            match (option.name, map.get(option.name)) {
                (_, None) => {}
                ("cut_off", Some(value)) => treatment.cut_off_k = self.theta("cut_off", value, Sign::Positive)?.value,
                (name, Some(Value::Text(word))) if treatment.set(name, word) => {}
                (name, Some(other)) => {
                    let wanted = match name {
                        "vibration" => "one of \"levels\", \"harmonic\" and \"equipartition\"",
                        "rotation" => "one of \"levels\" and \"classical\"",
                        "stretching" => "one of \"given\" and \"rigid\"",
                        "torsion" => "one of \"hindered\" and \"free\"",
                        "low_modes" => "one of \"harmonic\", \"truhlar\" and \"grimme\"",
                        _ => "one of \"equilibrium\" and \"frozen\"",
                    };
                    let given = match other {
                        Value::Text(word) => format!("\"{word}\""),
                        other => other.sort().to_owned(),
                    };
                    return Err(MoleculeError::Sort { key: name.to_owned(), wanted, given }.into());
                }
            }
        }
        Ok(treatment)
    }

    fn definition(&self) -> Result<Definition, Fault> {
        let (substance, formula) = self.substance()?;
        let composition = &substance.species.composition;
        let atoms = composition.iter().map(|(_, count)| count.to_f64()).sum::<f64>() as usize;
        let mass = self.mass(&substance)?;
        let motion = self.motion(&formula, atoms)?;
        let (symmetry_number, symmetry_given, by_group) = self.symmetry(matches!(motion, Motion::Atom))?;
        let motion = match motion {
            Motion::Diatomic { constants, spins: Spins::Unlike } if symmetry_number == 2.0 => {
                Motion::Diatomic { constants, spins: Spins::Like }
            }
            other => other,
        };
        let constants = self.thetas("distortion", Sign::Any)?;
        let distortion = stretching::given(&motion, &constants)?;
        let lacks_delta = stretching::lacks_delta(&motion, constants.len());
        let factor = |key: &str| -> Result<Option<Parameter>, Fault> {
            let Some(value) = self.map.get(key) else { return Ok(None) };
            let quantity = match value {
                Value::Number(number) => self.pure(*number)?,
                Value::Text(written) => text::parse(written, self.cx.place.clone(), self.cx.next_ordinal())?,
                Value::Quantity(value) => value.clone(),
                other => return Err(Reader::sort(key, "a factor near 1, as in \"0.967(20)\"", other)),
            };
            if !quantity.dim().is_none() {
                let given = reader_text(&quantity.unit());
                return Err(MoleculeError::Dimension {
                    key: key.to_owned(),
                    given,
                    wanted: "a pure number",
                    example: "`0.967`",
                }
                .into());
            }
            if quantity.si() <= 0.0 {
                let value = text::shown_plain(&quantity);
                return Err(MoleculeError::NotPositive { key: key.to_owned(), value }.into());
            }
            let quantity = if matches!(value, Value::Quantity(_)) { quantity } else { self.named(key, quantity) };
            Ok(Some(Parameter::of(key, &quantity)))
        };
        Ok(Definition {
            mass,
            motion,
            electronic: self.electronic()?,
            symmetry_number,
            symmetry_given,
            by_group,
            distortion,
            lacks_delta,
            scale: factor("scale")?,
            scale_zero_point: factor("scale_zero_point")?,
            formation: self.formation()?,
            energy: self.map.get("energy").map(|value| self.quantity("energy", value)).transpose()?,
            substance,
        })
    }

    /// A bare factor, as a typed value.
    fn pure(&self, number: f64) -> Result<Quantity, Fault> {
        let one = unit_parse::unit("1")?;
        Ok(text::from_number(number, one, self.cx.place.clone(), self.cx.next_ordinal())?)
    }

    /// The species: the recorded gas of that name, or one made up of name and formula.
    fn substance(&self) -> Result<(Arc<Substance>, String), Fault> {
        let (name, formula) = (self.text("name")?, self.text("formula")?);
        let parsed = match &formula {
            Some(formula) => Some(Formula::parse(formula)?),
            None => None,
        };
        let Some(called) = name.as_ref().or(formula.as_ref()) else {
            return Err(MoleculeError::Missing { key: "formula", example: "formula: \"C3H6O\"" }.into());
        };
        let called = called.trim().trim_end_matches("(g)").to_owned();
        let recorded = shipped::find(self.cx, &called);
        if let Some(substance) = recorded {
            let species = &substance.species;
            match &parsed {
                Some(formula)
                    if *formula.composition() != species.composition || formula.charge() != species.charge =>
                {
                    if name.is_some() {
                        let (recorded, given) = (species.composition.to_string(), formula.composition().to_string());
                        return Err(MoleculeError::Formula { name: called, recorded, given }.into());
                    }
                }
                _ => return Ok((substance.clone(), formula.map_or(called, |formula| formula.to_string()))),
            }
        }
        let Some(parsed) = parsed else {
            return Err(MoleculeError::Missing { key: "formula", example: "formula: \"C3H6O\"" }.into());
        };
        let base = name.as_ref().map_or_else(|| parsed.reference_name(), |_| called);
        let made = definition::made_up(&base, parsed.composition(), parsed.charge(), State::Gas);
        Ok((Arc::new(made), parsed.reference_name()))
    }

    fn mass(&self, substance: &Substance) -> Result<Parameter, Fault> {
        let Some(given) = self.map.get("molar_mass") else {
            return mass::of_atoms(self.cx, substance.species.entity, &substance.species.composition);
        };
        let quantity = self.quantity("molar_mass", given)?;
        let wanted = unit_parse::unit("kg/mol")?.dim.without_basis();
        if quantity.dim().without_basis() != wanted {
            let (key, given) = ("molar_mass".to_owned(), reader_text(&quantity.unit()));
            let (wanted, example) = ("a mass per mole", "`\"44.01 g/mol\"`");
            return Err(MoleculeError::Dimension { key, given, wanted, example }.into());
        }
        if quantity.si() <= 0.0 {
            let value = text::shown_plain(&quantity);
            return Err(MoleculeError::NotPositive { key: "molar_mass".to_owned(), value }.into());
        }
        Ok(Parameter::of("molar mass", &quantity))
    }

    fn motion(&self, formula: &str, atoms: usize) -> Result<Motion, Fault> {
        if self.map.contains_key("we") {
            return self.diatomic(formula, atoms);
        }
        let top = self.thetas("rotational_constants", Sign::Positive)?;
        let fits = match atoms {
            0 | 1 => top.is_empty(),
            2 => top.len() == 1,
            _ => top.len() == 1 || top.len() == 3,
        };
        if !fits {
            let (formula, given) = (formula.to_owned(), top.len());
            return Err(MoleculeError::RotationalConstants { formula, atoms, given }.into());
        }
        let vibrations = self.degenerate("vibrations", Sign::Mode)?;
        let torsions = match self.map.get("torsions") {
            None => Vec::new(),
            Some(value) => {
                self.list("torsions", value)?.iter().map(|item| self.torsion(item)).collect::<Result<_, _>>()?
            }
        };
        let (shape, wanted) = match top.len() {
            0 => ("an atom", 0),
            1 => ("linear", 3 * atoms - 5),
            _ => ("nonlinear", 3 * atoms - 6),
        };
        let given = vibrations.iter().map(|(_, g)| *g).sum::<f64>() as usize + torsions.len();
        if given != wanted {
            return Err(MoleculeError::ModeCount { formula: formula.to_owned(), atoms, shape, wanted, given }.into());
        }
        if top.is_empty() { Ok(Motion::Atom) } else { Ok(Motion::Polyatomic { top, vibrations, torsions }) }
    }

    fn diatomic(&self, formula: &str, atoms: usize) -> Result<Motion, Fault> {
        if atoms != 2 {
            let (formula, shape) = (formula.to_owned(), "no diatomic molecule");
            return Err(MoleculeError::ModeCount { formula, atoms, shape, wanted: 3 * atoms - 6, given: 1 }.into());
        }
        let needed = |key: &'static str, sign| -> Result<Parameter, Fault> {
            let example =
                "we: \"2169.814 cm^-1\", wexe: \"13.288 cm^-1\", Be: \"1.931281 cm^-1\", alpha_e: \"0.017504 cm^-1\"";
            let value = self.map.get(key).ok_or(MoleculeError::Missing { key, example })?;
            self.theta(key, value, sign)
        };
        let mut constants = vec![
            needed("we", Sign::Mode)?,
            needed("wexe", Sign::NotNegative)?,
            needed("Be", Sign::Positive)?,
            needed("alpha_e", Sign::Any)?,
        ];
        if let Some(value) = self.map.get("De") {
            constants.push(self.theta("De", value, Sign::NotNegative)?);
        }
        let spins = match self.map.get("spin_weights") {
            None => Spins::Unlike,
            Some(value) => match self.list("spin_weights", value)? {
                [even, odd] => {
                    let (even, odd) = (self.number("spin_weights", even)?, self.number("spin_weights", odd)?);
                    if !(even > 0.0 && odd > 0.0) {
                        let value = round::shortest(even.min(odd));
                        return Err(MoleculeError::NotPositive { key: "spin_weights".to_owned(), value }.into());
                    }
                    Spins::Equilibrium { even, odd }
                }
                _ => return Err(Reader::sort("spin_weights", "two numbers, for even and odd J, as in [1, 3]", value)),
            },
        };
        Ok(Motion::Diatomic { constants, spins })
    }

    fn torsion(&self, value: &Value) -> Result<GivenTorsion, Fault> {
        let Value::Options(map) = value else {
            return Err(Reader::sort(
                "torsions",
                "a list of maps, each with `rotational_constant` and `barrier`",
                value,
            ));
        };
        if let Some(key) = map.keys().find(|key| !TORSION_KEYS.contains(&key.as_str())) {
            return Err(MoleculeError::Key { key: format!("torsions: {key}"), known: listed(TORSION_KEYS) }.into());
        }
        let of = Reader { cx: self.cx, map, unit: self.unit.clone(), called: self.called.clone() };
        let f = match (map.get("rotational_constant"), map.get("reduced_moment")) {
            (Some(value), _) => of.theta("rotational_constant", value, Sign::Positive)?,
            (None, Some(value)) => of.theta("reduced_moment", value, Sign::Positive)?,
            (None, None) => {
                let (key, example) = ("rotational_constant", "rotational_constant: \"27.6 cm^-1\"");
                return Err(MoleculeError::Missing { key, example }.into());
            }
        };
        let mut cosines = of.thetas("cosines", Sign::Any)?;
        let sines = of.thetas("sines", Sign::Any)?;
        if let Some(value) = map.get("barrier") {
            let fold = map.get("fold").map_or(Ok(3.0), |fold| of.number("fold", fold))?;
            if !(1.0..=12.0).contains(&fold) || fold.fract() != 0.0 {
                let value = round::shortest(fold);
                return Err(MoleculeError::Degeneracy { key: "fold".to_owned(), value }.into());
            }
            let barrier = of.theta("barrier", value, Sign::NotNegative)?;
            cosines = vec![Parameter::exact("barrier", 0.0); fold as usize - 1];
            cosines.push(barrier);
        }
        let example = "symmetry_number: 3";
        let value = map.get("symmetry_number").ok_or(MoleculeError::Missing { key: "symmetry_number", example })?;
        let symmetry_number = whole(of.number("symmetry_number", value)?)?;
        Ok(GivenTorsion { f, cosines, sines, symmetry_number, solved: Rc::default() })
    }

    /// Symmetry number, whether it was given, and that of the point group with its symbol.
    #[expect(clippy::type_complexity, reason = "three answers to one question, taken apart where they are asked for")]
    fn symmetry(&self, atom: bool) -> Result<(f64, bool, Option<(Arc<str>, f64)>), Fault> {
        let by_group = match self.text("point_group")? {
            None => None,
            Some(symbol) => match point_group::symmetry_number(&symbol) {
                Some(number) => Some((symbol, number)),
                None => return Err(MoleculeError::PointGroup { symbol: symbol.to_string() }.into()),
            },
        };
        let given = match self.map.get("symmetry_number") {
            Some(value) => Some(whole(self.number("symmetry_number", value)?)?),
            None => None,
        };
        let number = given.or(by_group.as_ref().map(|(_, number)| *number));
        Ok((number.unwrap_or(1.0), number.is_some() || atom, by_group))
    }

    fn electronic(&self) -> Result<Vec<(Parameter, f64)>, Fault> {
        let mut levels = self.degenerate("electronic_levels", Sign::NotNegative)?;
        if let Some((lowest, _)) = levels.first()
            && lowest.value != 0.0
        {
            let value = crate::model::molecule::parameter::per_cm(lowest.value);
            return Err(MoleculeError::LowestLevel { value }.into());
        }
        if levels.is_empty() {
            let g = self.map.get("multiplicity").map_or(Ok(1.0), |value| self.number("multiplicity", value))?;
            if !(g >= 1.0 && g.fract() == 0.0) {
                let (key, value) = ("multiplicity".to_owned(), round::shortest(g));
                return Err(MoleculeError::Degeneracy { key, value }.into());
            }
            levels.push((Parameter::exact("electronic level", 0.0), g));
        }
        Ok(levels)
    }

    /// The formation enthalpy with its zero: said, or carried by the value itself.
    fn formation(&self) -> Result<Option<GivenFormation>, Fault> {
        let Some(given) = self.map.get("formation_enthalpy") else { return Ok(None) };
        let value = self.quantity("formation_enthalpy", given)?;
        let wanted = unit_parse::unit("J/mol")?.dim.without_basis();
        if value.dim().without_basis() != wanted || *value.dim() == wanted {
            let (key, given) = ("formation_enthalpy".to_owned(), reader_text(&value.unit()));
            return Err(MoleculeError::Dimension {
                key,
                given,
                wanted: "an energy per mole",
                example: "`\"-393.5 kJ/mol\"`",
            }
            .into());
        }
        let said = match self.map.get("formation_temperature") {
            None => None,
            Some(said) => {
                let t_k = self.quantity("formation_temperature", said)?.si();
                match t_k {
                    _ if t_k == 0.0 => Some(true),
                    _ if (t_k - 298.15).abs() < 1e-9 => Some(false),
                    _ => return Err(MoleculeError::ZeroElsewhere { t_k }.into()),
                }
            }
        };
        let shown = || text::shown_plain(&value);
        let own = value.kind().state().and_then(|state| state.zero.clone());
        let carried = match &own {
            Some(Zero::Elements298) if value.kind().state().and_then(|state| state.t_k) == Some(298.15) => Some(false),
            Some(Zero::Elements0) => Some(true),
            None => None,
            Some(other) => {
                let (zero, said) = (other.to_string(), "a formation enthalpy".to_owned());
                return Err(MoleculeError::ZeroDiffers { value: shown(), zero, said }.into());
            }
        };
        let at_zero = match (said, carried) {
            (Some(said), Some(carried)) if said != carried => {
                let zero = own.map_or_else(String::new, |zero| zero.to_string());
                let said = if said { "0 K" } else { "298.15 K" }.to_owned();
                return Err(MoleculeError::ZeroDiffers { value: shown(), zero, said }.into());
            }
            (Some(at_zero), _) | (None, Some(at_zero)) => at_zero,
            (None, None) => return Err(MoleculeError::ZeroMissing { value: shown() }.into()),
        };
        Ok(Some(GivenFormation { value, at_zero }))
    }
}

/// Which values a figure must not have.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Sign {
    /// A wavenumber of a vibration: below zero it is imaginary.
    Mode,
    Positive,
    NotNegative,
    Any,
}

/// A wavenumber written as an imaginary number, `123i cm^-1`.
fn imaginary(written: &str) -> Result<(), MoleculeError> {
    let first = written.split_whitespace().next().unwrap_or("");
    let bare = first.trim_start_matches(['-', '+', '−']);
    match bare.strip_suffix('i').or_else(|| bare.strip_prefix('i')) {
        Some(digits) if !digits.is_empty() && digits.parse::<f64>().is_ok() => {
            Err(MoleculeError::Imaginary { value: written.to_owned() })
        }
        _ => Ok(()),
    }
}

fn whole(number: f64) -> Result<f64, MoleculeError> {
    if number >= 1.0 && number.fract() == 0.0 {
        Ok(number)
    } else {
        Err(MoleculeError::SymmetryNumber { value: round::shortest(number) })
    }
}
